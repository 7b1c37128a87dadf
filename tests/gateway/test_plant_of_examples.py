"""Properties of the plant on the examples that combine, compensate and total: invariants 19 and 23."""

import json

from hypothesis import given
from hypothesis import strategies as st

from gateway.effects import RuleChange
from gateway.events import ClockSet, Event, LinkDown, LinkUp, Message, Start, Wake
from gateway.examples import example
from gateway.plan import PlantPlan
from gateway.plant import Plant
from gateway.settings.assemble import plant_plan
from gateway.settings.load import load

SECOND = 1_000_000_000
WALL = 1_777_629_600 * SECOND
PLANS: dict[str, PlantPlan] = {
    name: plant_plan(load(example(name)))
    for name in ("coolant-sump", "nutrient-reservoir", "roof-tank", "lying-cistern")
}
NUMBERS = ["0.5", "4.8", "11", "12.1", "19", "27.3", "31", "950", "1013.25", "1100.5", "1160", "3000", "4000", "x", ""]


@st.composite
def lives(draw: st.DrawFn) -> tuple[str, list[Event]]:
    """Return an example, and what happens to it: any number on any of its topics, restarts, outages, clocks set."""
    name = draw(st.sampled_from(sorted(PLANS)))
    topics = [topic for sensor in PLANS[name].sensors for topic in (sensor.topic,)]
    t = 100 * SECOND
    events: list[Event] = [Start(t, WALL), LinkUp(t)]
    for _ in range(draw(st.integers(1, 40))):
        t += draw(st.sampled_from([0, SECOND, 2 * SECOND, 5 * SECOND, 15 * SECOND, 100 * SECOND, 4000 * SECOND]))
        kind = draw(st.integers(0, 24))
        if kind == 0:
            events += [LinkDown(t, "gone"), LinkUp(t + draw(st.sampled_from([0, 40 * SECOND])))]
        elif kind == 1:
            events += [Start(t, WALL), LinkUp(t)]
        elif kind == 2:
            events.append(ClockSet(t, WALL + draw(st.integers(-(10**13), 10**13))))
        else:
            number = draw(st.sampled_from(NUMBERS))
            own = (t + WALL) // SECOND - draw(st.integers(-5, 100))
            payload = json.dumps({"us": 1200 + len(number) * 900, "celsius": 20 + len(number), "ts": own})
            is_json = name == "nutrient-reservoir"
            old = draw(st.sampled_from(["", "", "", "retained", "late"]))
            said = payload if is_json else number
            topic = draw(st.sampled_from(topics))
            events.append(Message(t, topic, said.encode(), retained=old == "retained", late=old == "late"))
        t = events[-1].t
    return name, events


@given(lives(), st.integers(0, 40))
def test_invariant_23_a_saved_plant_goes_on_as_if_it_had_never_stopped(life: tuple[str, list[Event]], at: int) -> None:
    """Saved as text at any event; every effect, every time to wake and the whole state are the same."""
    name, events = life
    whole, copy = Plant(PLANS[name]), Plant(PLANS[name])
    for number, event in enumerate(events):
        if number == at:
            copy = Plant(PLANS[name])
            copy.restore(json.loads(json.dumps(whole.save())))
        assert whole.step(event) == copy.step(event)
        assert whole.wake_at == copy.wake_at
        assert json.dumps(whole.save()) == json.dumps(copy.save())


@given(lives())
def test_invariant_19_old_news_leaves_every_command_unchanged(life: tuple[str, list[Event]]) -> None:
    """Late and retained readings taken away, and the time left, the same is decided."""
    name, events = life
    news = [Wake(e.t) if isinstance(e, Message) and (e.late or e.retained) else e for e in events]
    decided: list[object] = []
    for some in (events, news):
        plant = Plant(PLANS[name])
        effects = [effect for event in some for effect in plant.step(event)]
        effects += plant.step(LinkUp(events[-1].t))
        decided.append([effect for effect in effects if isinstance(effect, RuleChange)])
        decided.append([plant.explain(actuator)["state"] for actuator in plant.plan.commands])
    assert decided[:2] == decided[2:]
