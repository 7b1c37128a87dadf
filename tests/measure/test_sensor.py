"""One sensor: from messages to a judged value, with its status and the reason in words."""

import json
from collections.abc import Mapping
from typing import Any

import pytest
from hypothesis import given
from hypothesis import strategies as st

from gateway.measure.calibration import Line
from gateway.measure.payloads.payload import Pointer
from gateway.measure.reading import convert
from gateway.measure.sensing.current import Current
from gateway.measure.sensing.distance import Distance
from gateway.measure.sensing.frequency import Frequency
from gateway.measure.sensor import Sensor
from gateway.measure.sensor_plan import AlivePlan, SensorPlan
from gateway.measure.status import Status
from rules.model import SECOND, Fault, Signal

AWAITED, FAILED, SILENT = (Signal(None, fault) for fault in (Fault.AWAITED, Fault.FAILED, Fault.SILENT))


def plan_of(**other: Any) -> SensorPlan:
    """Return an ultrasonic head that sends millimetres every 5 s, mounted 2.05 m up, but for what is given."""
    usual: dict[str, Any] = {
        "name": "cistern.head",
        "topic": "t",
        "method": Distance(2.05),
        "scale": 0.001,
        "unit": "mm",
        "raw_range": (0.25, 2.1),
        "silent_after": 15 * SECOND,
        "tolerate": 5 * SECOND,
    }
    return SensorPlan(**{**usual, **other})


def sensor_of(**other: Any) -> Sensor:
    """Return such a sensor, begun at 0."""
    sensor = Sensor(plan_of(**other))
    sensor.begin(0)
    return sensor


def tell(sensor: Sensor, seconds: float, payload: str, *, topic: str = "t", retained: bool = False) -> bool:
    """Let a payload come; return whether the signal may have changed."""
    return sensor.take(round(seconds * SECOND), topic, payload.encode(), retained=retained)


def test_a_reading_becomes_a_level() -> None:
    """1240 mm below a head at 2.05 m is a level of 0.81 m, and good."""
    sensor = sensor_of()
    assert sensor.signal == AWAITED
    assert tell(sensor, 1, "1240")
    assert sensor.signal.value == pytest.approx(0.81)
    assert (sensor.signal.fault, sensor.status, sensor.reason) == (Fault.NONE, Status.GOOD, None)
    assert sensor.used == sensor.last
    assert sensor.used is not None
    assert (sensor.used.raw, sensor.used.payload) == (1240.0, b"1240")


def test_the_range_holds_at_its_very_ends() -> None:
    """The ends themselves are inside, beyond them is a failure with both figures in the sensor's unit."""
    plan = plan_of()
    assert convert(plan, Distance(2.05), 250).status is Status.GOOD
    assert convert(plan, Distance(2.05), 2100).status is Status.GOOD
    found = convert(plan, Distance(2.05), 2101)
    assert (found.level, found.status) == (None, Status.FAILURE)
    assert found.reason == "2101 mm is outside the range of 250 to 2100"


@pytest.mark.parametrize("bad", ["", "rubbish", "nan", "1e999", "9999"])
def test_a_bad_reading_moves_nothing_and_is_remembered(bad: str) -> None:
    """The last good one stays in use; what came, and why it was rejected, can be told."""
    sensor = sensor_of()
    tell(sensor, 1, "1240")
    before = sensor.signal
    tell(sensor, 6, bad)
    assert sensor.signal == before
    assert sensor.status is Status.GOOD
    assert sensor.last is not None
    assert (sensor.last.status, sensor.last.value) == (Status.FAILURE, None)
    assert sensor.last.reason
    assert (sensor.accepted, sensor.rejected) == (1, 1)


def test_after_what_is_tolerated_the_value_has_failed_with_the_reason() -> None:
    """The reason is that of the last reading; afterwards two good ones are needed, and told."""
    sensor = sensor_of()
    tell(sensor, 1, "1240")
    tell(sensor, 6, "9999")
    assert sensor.deadline == 11 * SECOND
    assert not sensor.expire(11 * SECOND - 1)
    assert sensor.expire(11 * SECOND)
    assert (sensor.signal, sensor.status) == (FAILED, Status.FAILURE)
    assert sensor.reason == "9999 mm is outside the range of 250 to 2100"
    tell(sensor, 12, "1250")
    assert (sensor.signal, sensor.reason) == (FAILED, "too few good readings since the failure")
    tell(sensor, 17, "1250")
    assert sensor.signal.value == pytest.approx(0.8)


