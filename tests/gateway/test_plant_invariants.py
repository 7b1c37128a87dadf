"""Properties of the whole plant for any messages: invariants 19, 21, 23, 25, 26 and 28, on an example's settings."""

import json
from typing import Any

from hypothesis import given, settings
from hypothesis import strategies as st

from gateway.effects import Command, Effect, Note, RuleChange
from gateway.events import ClockSet, Event, LinkDown, LinkUp, Message, Start, Wake
from gateway.examples import example
from gateway.plant import Plant
from gateway.settings.assemble import plant_plan
from gateway.settings.load import load

SECOND = 1_000_000_000
PLAN = plant_plan(load(example("hill-dairy")))

SAID = {
    "dairy/condensate-drum/probe": [b'{"hz": 9000}', b'{"hz": 2900}', b'{"hz": 2600.5}', b'{"hz": 5}', b"{}"],
    "dairy/condensate-drum/float": [b"1", b"0", b"wet"],
    "dairy/wash-sump/ma": [b'{"current": {"ma": %s}}' % ma for ma in (b"4.8", b"13", b"19.5", b"3.2", b"true")],
    "dairy/wash-sump/float": [b"1", b"0"],
    "dairy/wash-sump/alive": [b"1", b"0"],
    "dairy/header-tank/pf": [b"300", b"1100.5", b"2300", b"1e9"],
    "dairy/cistern/mm": [b"600", b"1400", b"1900", b"\xff"],
    "dairy/nobody/listens": [b"1"],
}
ONLY_CHANGES = {"dairy/wash-sump/float", "dairy/wash-sump/alive"}  # the last of these counts whenever it comes

