"""One reading: from the payload of a message to a raw value, and from a raw value to what it means."""

import base64
import math
from collections.abc import Callable
from typing import Any, NamedTuple

from gateway.measure.payloads.payload import (
    PayloadError,
    document_of,
    number_of,
    shown,
    word_of,
)
from gateway.measure.payloads.senml import Record, newest, resolve
from gateway.measure.sensing.method import Converted, Method
from gateway.measure.sensor_plan import SensorPlan
from gateway.measure.status import Status
from rules.model import Value, restored, saved

SECOND = 1_000_000_000
FARTHEST = 1e6  # m; no tank is so deep, and what is computed from a level stays far from overflowing


class Reading(NamedTuple):
    """What one message came to. `raw` is in the sensor's own unit, or a word; `value` a level in m or a word, too."""

    t: int
    topic: str
    payload: bytes
    raw: float | str | None
    value: Value
    status: Status
    reason: str | None

    def save(self) -> list[Any]:
        """Return the reading as plain JSON values."""
        payload = base64.b64encode(self.payload).decode()
        return [self.t, self.topic, payload, self.raw, saved(self.value), self.status.value, self.reason]


def restored_reading(plain: list[Any] | None) -> Reading | None:
    """Return the reading that `Reading.save` returned."""
    if plain is None:
        return None
    t, topic, payload, raw, value, status, reason = plain
    return Reading(t, topic, base64.b64decode(payload), raw, restored(value), Status(status), reason)


class Said(NamedTuple):
    """What a payload says: a raw number or word, and of when it is: `own` in ns since 1970, or so long `ago`."""

    raw: float | str
    own: int | None = None
    ago: int | None = None


def reader_of(plan: SensorPlan) -> Callable[[bytes], Said] | None:
    """Return how the payloads of a sensor that says the time are read; None for one that does not.

    What is returned raises PayloadError for what is no reading.
    """
    pointer, own_time, name = plan.pointer, plan.own_time, plan.senml
    is_word = plan.method is None
    if name is not None:
        return lambda payload: _of_record(newest(resolve(document_of(payload)), name), plan)
    if own_time is None:
        return None
    if pointer is None:
        raise ValueError("a reading with its own time is JSON, and `field` says where in it the value stands")

    def read(payload: bytes) -> Said:
        document = document_of(payload)
        found = pointer.find(document)
        raw = word_of(found, pointer.text) if is_word else number_of(found, pointer.text)
        return Said(raw, own_time.of(document))

    return read


SENML_UNITS = {"m": 1.0, "l": 1e-3, "m3": 1.0, "Hz": 1.0, "s": 1.0, "A": 1.0, "V": 1.0, "F": 1.0, "S": 1.0} | {
    "Ohm": 1.0, "Pa": 1.0, "K": 1.0, "/": 1.0, "%": 0.01, "ms": 1e-3, "mm": 1e-3, "cm": 1e-2, "mA": 1e-3, "mV": 1e-3,
    "hPa": 100.0, "kHz": 1e3,
}  # fmt: skip
"""Units of RFC 8428 section 12.1 and of RFC 8798 that a level's raw value can have, in SI units."""

CELSIUS = 273.15


def _of_record(record: Record, plan: SensorPlan) -> Said:
    """Return what a record says, its number in the sensor's own unit."""
    value = record.value
    if record.unit == "Cel":
        value = (value + CELSIUS - plan.zero) / plan.scale
    elif record.unit:
        factor = SENML_UNITS.get(record.unit)
        if factor is None:
            raise PayloadError(f"'{shown(record.unit)}' is no unit that is known here")
        value = (value * factor - plan.zero) / plan.scale
    when = round(record.time * SECOND)
    return Said(value, ago=max(0, -when)) if record.is_relative else Said(value, own=when)


def convert(plan: SensorPlan, method: Method, raw: float) -> Converted:
    """Return what a raw value, in the sensor's own unit, means, its range included. Total, for any float.

    A failure that the device signals is told before the range, since it counts at once and a rejected reading does not.
    """
    si = raw * plan.scale + plan.zero
    if not math.isfinite(si):
        return _beyond(plan, raw)
    found = method.convert(si)
    bounds = plan.raw_range
    if bounds is not None and not found.signalled and not bounds[0] <= si <= bounds[1]:
        low, high = ((bound - plan.zero) / plan.scale for bound in bounds)
        return Converted(None, Status.FAILURE, f"{raw:g} {plan.unit} is outside the range of {low:g} to {high:g}")
    if found.level is not None and not abs(found.level) <= FARTHEST:
        return _beyond(plan, raw)
    return found


def _beyond(plan: SensorPlan, raw: float) -> Converted:
    return Converted(None, Status.FAILURE, f"{raw:g} {plan.unit} is outside anything that can be converted")
