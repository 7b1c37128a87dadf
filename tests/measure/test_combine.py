"""One level from several sensors: what each way gives, what remains when some fail, and what floats add."""

import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from gateway.measure.combine import WAYS, Combined, Float, Member, Take, bounded, combine, contradiction
from gateway.measure.status import Status
from rules.model import Bounds, Fault, Value

LEVELS = st.integers(0, 400).map(lambda centimetres: centimetres / 100)


def member(name: str, value: Value, fault: Fault = Fault.NONE, status: Status = Status.GOOD) -> Member:
    """Return a sensor as it is now."""
    return Member(name, value, fault, status, "it is broken" if fault is not Fault.NONE else None)


def of(*values: Value) -> list[Member]:
    """Return sensors a, b, c … with these values; None is failed."""
    named = zip("abcdefg", values, strict=False)
    return [member(name, value, Fault.FAILED if value is None else Fault.NONE) for name, value in named]


def take(way: str, values: list[Member], need: int = 1, agree_within: float | None = None) -> Combined:
    """Return what a way makes of the sensors."""
    return combine(Take(way=way, need=need, agree_within=agree_within), values)


# Three transmitters, the third of them wrong, then failed. Source: common practice for analogue triples, no source; the
# numbers worked out by hand.
TRIPLE = of(2.10, 2.12, 3.90)
PAIR = of(2.10, 2.12, None)


@pytest.mark.parametrize(
    ("way", "three", "two"),
    [
        ("middle", 2.12, 2.11),
        ("highest", 3.90, 2.12),
        ("lowest", 2.10, 2.10),
        ("mean", 2.7067, 2.11),
        ("first", 2.10, 2.10),
    ],
)
def test_each_way_of_three_and_of_the_two_that_are_left(way: str, three: float, two: float) -> None:
    """The middle of three is not moved by one that is wrong."""
    assert take(way, TRIPLE).value == pytest.approx(three, abs=1e-4)
    left = take(way, PAIR)
    assert left.value == pytest.approx(two)
    assert (left.status, left.reason) == (Status.MAINTENANCE_REQUIRED, "c is not usable (it is broken)")


def test_two_that_disagree_leave_only_what_lies_between_them() -> None:
    """Nobody can tell which of them is wrong; a rule acts where both would have it act."""
    found = take("middle", of(1.0, 1.5, None), need=2, agree_within=0.04)
    assert found.value == Bounds(1.0, 1.5)
    assert found.status is Status.OUT_OF_SPECIFICATION
    assert "they disagree by 500 mm: a 1.000 m, b 1.500 m" in (found.reason or "")
    assert take("highest", of(1.0, 1.5, None), agree_within=0.04).value == 1.5


def test_three_that_disagree_are_told_and_the_middle_still_counts() -> None:
    """One outlier cannot move it."""
    found = take("middle", TRIPLE, need=2, agree_within=0.04)
    assert (found.value, found.status) == (2.12, Status.OUT_OF_SPECIFICATION)


def test_too_few_are_a_fault_that_names_the_missing() -> None:
    """The gravest of their faults."""
    found = take("middle", [*of(1.0), member("b", None, Fault.SILENT), member("c", None, Fault.FAILED)], need=2)
    assert (found.value, found.fault) == (None, Fault.FAILED)
    assert found.reason == "1 of 3 usable, 2 needed: b is not usable (it is broken); c is not usable (it is broken)"


@given(st.lists(LEVELS, min_size=2, max_size=2), st.floats(-1e5, 1e5))
def test_the_middle_of_three_lies_between_the_two_good_ones(good: list[float], wrong: float) -> None:
    """Whatever the third says."""
    found = take("middle", of(*good, wrong)).value
    assert isinstance(found, float)
    assert min(good) <= found <= max(good)


@given(st.sampled_from(sorted(WAYS)), st.lists(st.tuples(LEVELS, LEVELS), min_size=1, max_size=5), st.data())
def test_bounds_combine_to_bounds_that_hold(way: str, ends: list[tuple[float, float]], data: st.DataObject) -> None:
    """Whatever the true levels within them are."""
    known = [Bounds(min(pair), max(pair)) for pair in ends]
    found = take(way, of(*known)).value
    true = [data.draw(st.sampled_from([one.low, one.high, (one.low + one.high) / 2])) for one in known]
    exact = take(way, of(*true)).value
    assert isinstance(exact, float)
    low, high = found if isinstance(found, Bounds) else (found, found)
    assert low is not None
    assert high is not None
    assert low - 1e-9 <= exact <= high + 1e-9


TOP, BOTTOM = Float("top", 1.9, wet=False), Float("bottom", 0.3, wet=True)
FAILED = Combined(None, Fault.FAILED, Status.FAILURE, "the wire is broken")


def test_floats_bound_a_level_that_no_sensor_gives() -> None:
    """Wet says at least, dry says at most; one that is not usable says nothing."""
    found = bounded(FAILED, [TOP, BOTTOM])
    assert (found.value, found.fault) == (Bounds(0.3, 1.9), Fault.NONE)
    assert found.reason == "the wire is broken; only known: at least 0.3 m and at most 1.9 m, by the floats"
    assert bounded(FAILED, [TOP._replace(wet=None), BOTTOM]).value == Bounds(0.3, math.inf)
    assert bounded(FAILED, [TOP._replace(wet=None)]) == FAILED


def test_floats_leave_an_exact_level_alone_and_narrow_bounds() -> None:
    """A level that is known needs no bounds."""
    exact = Combined(1.0, Fault.NONE, Status.GOOD, None)
    assert bounded(exact, [TOP, BOTTOM]) == exact
    assert bounded(exact._replace(value=Bounds(1.2, math.inf)), [TOP, BOTTOM]).value == Bounds(1.2, 1.9)


def test_floats_that_cannot_both_be_right_give_no_level() -> None:
    """The upper one wet and the lower one dry."""
    found = bounded(FAILED, [TOP._replace(wet=True), BOTTOM._replace(wet=False)])
    assert (found.value, found.fault) == (None, Fault.FAILED)


@pytest.mark.parametrize(
    ("level", "floats", "against"),
    [
        (1.0, [TOP, BOTTOM], None),
        (1.92, [TOP], None),
        (1.94, [TOP], "top at 1.9 m is dry, and the level is said to be 1.940 m"),
        (0.2, [BOTTOM], "bottom at 0.3 m is wet, and the level is said to be 0.200 m"),
    ],
)
def test_a_level_that_a_float_contradicts_is_told(level: float, floats: list[Float], against: str | None) -> None:
    """By more than they may be apart."""
    assert contradiction(level, floats, 0.03) == against
