"""The site's calendar: to which hour, day, month and season an instant belongs, by the clocks of its time zone."""

from datetime import UTC, datetime, timedelta
from zoneinfo import ZoneInfo

from gateway.measure.trend.totals import Calendar

SECOND = 1_000_000_000
_EPOCH = datetime(1970, 1, 1, tzinfo=UTC)


def calendar_of(zone: str) -> Calendar:
    """Return the calendar of a time zone. A season is three months, from December, March, June and September on."""
    local = ZoneInfo(zone)

    def periods(at: int) -> tuple[tuple[str, ...], int]:
        now = (_EPOCH + timedelta(seconds=at // SECOND)).astimezone(local)
        into_the_hour = timedelta(minutes=now.minute, seconds=now.second)
        ends = (now.astimezone(UTC) - into_the_hour + timedelta(hours=1) - _EPOCH) // timedelta(seconds=1) * SECOND
        offset = f"{now:%z}"  # an hour that comes twice, when clocks are put back, is two hours
        return (f"{now:%Y-%m-%dT%H}{offset}", f"{now:%Y-%m-%d}", f"{now:%Y-%m}", _season(now)), ends

    return periods


def _season(now: datetime) -> str:
    first = now.month // 3 * 3 or 12
    year = now.year - (first == 12 and now.month < 12)
    last_year, last = (year + 1, 2) if first == 12 else (year, first + 2)
    return f"{year}-{first:02}/{last_year}-{last:02}"