def test_silence_is_told_as_silence() -> None:
    """With how long it takes."""
    sensor = sensor_of()
    tell(sensor, 1, "1240")
    assert sensor.deadline == 16 * SECOND
    sensor.expire(16 * SECOND)
    assert (sensor.signal, sensor.reason) == (SILENT, "silent for more than 15 s")


def test_a_retained_message_is_no_reading() -> None:
    """How old it is, nobody knows: it counts for nothing, not even as rejected."""
    sensor = sensor_of()
    assert not tell(sensor, 1, "1240", retained=True)
    assert (sensor.signal, sensor.last, sensor.accepted, sensor.rejected) == (AWAITED, None, 0, 0)


def test_after_the_link_was_lost_nothing_is_known_until_something_new_comes() -> None:
    """The old value is gone, the reason is the link; one new reading is enough."""
    sensor = sensor_of()
    tell(sensor, 1, "1240")
    sensor.lose(40 * SECOND, "the link to the broker was lost")
    assert (sensor.signal, sensor.used) == (AWAITED, None)
    assert (sensor.status, sensor.reason) == (Status.FAILURE, "the link to the broker was lost")
    tell(sensor, 41, "1250")
    assert sensor.signal.fault is Fault.NONE


# ---- 4-20 mA ----------------------------------------------------------------------------------------------------


def loop(**other: Any) -> Sensor:
    """Return a 4-20 mA transmitter over 0 to 2.5 m."""
    return sensor_of(method=Current(0.0, 2.5), unit="mA", raw_range=None, **other)


def test_a_failure_current_counts_at_once() -> None:
    """No tolerance for what the transmitter says of itself."""
    sensor = loop()
    tell(sensor, 1, "12")
    assert tell(sensor, 2, "3.5")
    assert sensor.signal == FAILED
    assert sensor.reason == "the transmitter signals a failure (3.5 mA, low)"


def test_a_range_does_not_hide_a_failure_that_the_device_signals() -> None:
    """3.5 mA is outside 4 to 20 mA too, and a range is tolerated for a while; the signal is stronger."""
    sensor = sensor_of(method=Current(0.0, 2.5), unit="mA", raw_range=(0.004, 0.020))
    tell(sensor, 1, "12")
    tell(sensor, 2, "3.5")
    assert sensor.signal == FAILED


def test_between_the_bands_a_value_in_use_stays_in_use() -> None:
    """Out of specification, and usable."""
    sensor = loop()
    tell(sensor, 1, "4")
    tell(sensor, 2, "3.7")
    assert sensor.signal.fault is Fault.NONE
    assert sensor.status is Status.OUT_OF_SPECIFICATION
    assert sensor.reason == "between the bands of NE 43 (3.7 mA)"


@pytest.mark.parametrize("before", [[], ["3.5"], ["3.5", "12"]])
def test_between_the_bands_a_value_that_is_not_in_use_stays_so(before: list[str]) -> None:
    """At the start, after a failure, and while it recovers."""
    sensor = loop()
    for second, payload in enumerate(before):
        tell(sensor, 1 + second, payload)
    for second in (10, 11, 12):
        tell(sensor, second, "20.8")
    assert sensor.signal == FAILED
    assert sensor.reason == "between the bands of NE 43 (20.8 mA)"


# ---- contacts ---------------------------------------------------------------------------------------------------

WORDS: Mapping[str, str] = {"1": "wet", "0": "dry"}


def contact(**other: Any) -> Sensor:
    """Return a float switch."""
    return sensor_of(method=None, words=WORDS, raw_range=None, unit="", good_again=1, **other)


@pytest.mark.parametrize("payload", ["1", '"1"', " 1\n"])
def test_a_contact_says_a_word(payload: str) -> None:
    """Text and JSON text are the same."""
    sensor = contact()
    tell(sensor, 1, payload)
    assert sensor.signal == Signal("wet", Fault.NONE)


def test_a_word_that_a_contact_does_not_have_is_rejected_in_print() -> None:
    """What it said is quoted, short and printable, with what it could have said."""
    sensor = contact(pointer=Pointer("/w"))
    sensor.take(1, "t", b'{"w": "\\ud800\\u001b[2Jmaybe"}', retained=False)
    assert sensor.signal == FAILED
    assert sensor.reason is not None
    assert sensor.reason.isprintable()
    assert sensor.reason.encode()
    assert sensor.reason.endswith("maybe'; known are '1', '0'")


def on_change() -> Sensor:
    """Return a float switch that sends only changes, and says on another topic whether it is alive."""
    return contact(silent_after=None, tolerate=0, alive=AlivePlan(topic="alive", words={"1": True, "0": False}))


