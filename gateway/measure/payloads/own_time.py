"""The time that a device says its reading is of, in one of three forms, in ns since 1970."""

import re
from collections.abc import Callable
from datetime import UTC, datetime, timedelta, timezone
from typing import Any

from gateway.measure.payloads.payload import PayloadError, Pointer, number_of, shown

SECOND = 1_000_000_000
EARLIEST, LATEST = 0, 2**63 - 1  # ns; what fits where instants are kept

_RFC_3339 = re.compile(
    r"(\d{4})-(\d\d)-(\d\d)[Tt ](\d\d):(\d\d):(\d\d)(?:\.(\d{1,12}))?(?:[Zz]|([+-])(\d\d):(\d\d))", re.ASCII
)


def _seconds(value: Any) -> int:
    return _within(number_of(value, "its time") * SECOND)


def _milliseconds(value: Any) -> int:
    return _within(number_of(value, "its time") * (SECOND // 1000))


def _within(nanoseconds: float) -> int:
    if not EARLIEST <= nanoseconds <= LATEST:
        raise PayloadError("its own time is beyond all clocks")
    return round(nanoseconds)


def rfc_3339(value: Any) -> int:
    """Return the instant that a text says, in ns; raise PayloadError when it says none.

    Source: RFC 3339 section 5.6; a blank may stand for the T. A leap second counts as the second after it.
    """
    found = _RFC_3339.fullmatch(value) if isinstance(value, str) else None
    if found is None:
        raise PayloadError(f"'{shown(str(value))}' is no time as RFC 3339 writes it")
    year, month, day, hour, minute, second = (int(part) for part in found.groups()[:6])
    fraction, sign, zone_hours, zone_minutes = found.groups()[6:]
    try:
        offset = timedelta(hours=int(zone_hours or 0), minutes=int(zone_minutes or 0))
        zone = timezone(-offset if sign == "-" else offset)
        when = datetime(year, month, day, hour, minute, min(second, 59), tzinfo=zone)
    except ValueError:
        raise PayloadError(f"'{shown(value)}' is no time that a clock can show") from None
    if second > 60 or int(zone_minutes or 0) > 59 or int(zone_hours or 0) > 23:
        raise PayloadError(f"'{shown(value)}' is no time that a clock can show")
    whole = (when - datetime(1970, 1, 1, tzinfo=UTC)) // timedelta(seconds=1) + (second == 60)
    return _within(whole * SECOND + int(f"{fraction or 0:0<9}"[:9]))


FORMS: dict[str, Callable[[Any], int]] = {"unix s": _seconds, "unix ms": _milliseconds, "RFC 3339": rfc_3339}
"""Every form in which a device can say the time, as the settings write it."""


class OwnTime:
    """Where in a payload its own time stands, and in which form."""

    __slots__ = ("_read", "pointer")

    def __init__(self, pointer: Pointer, form: str) -> None:
        self.pointer = pointer
        self._read = FORMS[form]

    def of(self, document: Any) -> int:
        """Return the time in a JSON document, in ns since 1970; raise PayloadError when there is none."""
        return self._read(self.pointer.find(document))
