"""Random sites and what can happen to them, for properties that hold whatever the settings and the events.

A tank has two levels `x` and `y`, two contacts `a` and `b`, two actuators `p` and `q`, and up to five rules over them.
"""

from collections.abc import Callable, Iterable, Sequence
from functools import cache

from hypothesis import strategies as st
from sentences import sentence

from rules.conditions.tree import SECOND, Condition
from rules.effects import Effect, Noted
from rules.engine import Engine
from rules.events import Event, LinkLost, LinkProven, Passed, Signals, Started
from rules.model import ActuatorDecl, Fault, OnUnknown, Rank, Rhythm, RuleDecl, Signal, SignalDecl, SiteDecl
from rules.quantity import Dimension

STATES = ("off", "on")
GRACE = 20 * SECOND
TOLERANCE = 10 * SECOND

MEASURED = (
    "{t}.x above 1 m",
    "{t}.x below 1 m",
    "{t}.y at least 2 m",
    "{t}.x above {t}.y",
    "{t}.x + 0.5 m below {t}.y",
    "{t}.y between 1 m and 2 m",
    "{t}.x is unknown",
    "{t}.y is usable",
    "{t}.a is yes",
    "{t}.b is no",
    "{t}.b is silent",
)
COMMANDED = ("{t}.p is on", "{t}.q commanded off")


def signals_of(tank: str) -> tuple[SignalDecl, ...]:
    """Return what is measured in a tank."""
    levels = [SignalDecl(name=f"{tank}.{name}", dimension=Dimension.LENGTH) for name in "xy"]
    contacts = [SignalDecl(name=f"{tank}.{name}", words=("yes", "no")) for name in "ab"]
    return (*levels, *contacts)


@st.composite
def actuators_of(draw: st.DrawFn, tank: str) -> tuple[ActuatorDecl, ...]:
    """Return the actuators of a tank, with any rest, safe and preferred state."""
    state = st.sampled_from(STATES)
    return tuple(
        ActuatorDecl(name=f"{tank}.{name}", states=STATES, rest=draw(state), safe=draw(state), prefer=draw(state))
        for name in "pq"
    )


def conditions_of(atoms: Sequence[str]) -> st.SearchStrategy[str]:
    """Return conditions over some basic ones, with and without `for`, as text."""
    held = st.builds(lambda atom, delay: f"{atom}{delay}", st.sampled_from(atoms), st.sampled_from(["", " for 3 s"]))
    return st.one_of(
        held,
        st.builds("not ({})".format, held),
        st.builds("({} and {})".format, held, held),
        st.builds("({} or {})".format, held, held),
        st.builds("({} or not ({})) for 2 s".format, held, held),
        st.builds("at least 2 of ({}, {}, {})".format, held, held, held),
    )


CHOICES = st.one_of(st.sampled_from(OnUnknown), st.just(Rhythm(act_for=2 * SECOND, every=5 * SECOND)))


@cache
def read_in(tank: str, text: str) -> Condition:
    """Return a condition of a tank, read and checked."""
    named = [ActuatorDecl(name=f"{tank}.{name}", states=STATES, rest="off", safe="off", prefer="off") for name in "pq"]
    return sentence(text, (*signals_of(tank), *named))


@st.composite
def rules_of(draw: st.DrawFn, tank: str, *, read_actuators: bool) -> tuple[RuleDecl, ...]:
    """Return up to five rules of a tank."""
    atoms = [atom.format(t=tank) for atom in (*MEASURED, *(COMMANDED if read_actuators else ()))]
    conditions = conditions_of(atoms)
    rules = []
    for number in range(draw(st.integers(1, 5))):
        rank = draw(st.sampled_from([Rank.TRIP, Rank.INTERLOCK, Rank.AUTO]))
        until = draw(st.none() | conditions)
        rules.append(
            RuleDecl(
                name=f"{tank}.rule {number}",
                rank=rank,
                actuator=f"{tank}.{draw(st.sampled_from('pq'))}",
                state=draw(st.sampled_from(STATES)),
                from_=read_in(tank, draw(conditions)),
                until=None if until is None else read_in(tank, until),
                if_unknown=draw(CHOICES),
                if_blind=draw(st.none() | CHOICES),
                unknown_for=draw(st.sampled_from([0, 4 * SECOND])),
                latch=rank != Rank.AUTO and draw(st.booleans()),
            )
        )
    return tuple(rules)