def test_it_listens_to_both_topics() -> None:
    """Its own, and the one on which it says that it is alive; once, where they are the same."""
    assert on_change().topics == ("t", "alive")
    assert contact(alive=AlivePlan(topic="t", words={})).topics == ("t",)


def test_where_only_changes_are_sent_a_retained_state_counts_while_it_is_alive() -> None:
    """In either order of arrival; until it says whether it is alive, nothing is known."""
    sensor = on_change()
    tell(sensor, 1, "1", retained=True)
    assert (sensor.signal, sensor.reason) == (AWAITED, "it has not said yet whether it is alive")
    assert tell(sensor, 2, "1", topic="alive", retained=True)
    assert sensor.signal == Signal("wet", Fault.NONE)
    assert sensor.deadline is None


@pytest.mark.parametrize("sign", ["0", "", "perhaps", "\x00"])
def test_without_a_sign_of_life_the_state_does_not_count(sign: str) -> None:
    """`no`, and whatever cannot be understood; when it is alive again, the last state counts."""
    sensor = on_change()
    tell(sensor, 1, "1", topic="alive")
    tell(sensor, 2, "1")
    assert tell(sensor, 3, sign, topic="alive")
    assert (sensor.signal, sensor.reason) == (SILENT, "it says that it is not alive")
    assert tell(sensor, 4, "1", topic="alive")
    assert sensor.signal == Signal("wet", Fault.NONE)


def test_after_a_start_a_sign_of_life_alone_is_no_state() -> None:
    """A state from before does not come back by itself."""
    sensor = on_change()
    tell(sensor, 1, "1", topic="alive")
    tell(sensor, 2, "1")
    sensor.begin(10 * SECOND)
    tell(sensor, 11, "1", topic="alive")
    assert sensor.signal == AWAITED


def test_after_a_start_a_state_without_a_new_sign_of_life_is_not_known() -> None:
    """Nor does an old sign of life speak for a new state."""
    sensor = on_change()
    tell(sensor, 1, "1", topic="alive")
    tell(sensor, 2, "1")
    sensor.begin(10 * SECOND)
    tell(sensor, 11, "0")
    assert (sensor.signal, sensor.reason) == (AWAITED, "it has not said yet whether it is alive")


# ---- for any input ----------------------------------------------------------------------------------------------

SENSORS = {
    "head": plan_of(),
    "loop": plan_of(method=Current(0.0, 2.5), unit="mA", pointer=Pointer("/ma")),
    "probe": plan_of(method=Frequency(Line(1 / 80.6e3, 0.0, 1 / 2.9e3, 0.8)), scale=1.0, unit="Hz", raw_range=None),
    "float": plan_of(method=None, words=WORDS, unit="", raw_range=None),
}
PAYLOADS = st.one_of(
    st.binary(max_size=80),
    st.floats().map(lambda number: json.dumps({"ma": number}).encode()),
    st.floats().map(lambda number: str(number).encode()),
    st.sampled_from([b"1", b"0", b"1240", b"5200", b'{"ma": 12}', b'{"ma": 3.7}', b'{"ma": 2}']),
)
MESSAGES = st.lists(st.tuples(st.integers(0, 20 * SECOND), PAYLOADS, st.booleans()), max_size=12)


@pytest.mark.parametrize("name", SENSORS)
@given(messages=MESSAGES)
def test_whatever_comes_ends_in_a_value_or_a_named_fault(name: str, messages: list[tuple[int, bytes, bool]]) -> None:
    """Never an exception; a value exactly where there is no fault; a reason wherever not good; all of it saved."""
    sensor, t = Sensor(SENSORS[name]), 0
    sensor.begin(0)
    for gap, payload, retained in messages:
        t += gap
        while sensor.deadline is not None and sensor.deadline < t:
            assert sensor.expire(sensor.deadline)
        before = sensor.signal
        changed = sensor.take(t, "t", payload, retained=retained)
        assert changed or sensor.signal == before
        assert (sensor.signal.value is None) == (sensor.signal.fault is not Fault.NONE)
        assert (sensor.reason is None) == (sensor.status is Status.GOOD)
        other = Sensor(SENSORS[name])
        other.restore(json.loads(json.dumps(sensor.save())))
        assert (other.signal, other.status, other.reason) == (sensor.signal, sensor.status, sensor.reason)
        assert (other.last, other.used, other.deadline) == (sensor.last, sensor.used, sensor.deadline)
