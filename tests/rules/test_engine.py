"""The engine as its users meet it: readings in, commands out, nothing else."""

from collections.abc import Iterable

import pytest

from rules.conditions.check import Constant, Meaning, check
from rules.conditions.parse import parse
from rules.conditions.tree import SECOND, Condition
from rules.effects import Commanded, Effect, RuleChanged
from rules.engine import Engine
from rules.events import LinkLost, LinkProven, Passed, Signals, Started
from rules.model import ActuatorDecl, Fault, OnUnknown, Rank, RuleDecl, Signal, SignalDecl, SiteDecl
from rules.quantity import Dimension, Quantity

SIGNALS = (
    SignalDecl(name="drum.level", dimension=Dimension.LENGTH),
    SignalDecl(name="drum.float", words=("wet", "dry")),
)
COOLER = ActuatorDecl(name="drum.cooler", states=("off", "on"), rest="on", safe="off", prefer="off")


class Names:
    """The names of one drum."""

    def resolve(self, name: str) -> Meaning | None:
        """Return what a name stands for."""
        if name == "brim":
            return Constant("drum.brim", Quantity(2.0, Dimension.LENGTH))
        full = name if "." in name else f"drum.{name}"
        return next((decl for decl in (*SIGNALS, COOLER) if decl.name == full), None)

    def known(self) -> Iterable[str]:
        """Return the names."""
        return ("level", "float", "cooler", "brim")

    def full_scale(self, name: str) -> Quantity | None:
        """Return the brim."""
        return Quantity(2.0, Dimension.LENGTH) if name == "drum.level" else None


def read(text: str) -> Quantity:
    """Return a value in metres or seconds."""
    number, _, unit = text.partition(" ")
    dimension = {"m": Dimension.LENGTH, "s": Dimension.TIME, "%": Dimension.SHARE}.get(unit, Dimension.NUMBER)
    return Quantity(float(number) / (100 if unit == "%" else 1), dimension)


def sentence(text: str) -> Condition:
    """Return a checked condition of the drum."""
    return check(parse(text), Names(), read)


def rule(name: str, from_: str, until: str | None = None, **more: object) -> RuleDecl:
    """Return a trip that stops the cooler unless said otherwise."""
    given: dict[str, object] = {
        "rank": Rank.TRIP,
        "actuator": "drum.cooler",
        "state": "off",
        "if_unknown": OnUnknown.HOLD,
    }
    given |= more
    return RuleDecl(name=name, from_=sentence(from_), until=sentence(until) if until else None, **given)  # type: ignore[arg-type]  # one dict of fields of many types


class Drum:
    """An engine driven in whole seconds, remembering every effect."""

    def __init__(self, *rules: RuleDecl, grace: int = 0, proven: bool = True) -> None:
        self.engine = Engine(SiteDecl(signals=SIGNALS, actuators=(COOLER,), rules=rules, startup_grace=grace * SECOND))
        self.effects: list[Effect] = self.engine.step(Started(0))
        if proven:
            self.effects += self.engine.step(LinkProven(0))

    def level(self, t: float, metres: float | None) -> list[Effect]:
        """Let the level be `metres`, or unknown."""
        signal = Signal(metres, Fault.NONE if metres is not None else Fault.SILENT)
        return self.do(Signals(int(t * SECOND), ((0, signal),)))

    def do(self, event: Signals | Passed | LinkLost | LinkProven) -> list[Effect]:
        """Let an event happen."""
        new = self.engine.step(event)
        self.effects += new
        return new

    def wait(self, t: float) -> list[Effect]:
        """Let time pass to just after `t`."""
        return self.do(Passed(int(t * SECOND) + 1))

    def commands(self) -> list[tuple[float, str]]:
        """Return every command so far, with its time in seconds."""
        return [(e.t / SECOND, e.state) for e in self.effects if isinstance(e, Commanded)]


