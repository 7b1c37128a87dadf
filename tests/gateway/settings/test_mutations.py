"""Every small change of the example sites is refused with its place or has an effect; none raises or is passed over."""

import json
from collections.abc import Callable, Iterator
from pathlib import Path
from typing import Any

import pytest
import yaml
from hypothesis import given
from hypothesis import strategies as st

from gateway.effects import Effect, Value
from gateway.events import LinkDown, LinkUp, Message, Start, Stop, Wake
from gateway.examples import example
from gateway.journal.effects import effect_row
from gateway.measure.status import Status
from gateway.plant import Plant
from gateway.settings.advice import advise
from gateway.settings.assemble import plant_plan
from gateway.settings.complaint import SettingsError
from gateway.settings.load import load, load_texts
from gateway.settings.models import Site
from gateway.settings.yaml_reader import read_yaml
from gateway.topics import compact, tank_told

SITES = {name: load(example(name)) for name in ("first-tank", "hill-dairy")}
NAMING = {"sensors", "actuators", "rules", "payloads"}  # the keys under these are the user's own

Way = tuple[str | int, ...]

WRONG: dict[str, Any] = {
    "nothing": None,
    "true": True,
    "minus one": -1,
    "a number": 1.5,
    "infinity": float("inf"),
    "empty text": "",
    "a word": "xyzzy",
    "a level": "7 m",
    "a time": "7 s",
    "a share": "7 %",
    "a list": ["a", {"b": 1}],
    "an empty list": [],
    "a mapping": {"a": {"b": []}},
    "an empty mapping": {},
    "control characters": "\x1b[2J\u0085",
    "long text": "level above " * 400,
}


def documents(site: Site) -> dict[str, Any]:
    """Return the plain values of every file of a site."""
    found = {}
    for file, text in site.texts.items():
        node = read_yaml(file, text, [])
        assert node is not None
        found[file] = node.plain()
    return found


def ways(document: Any, before: Way = ()) -> Iterator[Way]:
    """Yield the way to every value within a document."""
    pairs = (
        document.items() if isinstance(document, dict) else enumerate(document) if isinstance(document, list) else ()
    )
    for step, inner in pairs:
        yield (*before, step)
        yield from ways(inner, (*before, step))


def at(document: Any, way: Way) -> Any:
    """Return what stands at the end of a way."""
    for step in way:
        document = document[step]
    return document


def reread(site: Site, file: str, change: Callable[[Any], None]) -> Site | SettingsError:
    """Return a site, read anew with one of its files changed."""
    document = documents(site)[file]
    change(document)
    text = yaml.safe_dump(document, allow_unicode=True, sort_keys=False, width=1_000)
    return read_again(site, file, text)


def read_again(site: Site, file: str, text: str) -> Site | SettingsError:
    """Return a site, read anew with another text for one of its files."""
    found: Site | SettingsError
    try:
        found = load_texts(site.texts | {file: text}, Path("/nowhere"))
    except SettingsError as error:
        found = error
    if isinstance(found, SettingsError):
        assert found.complaints
        for one in found.complaints:
            assert one.file in site.texts
            assert 1 <= one.line <= len(text.splitlines()) + 1 or one.file != file
            assert one.column >= 1
            assert one.message
            assert str(one).isprintable()
    return found


def exercised(site: Site) -> list[Effect]:
    """Do with a site what the gateway would: build it, tell of it, let things happen to it."""
    plan = plant_plan(site)
    assert all(isinstance(line, str) for line in advise(site, plan))
    assert all(str(rule.from_) and str(rule.until) for rule in plan.site.rules)
    plant = Plant(plan)
    effects = plant.step(Start(1, 0)) + plant.step(LinkUp(2))
    for t, payload in enumerate((b"", b"1", b'{"hz": 4000, "current": {"ma": 12}}', b"\xff", b"1e308"), 3):
        for topic in plant.topics:
            effects += plant.step(Message(t, topic, payload))
    effects += plant.step(LinkDown(10, "test")) + plant.step(Wake(10**12)) + plant.step(Stop(2 * 10**12))
    for actuator in plan.commands:
        assert json.dumps(plant.explain(actuator), allow_nan=False)
    return [effect for effect in effects if told(effect)]


def told(effect: Effect) -> str:
    """Return an effect as it is published, or as it is kept in the journal; each is JSON with finite numbers."""
    if isinstance(effect, Value):
        return compact(tank_told(effect, effect.at)).decode()
    row = effect_row(1, effect)
    assert row is not None
    return json.dumps(row.data, allow_nan=False)