PAUSES = st.sampled_from([0, 1, SECOND // 10, SECOND, 3 * SECOND, 3 * SECOND, 9 * SECOND, 61 * SECOND])
MESSAGES = st.sampled_from(sorted(SAID)).flatmap(lambda topic: st.tuples(st.just(topic), st.sampled_from(SAID[topic])))


@st.composite
def histories(draw: st.DrawFn) -> list[Event]:
    """Return what happens to the plant from its first start on."""
    t = 1000 * SECOND
    events: list[Event] = [Start(t, 7 * SECOND), LinkUp(t)]
    for _ in range(draw(st.integers(1, 40))):
        t += draw(PAUSES)
        kind = draw(st.integers(0, 19))
        if kind == 0:
            events += [LinkDown(t, "the broker went away"), LinkUp(t + draw(PAUSES))]
            t = events[-1].t
        elif kind == 1:
            t = draw(st.sampled_from([5 * SECOND, t]))
            events += [Start(t, 9 * SECOND), LinkUp(t + SECOND)]
        elif kind == 2:
            events.append(ClockSet(t, draw(st.integers(0, 10**18))))
        elif kind == 3:
            events.append(Wake(t))
        else:
            topic, payload = draw(MESSAGES)
            old = draw(st.sampled_from(["", "", "", "", "retained", "late"]))
            events.append(Message(t, topic, payload, retained=old == "retained", late=old == "late"))
    return events


def run(events: list[Event]) -> list[list[Effect]]:
    """Return what a fresh plant wants done after each event."""
    plant = Plant(PLAN)
    return [plant.step(event) for event in events]


def moved(effects: list[list[Effect]]) -> list[Effect]:
    """Return the commands and the rules that changed."""
    return [effect for step in effects for effect in step if isinstance(effect, (Command, RuleChange))]


@given(histories())
def test_invariant_19_old_news_leaves_every_command_unchanged(events: list[Event]) -> None:
    """Late and retained readings taken away, and the time left, the same is decided."""
    without = [
        Wake(event.t)
        if isinstance(event, Message) and (event.late or event.retained) and event.topic not in ONLY_CHANGES
        else event
        for event in events
    ]
    assert moved(run(events)) == moved(run(without))


@given(histories(), st.lists(st.sampled_from([0, 1, SECOND // 3, 2 * SECOND]), max_size=6))
def test_invariant_21_inserted_wake_ups_change_no_rule(events: list[Event], pauses: list[int]) -> None:
    """Neither what is decided nor when."""
    woken: list[Event] = []
    for event, following in zip(events, [*events[1:], events[-1]], strict=True):
        t = event.t
        woken.append(event)
        for pause in pauses if not isinstance(following, Start) else ():
            t = min(following.t, t + pause)
            woken.append(Wake(t))
    decided = [
        [effect for step in run(some) for effect in step if isinstance(effect, RuleChange)] for some in (events, woken)
    ]
    assert decided[0] == decided[1]


@given(histories(), st.integers(0, 40))
def test_invariant_23_a_saved_plant_goes_on_as_if_it_had_never_stopped(events: list[Event], at: int) -> None:
    """Saved as text at any event; every effect and every time to wake is the same."""
    whole, copy = Plant(PLAN), Plant(PLAN)
    for number, event in enumerate(events):
        if number == at:
            copy = Plant(PLAN)
            copy.restore(json.loads(json.dumps(whole.save())))
        assert whole.step(event) == copy.step(event)
        assert whole.wake_at == copy.wake_at


@given(histories(), st.integers(-(10**18), 10**18))
def test_invariant_25_shifting_the_wall_clock_changes_printed_times_only(events: list[Event], shift: int) -> None:
    """Not one timer looks at it."""
    shifted = [
        event._replace(offset=event.offset + shift) if isinstance(event, (Start, ClockSet)) else event
        for event in events
    ]
    assert [without_times(step, 0) for step in run(events)] == [without_times(step, shift) for step in run(shifted)]


def without_times(effects: list[Effect], shift: int) -> list[Effect]:
    """Return effects with their wall times taken back by `shift`."""
    taken = [effect._replace(at=effect.at - shift) for effect in effects]
    return [
        effect._replace(because=_taken_back(effect.because, shift)) if isinstance(effect, RuleChange) else effect
        for effect in taken
    ]


def _taken_back(tree: Any, shift: int) -> Any:
    if isinstance(tree, dict):
        return {key: value - shift if key == "at" else _taken_back(value, shift) for key, value in tree.items()}
    return [_taken_back(part, shift) for part in tree] if isinstance(tree, list) else tree


@given(histories())
def test_invariant_28_each_change_of_state_has_one_cause(events: list[Event]) -> None:
    """A rule that is in force and asks for that state, or else rest or safe with a reason; and it recomputes."""
    rules = {rule.name: rule for rule in PLAN.site.rules}
    actuators = {actuator.name: actuator for actuator in PLAN.site.actuators}
    in_force: set[str] = set()
    effects = run(events)
    for effect in (effect for step in effects for effect in step):
        if isinstance(effect, RuleChange):
            (in_force.add if effect.in_force else in_force.discard)(effect.rule)
        if isinstance(effect, Command):
            assert effect.reason
            if effect.rule is not None:
                assert effect.rule in in_force
                assert (rules[effect.rule].actuator, rules[effect.rule].state) == (effect.actuator, effect.state)
                assert effect.rank == rules[effect.rule].rank.word
            else:
                assert effect.rank in {"rest", "safe"}
                assert effect.state == getattr(actuators[effect.actuator], effect.rank)
    assert run(events) == effects


@settings(max_examples=30)
@given(histories())
def test_every_time_is_told_exactly_whatever_wakes_the_plant(events: list[Event]) -> None:
    """An effect never lies before its step's predecessor, nor after the step itself."""
    plant = Plant(PLAN)
    before = 0
    for event in events:
        effects = plant.step(event)
        if isinstance(event, Start):
            before = event.t
        for effect in effects:
            assert before <= effect.t <= plant.t or isinstance(effect, Note)
        before = plant.t


def test_how_long_a_life_has_lasted_does_not_depend_on_what_woke_the_plant() -> None:
    """What is left of the grace, and how long unknown has lasted, goes on from the last event, whatever it was."""
    begin = 1000 * SECOND
    before: list[Event] = [
        Start(begin, 0),
        LinkUp(begin),
        Message(begin, "dairy/cistern/mm", b"600"),
        LinkDown(begin + 3 * SECOND, "the broker went away"),
        LinkUp(begin + 6 * SECOND),
    ]
    after: list[Event] = [Wake(begin + 12 * SECOND), Start(5 * SECOND, 0), LinkUp(5 * SECOND), Wake(70 * SECOND)]
    woken = [Wake(begin + second * SECOND) for second in (7, 8, 9, 10, 11)]
    assert moved(run([*before, *after]))
    assert moved(run([*before, *after])) == moved(run([*before, *woken, *after]))
    plant = Plant(PLAN)
    for event in [*before, *after[:2]]:
        plant.step(event)
    assert plant.engine.save()["grace"][0][0] == (5 + 60 - 12) * SECOND
