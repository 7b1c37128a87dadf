"""Properties that the engine has for any site and any events: invariants 8 to 14, 20, 21, 23, 26, 27, 29 and 30."""

import json
from collections.abc import Iterable
from typing import Any

from hypothesis import given
from hypothesis import strategies as st
from sites import chased, histories, run, sites

from rules.conditions.tree import SECOND
from rules.effects import Commanded, Effect, Noted, RuleChanged
from rules.engine import Engine
from rules.events import Event, LinkLost, LinkProven, Passed, Signals, Started
from rules.grace import WINDOW, Grace
from rules.model import OnUnknown, Rank, RuleDecl, SiteDecl

PROTECTIVE = {"trip", "interlock"}


def told(engine: Engine) -> dict[str, dict[str, Any]]:
    """Return each actuator's explanation."""
    return {decl.name: engine.explain(decl.name) for decl in engine.site.actuators}


def rules_told(engine: Engine) -> list[dict[str, Any]]:
    """Return each rule's explanation."""
    return [rule for explained in told(engine).values() for rule in explained["rules"]]


def may_release(rule: RuleDecl) -> bool:
    """Return whether a rule may leave force because it cannot be decided."""
    return not {rule.if_unknown, rule.if_blind or rule.if_unknown} <= {OnUnknown.ACT, OnUnknown.HOLD}


@given(sites(), histories())
def test_invariant_08_a_protective_rule_whose_from_is_true_is_in_force(site: SiteDecl, events: list[Event]) -> None:
    """After every step."""

    def look(engine: Engine, effects: list[Effect]) -> None:
        del effects
        for rule in rules_told(engine):
            if rule["rank"] in PROTECTIVE and rule["from"] == "true":
                assert rule["in_force"]

    run(site, events, look)


@given(sites(), histories())
def test_invariant_09_a_protective_rule_leaves_force_only_on_knowledge_or_by_its_release(
    site: SiteDecl, events: list[Event]
) -> None:
    """From false and until true; or undecided, in a rule that says release or has a rhythm."""
    rules = {rule.name: rule for rule in site.rules}

    def look(engine: Engine, effects: list[Effect]) -> None:
        del engine
        for left in (e for e in effects if isinstance(e, RuleChanged) and not e.in_force):
            rule = rules[left.rule]
            if rule.rank != Rank.AUTO and (left.from_, left.until) != ("false", "true"):
                assert "undecided" in {left.from_, left.until}
                assert may_release(rule)

    run(site, events, look)


@given(sites(), histories())
def test_invariant_10_a_latched_rule_stays_in_force(site: SiteDecl, events: list[Event]) -> None:
    """There is no reset yet, so for ever: over restarts and outages too."""
    latched: set[str] = set()

    def look(engine: Engine, effects: list[Effect]) -> None:
        latched.update(e.rule for e in effects if isinstance(e, RuleChanged) and e.latched)
        for rule in rules_told(engine):
            assert rule["latched"] == (rule["rule"] in latched)
            assert rule["in_force"] or not rule["latched"]

    run(site, events, look)


@given(sites(), histories())
def test_invariant_11_unknown_changes_nothing_while_it_is_tolerated(site: SiteDecl, events: list[Event]) -> None:
    """Within grace, and until a side has been unknown for `unknown_for`, no rule counts as undecided."""
    rules = {rule.name: rule for rule in site.rules}
    known: dict[tuple[str, str], int] = {}  # when a side of a rule was last seen to be known
    grace, now = Grace(site.startup_grace), 0
    engine = Engine(site)
    for event in events:
        if isinstance(event, Started):
            grace.begin(event.t, now)
            known.clear()
        effects = engine.step(event)
        now = engine.now
        for change in (e for e in effects if isinstance(e, RuleChanged)):
            for side, word in (("from", change.from_), ("until", change.until)):
                if word == "undecided":
                    assert change.t >= grace.until
                    assert change.t >= known.get((change.rule, side), 0) + rules[change.rule].unknown_for
        for rule in rules_told(engine):
            known.update({(rule["rule"], side): now for side in ("from", "until") if rule[side] in {"true", "false"}})


def stepped(site: SiteDecl, events: Iterable[Event]) -> Iterable[tuple[Event, list[Effect]]]:
    """Let events happen to a fresh engine; yield each with its effects."""
    engine = Engine(site)
    for event in events:
        yield event, engine.step(event)


