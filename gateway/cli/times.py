"""Times on the command line: read as RFC 3339 or as wall time in the site's zone, printed for people in that zone."""

import re
from datetime import UTC, datetime
from zoneinfo import ZoneInfo

from gateway.errors import InputError
from gateway.topics import FIRST_YEAR, LAST_YEAR

_CLOCK = re.compile(r"\d{1,2}:\d{2}(:\d{2})?")


def read_time(text: str, zone: str) -> int:
    """Return the time that `text` says, in ns since 1970; a bare clock time is of today, or of the evening before."""
    try:
        moment = _today(text, zone) if _CLOCK.fullmatch(text) else datetime.fromisoformat(text)
    except ValueError:
        raise InputError(f"`{text}` is not a time; expected one such as `2026-05-01 03:12` or `03:12`") from None
    if moment.tzinfo is None:
        moment = moment.replace(tzinfo=ZoneInfo(zone))
    if not FIRST_YEAR <= moment.year <= LAST_YEAR:
        raise InputError(f"`{text}` is before the year {FIRST_YEAR} or after {LAST_YEAR}")
    return round(moment.astimezone(UTC).timestamp() * 1000) * 1_000_000


def read_end(text: str, zone: str) -> int:
    """Return the end of the stretch that `text` says, in ns: `03:12` is that whole minute, `03:12:30` that second.

    So a time that was copied from a list includes what happened at it.
    """
    return read_time(text, zone) + _precision(text) - 1


def _precision(text: str) -> int:
    """Return how long the stretch is that a time, as precise as it was written, stands for; in ns."""
    clock = re.search(r"\d:\d{2}(:\d{2}(?:[.,](\d+))?)?", text)
    if clock is None:
        return 86_400_000_000_000  # a date: the whole day
    if clock[1] is None:
        return 60_000_000_000
    digits = min(len(clock[2] or ""), 3)  # times are told to the millisecond
    return (1_000_000_000, 100_000_000, 10_000_000, 1_000_000)[digits]


def _today(text: str, zone: str) -> datetime:
    """Return the last time at which a clock in `zone` said `text`."""
    now = datetime.now(ZoneInfo(zone))
    parts = [int(part) for part in text.split(":")]
    moment = now.replace(hour=parts[0], minute=parts[1], second=parts[2] if len(parts) > 2 else 0, microsecond=0)
    if moment > now:
        moment = datetime.combine(moment.date().fromordinal(moment.toordinal() - 1), moment.time(), moment.tzinfo)
    return moment


def shown(at: int, zone: str) -> str:
    """Return a wall time in ns for people: date, time to the tenth of a second, in the site's zone."""
    local = datetime.fromtimestamp(at / 1e9, UTC).astimezone(ZoneInfo(zone))
    return f"{local:%Y-%m-%d %H:%M:%S}.{local.microsecond // 100_000}"
