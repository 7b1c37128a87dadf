"""The time that a device says its reading is of, in one of three forms, in ns since 1970."""

import re
from collections.abc import Callable
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
    offset = int(zone_hours or 0) * 3600 + int(zone_minutes or 0) * 60
    if not (
        (1 <= month <= 12 and 1 <= day <= _days_in(year, month) and hour <= 23 and minute <= 59 and second <= 60)
        and int(zone_hours or 0) <= 23
        and int(zone_minutes or 0) <= 59
    ):
        raise PayloadError(f"'{shown(value)}' is no time that a clock can show")
    seconds = _days_since_1970(year, month, day) * 86_400 + hour * 3600 + minute * 60 + second
    seconds += offset if sign == "-" else -offset
    return _within(seconds * SECOND + int(f"{fraction or 0:0<9}"[:9]))


def _days_in(year: int, month: int) -> int:
    leap = year % 4 == 0 and (year % 100 != 0 or year % 400 == 0)
    return 29 if month == 2 and leap else (31, 28, 31, 30, 31, 30, 31, 31, 30, 31, 30, 31)[month - 1]


def _days_since_1970(year: int, month: int, day: int) -> int:
    """Return the days from 1970-01-01 in the Gregorian calendar, counting years from March on."""
    years = year - (month <= 2)
    days = (153 * ((month + 9) % 12) + 2) // 5 + day - 1
    return 365 * years + years // 4 - years // 100 + years // 400 + days - 719_468


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