@given(st.lists(st.tuples(st.integers(0, 700), st.integers(0, 300)), max_size=30), st.integers(0, 300))
def test_invariant_11_grace_in_any_ten_minutes_is_no_more_than_one_whole_grace(
    lives: list[tuple[int, int]], whole: int
) -> None:
    """However often the gateway starts. A life is a pause before the start and a time until the end, in seconds."""
    grace, t, stretches = Grace(whole * SECOND), 0, []
    for pause, lasts in lives:
        begin = t + pause * SECOND
        granted = grace.begin(begin, t)
        t = begin + lasts * SECOND
        stretches.append((begin, min(begin + granted, t)))
    for _, end in stretches:
        assert sum(max(0, min(e, end) - max(b, end - WINDOW)) for b, e in stretches) <= whole * SECOND


@given(sites(), histories())
def test_invariant_12_a_trip_in_force_has_its_way(site: SiteDecl, events: list[Event]) -> None:
    """Its actuator's state is that of some trip in force."""

    def look(engine: Engine, effects: list[Effect]) -> None:
        del effects
        for explained in told(engine).values():
            asked = {rule["asks"] for rule in explained["rules"] if rule["rank"] == "trip" and rule["in_force"]}
            assert not asked or explained["state"] in asked

    run(site, events, look)


@given(sites(read_actuators=False), histories(), st.sampled_from([Rank.TRIP, Rank.INTERLOCK, Rank.AUTO]))
def test_invariant_13_rules_of_lower_rank_alter_nothing_that_a_higher_rank_gives(
    site: SiteDecl, events: list[Event], rank: Rank
) -> None:
    """Without them the state is the same."""
    less = SiteDecl(
        signals=site.signals,
        actuators=site.actuators,
        rules=tuple(rule for rule in site.rules if rule.rank <= rank),
        startup_grace=site.startup_grace,
        link_tolerance=site.link_tolerance,
    )
    whole, reduced = Engine(site), Engine(less)
    for event in events:
        whole.step(event)
        reduced.step(event)
        for name, explained in told(whole).items():
            if explained["rank"] is not None and Rank[explained["rank"].upper()] <= rank:
                other = reduced.explain(name)
                assert (other["state"], other["rule"]) == (explained["state"], explained["rule"])


@given(sites(), histories())
def test_invariant_14_with_nobody_asking_it_is_rest_by_knowledge_and_safe_without(
    site: SiteDecl, events: list[Event]
) -> None:
    """A rule that cannot be decided and is out of force is blind."""
    decls = {decl.name: decl for decl in site.actuators}

    def look(engine: Engine, effects: list[Effect]) -> None:
        if chased(effects):
            return
        for name, explained in told(engine).items():
            blind = any(rule["from"] == "undecided" and not rule["in_force"] for rule in explained["rules"])
            asking = any(rule["in_force"] for rule in explained["rules"])
            if explained["rank"] == "rest":
                assert (explained["state"], blind, asking) == (decls[name].rest, False, False)
            if explained["rank"] == "safe":
                assert explained["state"] == decls[name].safe

    run(site, events, look)


@given(sites(), histories())
def test_invariant_20_commands_go_only_over_a_proven_link_and_one_per_actuator(
    site: SiteDecl, events: list[Event]
) -> None:
    """At most one per actuator and step."""
    proven = False
    for event, effects in stepped(site, events):
        commands = [effect.actuator for effect in effects if isinstance(effect, Commanded)]
        assert len(set(commands)) == len(commands)
        if isinstance(event, LinkProven):
            proven = True
        elif isinstance(event, Started):
            proven = False
        assert proven or not commands
        if isinstance(event, LinkLost):  # what fell due before the loss was still sent
            proven = False