@st.composite
def sites(draw: st.DrawFn, *tanks: str, read_actuators: bool = True) -> SiteDecl:
    """Return a site of some tanks, `t` alone unless said otherwise."""
    names = tanks or ("t",)
    return SiteDecl(
        signals=tuple(signal for tank in names for signal in signals_of(tank)),
        actuators=tuple(one for tank in names for one in draw(actuators_of(tank))),
        rules=tuple(rule for tank in names for rule in draw(rules_of(tank, read_actuators=read_actuators))),
        startup_grace=draw(st.sampled_from([0, GRACE])),
        link_tolerance=TOLERANCE,
    )


FAULTS = st.sampled_from([Fault.AWAITED, Fault.SILENT, Fault.FAILED]).map(lambda fault: Signal(None, fault))
LEVELS = st.sampled_from([0.4, 1.0, 1.5, 2.0, 2.6]).map(lambda value: Signal(value, Fault.NONE))
CONTACTS = st.sampled_from(["yes", "no"]).map(lambda word: Signal(word, Fault.NONE))
PAUSES = st.sampled_from([0, 1, SECOND // 2, SECOND, 2 * SECOND, 3 * SECOND, 8 * SECOND, 40 * SECOND])


def signals_at(t: int, tank: int = 0) -> st.SearchStrategy[Event]:
    """Return new values of one to four signals of a tank, given by its place among the tanks."""
    level = st.tuples(st.sampled_from([4 * tank, 4 * tank + 1]), LEVELS | FAULTS)
    contact = st.tuples(st.sampled_from([4 * tank + 2, 4 * tank + 3]), CONTACTS | FAULTS)
    changes = st.lists(level | contact, min_size=1, max_size=4, unique_by=lambda change: change[0])
    return changes.map(lambda found: Signals(t, tuple(found)))


@st.composite
def histories(draw: st.DrawFn, *, tanks: int = 1, restarts: bool = True, outages: bool = True) -> list[Event]:
    """Return what happens to a site, from its first start on. A start may turn the clock back."""
    t = draw(st.sampled_from([0, 100 * SECOND]))
    events: list[Event] = [Started(t), LinkProven(t + draw(PAUSES))]
    for _ in range(draw(st.integers(1, 25))):
        t = max(t, events[-1].t) + draw(PAUSES)
        kind = draw(st.integers(0, 11))
        if kind == 0 and outages:
            events.append(LinkLost(t))
        elif kind in {1, 2} and outages:
            events.append(LinkProven(t))
        elif kind == 3 and restarts:
            t = draw(st.sampled_from([5 * SECOND, t]))
            events += [Started(t), LinkProven(t + SECOND)]
        elif kind == 4:
            events.append(Passed(t))
        else:
            events.append(draw(signals_at(t, draw(st.integers(0, tanks - 1)))))
    return events


def run(site: SiteDecl, events: Iterable[Event], look: Callable[[Engine, list[Effect]], None] | None = None) -> Engine:
    """Let events happen to a fresh engine, looking at it after each."""
    engine = Engine(site)
    for event in events:
        effects = engine.step(event)
        if look is not None:
            look(engine, effects)
    return engine


def chased(effects: Iterable[Effect]) -> bool:
    """Return whether rules chased each other, which is a fault of the settings and ends in safe."""
    return any(isinstance(effect, Noted) and "chase" in effect.text for effect in effects)
