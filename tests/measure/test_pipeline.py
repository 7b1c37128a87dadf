"""The way of a reading through one sensor: its own time, plausibility, spikes, what is covered, what it depends on."""

import json
import math
from collections.abc import Mapping
from dataclasses import replace

import pytest
from hypothesis import given
from hypothesis import strategies as st

from gateway.measure.calibration import Covered
from gateway.measure.payloads.own_time import OwnTime
from gateway.measure.payloads.payload import Pointer
from gateway.measure.sensing.distance import Distance
from gateway.measure.sensing.level import Level
from gateway.measure.sensing.method import Method
from gateway.measure.sensor import Sensor
from gateway.measure.sensor_plan import SensorPlan
from gateway.measure.status import Status
from rules.model import Bounds, Fault

S = 1_000_000_000
WALL = 1_777_000_000 * S
PLAN = SensorPlan(name="t.s", topic="s", method=Level(), unit="m", silent_after=30 * S, tolerate=10 * S)


def say(sensor: Sensor, second: float, text: str) -> object:
    """Let the sensor say something; return its signal's value."""
    sensor.take(round(second * S), "s", text.encode(), retained=False, offset=WALL)
    return sensor.signal.value


def test_a_jump_faster_than_the_tank_can_fill_is_rejected_and_the_last_level_stands() -> None:
    """For as long as is tolerated."""
    sensor = Sensor(replace(PLAN, fastest=0.02))
    assert [say(sensor, k, str(1 + k / 100)) for k in range(5)] == [1.0, 1.01, 1.02, 1.03, 1.04]
    assert say(sensor, 5, "1.6") == 1.04
    assert sensor.last is not None
    assert sensor.last.reason == "0.56 m in 1 s is faster than 20 mm/s"
    assert say(sensor, 6, "1.06") == 1.06


def test_a_level_that_really_jumped_is_believed_after_the_failure() -> None:
    """Then readings are compared with each other; two good ones in a row suffice."""
    sensor = Sensor(replace(PLAN, fastest=0.02))
    say(sensor, 0, "1.0")
    for second in range(1, 15):
        say(sensor, second, "1.6")
        sensor.expire(second * S)
    assert sensor.signal.value == 1.6
    assert sensor.rejected == 12


def test_the_longer_the_pause_the_further_a_level_may_have_moved() -> None:
    """Half a metre in 25 s are 20 mm/s."""
    sensor = Sensor(replace(PLAN, fastest=0.02))
    say(sensor, 0, "1.0")
    assert say(sensor, 25, "1.5") == 1.5


def test_a_value_without_one_digit_of_change_fails_at_once_and_comes_back_when_it_moves() -> None:
    """A probe that has come loose sends the same for hours."""
    sensor = Sensor(replace(PLAN, frozen_after=60 * S))
    answers = [say(sensor, k * 10, "1.0") for k in range(8)]
    assert answers == [1.0] * 6 + [None, None]
    assert sensor.signal.fault is Fault.FAILED
    assert sensor.reason == "frozen: not one digit of change for 70 s"
    assert [say(sensor, 80 + k, f"1.0{k}") for k in (1, 2)] == [None, 1.02]


def test_spikes_and_ripples_are_calmed_in_the_signal_and_kept_in_the_reading() -> None:
    """The raw truth stays to be seen."""
    sensor = Sensor(replace(PLAN, despike=3))
    assert [say(sensor, k, text) for k, text in enumerate(["1", "1", "5", "1"])][2:] == [1.0, 1.0]
    lagging = Sensor(replace(PLAN, lag=10 * S))
    say(lagging, 0, "1")
    assert say(lagging, 10, "2") == pytest.approx(2 - math.exp(-1))
    assert lagging.used is not None
    assert lagging.used.value == 2.0


def test_after_silence_the_lag_begins_anew() -> None:
    """An old level says nothing of the new one."""
    sensor = Sensor(replace(PLAN, lag=1000 * S))
    say(sensor, 0, "1")
    sensor.expire(30 * S)
    assert say(sensor, 31, "2") == 2.0


def test_beyond_what_a_probe_covers_only_a_bound_is_known() -> None:
    """And that is usable, one-sidedly."""
    sensor = Sensor(replace(PLAN, covers=Covered(0.05, 1.95)))
    assert say(sensor, 0, "0.03") == Bounds(-math.inf, 0.05)
    assert say(sensor, 1, "1.0") == 1.0
    assert say(sensor, 2, "1.99") == Bounds(1.95, math.inf)
    assert sensor.signal.fault is Fault.NONE


OWN = replace(PLAN, pointer=Pointer("/m"), own_time=OwnTime(Pointer("/ts"), "unix s"))