OVERFLOW = rule("drum.overflow", "level above brim - 0.2 m for 8 s", "level below 1.5 m")


def test_an_overflow_shutoff_stops_at_the_exact_end_of_its_delay() -> None:
    """The cooler is stopped eight seconds after the level has crossed, and not a nanosecond earlier or later."""
    drum = Drum(OVERFLOW)
    drum.level(1, 1.0)
    drum.level(10, 1.81)
    assert drum.engine.wake_at == 18 * SECOND
    assert drum.do(Passed(18 * SECOND)) == []
    drum.wait(30)
    assert drum.commands()[-1] == (18.0, "off")


def test_a_shorter_crossing_moves_nothing() -> None:
    """A wave that falls back within the delay is no overflow."""
    drum = Drum(OVERFLOW)
    drum.level(1, 1.0)
    drum.level(10, 1.81)
    drum.level(17, 1.79)
    drum.wait(60)
    assert drum.commands() == [(0.0, "off"), (1.0, "on")]


def test_between_from_and_until_the_rule_stays_as_it_is() -> None:
    """The dead band holds the trip until the level is below its `until`."""
    drum = Drum(OVERFLOW)
    drum.level(0, 1.0)
    drum.level(10, 1.9)
    drum.wait(18)
    drum.level(20, 1.6)
    assert drum.commands()[-1] == (18.0, "off")
    drum.level(30, 1.4)
    assert drum.commands()[-1] == (30.0, "on")


def test_with_no_grace_and_nothing_known_the_actuator_is_safe() -> None:
    """Rest needs knowledge."""
    assert Drum(OVERFLOW).commands() == [(0.0, "off")]


def test_in_grace_the_actuator_is_left_as_found_until_its_rule_is_known() -> None:
    """Nothing is sent on the journal's word; what is known acts at once."""
    drum = Drum(OVERFLOW, grace=60)
    assert drum.commands() == []
    drum.level(5, 1.0)
    assert drum.commands() == [(5.0, "on")]


def test_nothing_moves_away_from_safe_before_every_protective_rule_has_been_decided() -> None:
    """What an auto rule knows is not enough while a trip or an interlock of its actuator still knows nothing."""
    wanted = rule("drum.cool", "float is wet", rank=Rank.AUTO, state="on")
    drum = Drum(wanted, OVERFLOW, grace=60)
    drum.do(Signals(5 * SECOND, ((1, Signal("wet", Fault.NONE)),)))
    assert drum.commands() == []
    drum.level(6, 1.0)
    assert drum.commands() == [(6.0, "on")]


def test_a_move_to_safe_waits_for_no_other_rule() -> None:
    """An auto rule that asks for the safe state is obeyed while a trip still knows nothing."""
    wanted = rule("drum.rest", "float is wet", rank=Rank.AUTO, state="off")
    drum = Drum(wanted, OVERFLOW, grace=60)
    drum.do(Signals(5 * SECOND, ((1, Signal("wet", Fault.NONE)),)))
    assert drum.commands() == [(5.0, "off")]


def test_after_grace_an_undecided_rule_makes_its_actuator_safe() -> None:
    """At the exact end of the grace."""
    drum = Drum(OVERFLOW, grace=60)
    drum.wait(61)
    assert drum.commands() == [(60.0, "off")]


def test_unknown_is_tolerated_for_as_long_as_the_rule_says() -> None:
    """Then, with nothing asked, the actuator is safe."""
    drum = Drum(rule("drum.overflow", "level above 1.8 m", "level below 1.5 m", unknown_for=30 * SECOND))
    drum.level(1, 1.0)
    drum.level(10, None)
    drum.wait(39)
    assert drum.commands()[-1] == (1.0, "on")
    drum.wait(41)
    assert drum.commands()[-1] == (40.0, "off")


