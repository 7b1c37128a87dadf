"""Times on the command line: read as RFC 3339 or as wall time in the site's zone, printed for people in that zone."""

import re
from datetime import UTC, datetime
from zoneinfo import ZoneInfo

from gateway.errors import InputError

_CLOCK = re.compile(r"\d{1,2}:\d{2}(:\d{2})?")


def read_time(text: str, zone: str) -> int:
    """Return the time that `text` says, in ns since 1970; a bare clock time is of today, or of the evening before."""
    try:
        moment = _today(text, zone) if _CLOCK.fullmatch(text) else datetime.fromisoformat(text)
    except ValueError:
        raise InputError(f"`{text}` is not a time; expected one such as `2026-05-01 03:12` or `03:12`") from None
    if moment.tzinfo is None:
        moment = moment.replace(tzinfo=ZoneInfo(zone))
    return round(moment.astimezone(UTC).timestamp() * 1000) * 1_000_000


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