Case = tuple[str, str, Way]

EVERY: list[Case] = [
    (name, file, way)
    for name, site in SITES.items()
    for file, document in documents(site).items()
    for way in ways(document)
]
KEYS = [case for case in EVERY if isinstance(case[2][-1], str)]


def called(cases: list[Case]) -> list[Any]:
    """Return the cases with names for people."""
    return [pytest.param(*case, id=":".join((case[0], case[1], ".".join(map(str, case[2]))))) for case in cases]


@pytest.mark.parametrize(("name", "file", "way"), called(KEYS))
def test_a_key_that_is_left_out_is_missed_or_has_a_default(name: str, file: str, way: Way) -> None:
    """Without any one key the site is refused, or can be run."""

    def leave_out(document: Any) -> None:
        del at(document, way[:-1])[way[-1]]

    found = reread(SITES[name], file, leave_out)
    if isinstance(found, Site):
        assert exercised(found)


@pytest.mark.parametrize(("name", "file", "way"), called(KEYS))
def test_a_key_that_is_misspelt_is_refused_by_name(name: str, file: str, way: Way) -> None:
    """No key is ever ignored. What is the user's own name may change where nothing else rests on it."""
    key = str(way[-1])

    def misspell(document: Any) -> None:
        around = at(document, way[:-1])
        pairs = [(f"{one}x" if one == key else one, value) for one, value in around.items()]
        around.clear()
        around.update(pairs)

    found = reread(SITES[name], file, misspell)
    if len(way) > 1 and way[-2] in NAMING:
        assert not isinstance(found, Site) or exercised(found)
        return
    assert isinstance(found, SettingsError)
    assert any(one.message.startswith(f"`{key}x` is not known here; ") for one in found.complaints)


def wrong_for(name: str, index: int) -> dict[str, Any]:
    """Return what is tried: everything in the small site, a quarter at each place of the large one, taking turns."""
    return {
        what: value
        for turn, (what, value) in enumerate(WRONG.items())
        if name == "first-tank" or (turn - index) % 4 == 0
    }


@pytest.mark.parametrize(("name", "file", "way"), called(EVERY))
def test_a_value_of_another_kind_is_refused_or_has_an_effect(name: str, file: str, way: Way) -> None:
    """A value that is accepted changes what is read; nothing is quietly taken for what stood there before."""
    site = SITES[name]
    before = at(documents(site)[file], way)
    for what, value in wrong_for(name, EVERY.index((name, file, way))).items():

        def put(document: Any, value: Any = value) -> None:
            at(document, way[:-1])[way[-1]] = value

        found = reread(site, file, put)
        if isinstance(found, Site):
            assert (found.file, found.tanks) != (site.file, site.tanks) or value == before, what
            assert exercised(found), what


@given(st.data())
def test_any_character_put_in_or_taken_out_is_refused_or_can_be_run(data: st.DataObject) -> None:
    """A slip of the finger in the text itself raises nothing either."""
    site = SITES["first-tank"]
    file = data.draw(st.sampled_from(sorted(site.texts)))
    text = site.texts[file]
    place = data.draw(st.integers(0, len(text) - 1))
    sign = data.draw(st.sampled_from([*"\n\t :-,[]{}&*!|>'\"%@`#?.0a~", "\u2028", "\x00", "ü", ""]))
    changed = text[:place] + sign + text[place + data.draw(st.integers(0, 3)) :]
    found = read_again(site, file, changed)
    assert isinstance(found, SettingsError) or exercised(found)


@pytest.mark.parametrize("payload", [b"1e308", b"-1e308", b"1e-308", b"1e7"])
def test_a_payload_far_from_any_level_ends_in_a_named_status(payload: bytes) -> None:
    """A device that sends the level itself, and no range: what is published stays JSON with finite numbers."""
    site = SITES["first-tank"]
    file = "tanks/rain-tank.yaml"

    def send_levels(document: Any) -> None:
        document["sensors"]["head"] = {"topic": "t", "senses": "level", "expect_every": "1 s"}
        document["brim"] = "0.5 m"

    found = reread(site, file, send_levels)
    assert isinstance(found, Site)
    plant = Plant(plant_plan(found))
    effects = plant.step(Start(1, 0)) + plant.step(LinkUp(2)) + plant.step(Message(3, "t", payload))
    assert all(told(effect) for effect in effects)
    small = float(payload) < 1e6 and float(payload) > -1e6
    assert plant.meters.sensors[0].status is (Status.GOOD if small else Status.FAILURE)