def test_a_latched_trip_stays_whatever_the_level() -> None:
    """Only a person resets it."""
    drum = Drum(rule("drum.overflow", "level above 1.8 m", "level below 1.5 m", latch=True))
    drum.level(1, 1.9)
    drum.level(2, 0.1)
    drum.level(3, None)
    assert drum.commands()[-1] == (0.0, "off")
    assert [e.latched for e in drum.effects if isinstance(e, RuleChanged)] == [True]


def test_a_trip_overrules_an_auto_rule_and_says_so() -> None:
    """The loser is recorded with the command."""
    wanted = rule("drum.cool", "level above 0.1 m", rank=Rank.AUTO, state="on")
    drum = Drum(wanted, rule("drum.overflow", "level above 1.8 m", "level below 1.5 m"))
    drum.level(1, 1.0)
    drum.level(2, 1.9)
    last = drum.effects[-1]
    assert isinstance(last, Commanded)
    assert (last.state, last.rank, last.rule, last.overruled) == ("off", Rank.TRIP, "drum.overflow", ("drum.cool",))


def test_an_auto_rule_is_reset_dominant_and_a_trip_set_dominant() -> None:
    """With both conditions true, auto leaves force and a trip comes into it."""
    both = ("level above 1.0 m", "level above 0.5 m")
    auto = Drum(rule("drum.cool", *both, rank=Rank.AUTO, state="off"))
    trip = Drum(rule("drum.overflow", *both))
    assert not [e for e in auto.level(1, 1.2) if isinstance(e, RuleChanged)]
    assert [e.in_force for e in trip.level(1, 1.2) if isinstance(e, RuleChanged)] == [True]


def test_nothing_is_sent_while_the_link_is_not_proven_and_the_newest_state_when_it_is() -> None:
    """An outage shorter than tolerated changes nothing but the age of what is known."""
    drum = Drum(OVERFLOW)
    drum.level(1, 1.0)
    drum.do(LinkLost(5 * SECOND))
    drum.level(6, 1.9)
    drum.wait(15)
    assert drum.commands()[-1] == (1.0, "on")
    drum.do(LinkProven(20 * SECOND))
    assert drum.commands()[-1] == (20.0, "off")


def test_after_a_long_outage_an_actuator_is_safe_until_its_rules_are_known_again() -> None:
    """Old knowledge does not move anything away from safe."""
    drum = Drum(OVERFLOW)
    drum.level(1, 1.0)
    drum.do(LinkLost(5 * SECOND))
    drum.level(36, None)
    drum.do(LinkProven(50 * SECOND))
    assert drum.commands()[-1] == (50.0, "off")
    drum.level(51, 1.0)
    assert drum.commands()[-1] == (51.0, "on")


def test_rules_that_chase_each_other_end_in_safe_and_are_named() -> None:
    """Eight passes at one instant are enough."""
    first = rule("drum.first", "cooler is on", rank=Rank.AUTO, state="off")
    drum = Drum(first)
    assert drum.commands()[-1][1] == "off"
    assert any("chase each other" in getattr(e, "text", "") for e in drum.effects)


@pytest.mark.parametrize("at", range(0, 40, 3))
def test_a_saved_engine_goes_on_as_if_it_had_never_stopped(at: int) -> None:
    """Invariant 23: restore(save(p)) behaves as p for every continuation."""
    whole, copy = Drum(OVERFLOW), Drum(OVERFLOW)
    for t in range(40):
        if t == at:
            copy.engine.restore(whole.engine.save())
        metres = (t * 37 % 11) / 5
        assert whole.level(t, metres) == copy.level(t, metres)
        assert whole.engine.wake_at == copy.engine.wake_at


