"""Sensor Measurement Lists: a pack of records, some of whose fields stand once for all that follow.

name = base name + name, value = base value + value, time = base time + time, unit = unit or base unit; a base stands
until the next one. A time below 2^28 s is relative to now, any other is Unix time. Source: RFC 8428, sections 4.1, 4.2,
4.5.3 and 4.6.
"""

from typing import Any, NamedTuple

from gateway.measure.payloads.payload import PayloadError, number_of

VERSION = 10  # of RFC 8428; a pack of a larger one must not be used
RELATIVE = 2.0**28  # s
MOST = 1_000  # records

_NUMBERS = frozenset({"bt", "bv", "bs", "bver", "v", "s", "t", "ut"})


class Record(NamedTuple):
    """One resolved record with a number. `time` in s: relative to now below `RELATIVE`, else since 1970."""

    name: str
    unit: str
    value: float
    time: float

    @property
    def is_relative(self) -> bool:
        """Whether `time` counts from now."""
        return self.time < RELATIVE


def resolve(document: Any) -> list[Record]:
    """Return the records of a pack that hold a number, in the order of time; raise PayloadError for what is no pack."""
    if not isinstance(document, list) or not all(isinstance(record, dict) for record in document):
        raise PayloadError("it is no SenML pack: a list of records")
    if len(document) > MOST:
        raise PayloadError(f"a pack of {len(document)} records; {MOST} are the most that are read")
    base: dict[str, Any] = {"bn": "", "bu": "", "bt": 0.0, "bv": 0.0}
    records = []
    for record in document:
        _check(record)
        base |= {key: value for key, value in record.items() if key in base}
        if record.get("bver", VERSION) > VERSION:
            raise PayloadError(f"a pack of SenML version {record['bver']:g}; {VERSION} is the newest that is read")
        if "v" in record:
            records.append(
                Record(
                    base["bn"] + record.get("n", ""),
                    record.get("u", base["bu"]),
                    number_of(base["bv"] + record["v"], "v"),
                    number_of(base["bt"] + record.get("t", 0.0), "t"),
                )
            )
    return sorted(records, key=lambda record: record.time)


def _check(record: dict[str, Any]) -> None:
    for key, value in record.items():
        if key in _NUMBERS:
            number_of(value, key)
        elif key in {"bn", "n", "bu", "u"} and not isinstance(value, str):
            raise PayloadError(f"'{key}' of a record is no text")
        elif key.endswith("_"):
            raise PayloadError(f"'{key}' must be understood, and is not")


def newest(records: list[Record], name: str) -> Record:
    """Return the newest record of this name; raise PayloadError when there is none."""
    found = [record for record in records if record.name == name]
    if not found:
        raise PayloadError(f"there is no '{name}' in the pack")
    return found[-1]