@given(sites(), histories(), st.lists(st.sampled_from([0, 1, SECOND // 3, 2 * SECOND]), max_size=6))
def test_invariant_21_inserted_wake_ups_change_nothing(site: SiteDecl, events: list[Event], pauses: list[int]) -> None:
    """Neither what is decided nor when; only a command that would have been netted away may go out as well."""
    plain, woken = Engine(site), Engine(site)
    decided: list[Effect] = []
    inserted: list[Effect] = []
    for event, following in zip(events, [*events[1:], events[-1]], strict=True):
        decided += changes(plain.step(event))
        inserted += changes(woken.step(event))
        if isinstance(following, Started):
            continue  # it ends this stretch of time: what falls due in between is the next life's
        for pause in pauses:
            inserted += changes(woken.step(Passed(min(following.t, woken.now + pause))))
        while (due := woken.wake_at) is not None and due < following.t:
            inserted += changes(woken.step(Passed(due + 1)))
    last = max(plain.now, woken.now)
    decided += changes(plain.step(Passed(last)))
    inserted += changes(woken.step(Passed(last)))
    assert decided == inserted
    assert told(plain) == told(woken)


def changes(effects: Iterable[Effect]) -> list[Effect]:
    """Return what was decided, without the commands."""
    return [effect for effect in effects if isinstance(effect, (RuleChanged, Noted))]


@given(sites(), histories(), st.integers(0, 30))
def test_invariant_23_a_saved_engine_goes_on_as_if_it_had_never_stopped(
    site: SiteDecl, events: list[Event], at: int
) -> None:
    """Saved as text at any event; every effect and every time to wake is the same."""
    whole, copy = Engine(site), Engine(site)
    for number, event in enumerate(events):
        if number == at:
            copy = Engine(site)
            copy.restore(json.loads(json.dumps(whole.save())))
        assert whole.step(event) == copy.step(event)
        assert whole.wake_at == copy.wake_at


@given(sites(), histories(), st.sampled_from([1, SECOND, 10**15]))
def test_invariant_26_shifting_the_clock_changes_nothing(site: SiteDecl, events: list[Event], shift: int) -> None:
    """But the times that are told."""
    one, other = Engine(site), Engine(site)
    for event in events:
        effects, shifted = one.step(event), other.step(event._replace(t=event.t + shift))
        assert [unshifted(effect, shift) for effect in shifted] == [unshifted(effect, 0) for effect in effects]


def unshifted(effect: Effect, shift: int) -> Effect:
    """Return an effect with its times taken back by `shift`."""
    taken = effect._replace(t=effect.t - shift)
    return taken._replace(because=plain(taken.because, shift)) if isinstance(taken, RuleChanged) else taken


def plain(tree: Any, shift: int) -> Any:
    """Return an explanation with its instants taken back by `shift`."""
    if isinstance(tree, dict):
        return {
            key: value - shift if key in {"since", "until_change"} and value is not None else plain(value, shift)
            for key, value in tree.items()
        }
    return [plain(part, shift) for part in tree] if isinstance(tree, list) else tree


@given(sites(), histories())
def test_invariant_27_whatever_happens_each_actuator_has_one_state_and_one_reason(
    site: SiteDecl, events: list[Event]
) -> None:
    """Or is left as found, for a reason that is told."""

    def look(engine: Engine, effects: list[Effect]) -> None:
        del effects
        for decl in site.actuators:
            explained = engine.explain(decl.name)
            assert explained["state"] in {None, *decl.states}
            assert explained["reason"]
            if explained["rank"] in {"trip", "interlock", "auto"}:
                assert explained["rule"] in {rule["rule"] for rule in explained["rules"] if rule["in_force"]}

    run(site, events, look)


@given(sites("t", "u"), histories(tanks=2))
def test_invariant_29_tanks_that_share_no_names_do_not_know_of_each_other(site: SiteDecl, events: list[Event]) -> None:
    """A tank decides the same, at the same times, whether the other is there or not."""
    alone = {
        tank: Engine(
            SiteDecl(
                signals=tuple(decl for decl in site.signals if decl.name.startswith(tank)),
                actuators=tuple(decl for decl in site.actuators if decl.name.startswith(tank)),
                rules=tuple(rule for rule in site.rules if rule.name.startswith(tank)),
                startup_grace=site.startup_grace,
                link_tolerance=site.link_tolerance,
            )
        )
        for tank in ("t.", "u.")
    }
    both = Engine(site)
    seen: dict[str, list[Effect]] = {tank: [] for tank in alone}
    expected: dict[str, list[Effect]] = {tank: [] for tank in alone}
    for event in events:
        effects = both.step(event)
        for place, (tank, engine) in enumerate(alone.items()):
            seen[tank] += [e for e in effects if isinstance(e, RuleChanged) and e.rule.startswith(tank)]
            seen[tank] += [e for e in effects if isinstance(e, Commanded) and e.actuator.startswith(tank)]
            own = engine.step(_of(event, place))
            expected[tank] += [e for e in own if isinstance(e, RuleChanged)]
            expected[tank] += [e for e in own if isinstance(e, Commanded)]
    assert seen == expected


def _of(event: Event, place: int) -> Event:
    """Return an event as the tank at `place` alone sees it: another tank's signals are only time that passes."""
    if not isinstance(event, Signals):
        return event
    own = tuple((slot - 4 * place, signal) for slot, signal in event.changes if slot // 4 == place)
    return Signals(event.t, own)


@given(sites(), histories(), st.lists(st.integers(0, 10 * SECOND), min_size=1, max_size=4))
def test_invariant_30_nothing_would_change_before_the_time_to_wake(
    site: SiteDecl, events: list[Event], pauses: list[int]
) -> None:
    """Judging every rule anew at any time up to it finds nothing that the engine has not found."""
    engine = Engine(site)
    for event in events:
        if chased(engine.step(event)):
            return
        for pause in pauses:
            due = engine.wake_at
            t = engine.now + pause if due is None else min(engine.now + pause, due - 1)
            if t < engine.now:
                continue
            copy = Engine(site)
            copy.restore(engine.save())
            effects: list[Effect] = []
            copy._settle(t, range(len(site.rules)), effects)
            assert effects == []