def test_of_two_interlocks_that_differ_the_preferred_state_wins_whatever_their_order() -> None:
    """`prefer` decides among protective rules; the loser is told."""
    on = rule("drum.keep", "float is wet", rank=Rank.INTERLOCK, state="on")
    off = rule("drum.guard", "float is wet", rank=Rank.INTERLOCK, state="off")
    for rules in ((on, off), (off, on)):
        drum = Drum(*rules)
        drum.do(Signals(SECOND, ((1, Signal("wet", Fault.NONE)),)))
        told = drum.engine.explain("drum.cooler")
        assert (told["state"], told["rule"], told["overruled"]) == ("off", "drum.guard", ["drum.keep"])


def test_once_commanded_an_actuator_is_safe_and_not_as_found_while_a_rule_is_undecided() -> None:
    """A trip stopped it after the start; when the trip leaves, an auto rule that knows nothing does not free it."""
    wanted = rule("drum.cool", "float is wet", rank=Rank.AUTO, state="on")
    drum = Drum(wanted, OVERFLOW, grace=60)
    drum.level(1, 1.9)
    drum.wait(9)
    assert drum.commands() == [(9.0, "off")]
    drum.level(30, 1.0)
    told = drum.engine.explain("drum.cooler")
    assert (told["state"], told["rank"]) == ("off", "safe")
    assert "'drum.cool' is not decided yet, so it is put to safe" in told["reason"]


def test_after_a_long_outage_what_is_still_unknown_decides_so_after_the_grace() -> None:
    """Twenty seconds after the link is proven again the auto rule's own word counts: it asks for nothing."""
    wanted = rule("drum.cool", "float is wet", rank=Rank.AUTO, state="off", if_unknown=OnUnknown.RELEASE)
    held = rule("drum.keep", "level below 0.5 m", rank=Rank.AUTO, state="on", if_unknown=OnUnknown.ACT)
    drum = Drum(held, wanted, grace=20)
    drum.do(LinkLost(30 * SECOND))
    drum.wait(61)
    drum.do(LinkProven(100 * SECOND))
    assert drum.commands()[-1] == (100.0, "off")
    drum.wait(119)
    assert drum.commands()[-1] == (100.0, "off")
    drum.wait(121)
    assert drum.commands()[-1] == (120.0, "on")


def test_a_time_of_unknown_goes_on_over_a_restart() -> None:
    """Ten seconds before it and twenty after make the thirty that are tolerated."""
    guard = rule("drum.guard", "level above 1.8 m", if_unknown=OnUnknown.ACT, unknown_for=30 * SECOND)
    drum = Drum(guard)
    drum.level(1, 1.0)
    drum.level(10, None)
    drum.wait(20)
    drum.effects += drum.engine.step(Started(1000 * SECOND))
    drum.effects += drum.engine.step(LinkProven(1000 * SECOND))
    drum.wait(1060)
    changed = [e for e in drum.effects if isinstance(e, RuleChanged)]
    assert [(round(e.t / SECOND), e.in_force, e.from_) for e in changed] == [(1020, True, "undecided")]


def test_unknown_that_is_still_tolerated_does_not_free_an_actuator_after_a_long_outage() -> None:
    """Only knowledge does, or the end of the grace."""
    drum = Drum(rule("drum.overflow", "level above 1.8 m", "level below 1.5 m", unknown_for=300 * SECOND), grace=20)
    drum.level(1, 1.0)
    drum.do(LinkLost(5 * SECOND))
    drum.wait(36)
    drum.level(36, None)
    drum.do(LinkProven(50 * SECOND))
    assert drum.commands()[-1] == (50.0, "off")
    drum.wait(69)
    assert drum.commands()[-1] == (50.0, "off")


def test_a_change_that_falls_due_in_the_step_that_tells_all_states_again_is_told_as_a_change() -> None:
    """The renewal adds nothing to it, and must not hide it."""
    drum = Drum(OVERFLOW)
    drum.level(1, 1.0)
    drum.level(2, 1.9)
    told = [e for e in drum.do(LinkProven(11 * SECOND)) if isinstance(e, Commanded)]
    assert [(e.t / SECOND, e.state, e.again) for e in told] == [(10.0, "off", False)]