def of(level: float, second: float) -> str:
    """Return a payload with its own time."""
    return json.dumps({"m": level, "ts": WALL / S + second})


def test_a_reading_that_is_no_news_moves_nothing() -> None:
    """Neither its value nor the silence; and it is counted."""
    sensor = Sensor(OWN)
    assert say(sensor, 0, of(1.0, 0)) == 1.0
    for second, payload in ((1, of(3.0, 0)), (2, of(3.0, -7)), (3, of(3.0, -50))):
        assert say(sensor, second, payload) == 1.0
    assert sensor.deadline == 30 * S
    assert sensor.ages is not None
    assert sum(sensor.ages.refused.values()) == 3


def test_silence_counts_from_the_time_of_the_reading_itself() -> None:
    """A stored reading of 20 s ago stands for 10 s more."""
    sensor = Sensor(replace(OWN, buffers=True))
    say(sensor, 100, of(1.0, 80))
    assert sensor.deadline == pytest.approx(110 * S, abs=1000)


def test_a_reading_without_its_time_is_a_failure() -> None:
    """Undatable: it may be of last year."""
    sensor = Sensor(OWN)
    say(sensor, 0, '{"m": 1}')
    assert (sensor.signal.fault, sensor.reason) == (Fault.FAILED, "there is no '/ts' in it")


def test_a_pack_of_records_is_read_by_name_with_its_units_and_times() -> None:
    """RFC 8428: relative times are ages, units are converted."""
    sensor = Sensor(replace(PLAN, senml="urn:tank:head", unit="mm", scale=0.001))
    pack = [{"bn": "urn:tank:", "n": "head", "u": "cm", "v": 150, "t": -4}, {"n": "battery", "u": "V", "v": 3}]
    assert say(sensor, 10, json.dumps(pack)) == pytest.approx(1.5)
    assert sensor.deadline == 36 * S
    say(sensor, 11, json.dumps([{"n": "urn:tank:head", "u": "furlong", "v": 1}]))
    assert sensor.last is not None
    assert sensor.last.reason == "'furlong' is no unit that is known here"


def leaning(felt: Mapping[str, float]) -> Method:
    """Return a head whose height depends on the temperature, as an example of a method that depends on something."""
    return Distance(2.0 + (felt.get("temperature", 293.15) - 293.15) / 100)


FEELING = replace(PLAN, method=leaning({}), method_at=leaning, feels={"temperature": "t.air"})


def test_what_a_method_depends_on_is_followed_and_its_loss_is_told() -> None:
    """Nothing known: a usual value. Lost: the last one. Either way out of specification, and usable."""
    sensor = Sensor(FEELING)
    assert say(sensor, 0, "0.5") == 1.5
    assert (sensor.status, sensor.reason) == (
        Status.OUT_OF_SPECIFICATION, "t.air is not usable: a usual value is assumed",
    )  # fmt: skip
    sensor.feel("temperature", 303.15)
    assert say(sensor, 1, "0.5") == pytest.approx(1.6)
    assert sensor.status is Status.GOOD
    sensor.feel("temperature", None)
    assert say(sensor, 2, "0.5") == pytest.approx(1.6)
    assert sensor.reason == "t.air is not usable: what it said last is used"


ALL = replace(
    OWN, fastest=0.05, frozen_after=40 * S, despike=3, lag=2 * S, covers=Covered(0.2, 1.9),
    feels=FEELING.feels, method=FEELING.method, method_at=leaning,
)  # fmt: skip
STEPS = st.lists(st.tuples(st.integers(0, 20), st.integers(0, 40), st.integers(-3, 3), st.integers(0, 9)), max_size=40)


@given(STEPS, st.integers(0, 40))
def test_a_saved_sensor_goes_on_as_if_it_had_never_stopped(steps: list[tuple[int, int, int, int]], at: int) -> None:
    """With all that can be switched on; saved as text at any reading."""
    whole, copy, second = Sensor(ALL), Sensor(ALL), 0
    for sensor in (whole, copy):
        sensor.begin(0)
    for number, (pause, level, behind, what) in enumerate(steps):
        if number == at:
            copy = Sensor(ALL)
            copy.restore(json.loads(json.dumps(whole.save())))
        second += pause
        for sensor in (whole, copy):
            if what == 0:
                sensor.feel("temperature", None if level % 3 == 0 else 290.0 + level)
            sensor.expire(second * S)
            say(sensor, second, of(level / 20, second - behind))
        assert whole.signal == copy.signal
        assert whole.deadline == copy.deadline
        assert (whole.status, whole.reason) == (copy.status, copy.reason)
        assert whole.save() == copy.save()
