"""What has its place in the settings and comes later is refused by name; it is never passed over in silence."""

import pytest
from marked import SITE, TANK, changed, complaints, marks

from gateway.settings import models

TANK_KEYS = {
    "most_inflow: 1.2 l/s",
    "pump_sets: {pumps: {members: [pump]}}",
    "alarms: {}",
    "typical: vat",
    "blanks: {n: 1}",
    "season: nov to mar",
}
SITE_KEYS = {"web: {listen: 127.0.0.1:8420}", "pump_sets: {}", "alarms: {}", "bypass_at_most: 8 h"}
ACTUATOR_KEYS = {
    "feedback: {topic: x}",
    "limits: {on: {at_most: 20 min}}",
    "proves: level falls 20 mm within 4 min",
    "will: true",
    "exercise: 30 d",
    "on_stop: safe",
    "locked: true",
}
RULE_KEYS = {"alarm: high", "outranks: other"}
JOURNAL_KEYS = {"keep_readings: 400 d", "spool: x"}

# Where a key is put in: what stands before it in the tank's file.
PLACES = [
    *(("sensors:\n", f"^{key}\nsensors:\n") for key in sorted(TANK_KEYS)),
    *(("safe: off, ", f"safe: off, ^{key}, ") for key in sorted(ACTUATOR_KEYS)),
    *(("demand: pump on, ", f"demand: pump on, ^{key}, ") for key in sorted(RULE_KEYS)),
    ("topic: farm/pump", "topic: farm/pump, ^repeat: 30 s"),
]


@pytest.mark.parametrize(("old", "new"), PLACES)
def test_a_key_that_comes_later_is_refused_by_name_at_its_place(old: str, new: str) -> None:
    """One complaint, at the key."""
    text, places = marks(changed(TANK, old, new))
    key = new.split("^")[1].split(":", maxsplit=1)[0]
    assert complaints(sump=text) == [f"tanks/sump.yaml:{places[0]}: `{key}` is not yet supported"]


@pytest.mark.parametrize("line", sorted(SITE_KEYS))
def test_a_key_of_the_site_that_comes_later_is_refused_by_name(line: str) -> None:
    """The same for `site.yaml`."""
    assert complaints(SITE + line + "\n") == [f"site.yaml:3:1: `{line.split(':', maxsplit=1)[0]}` is not yet supported"]


@pytest.mark.parametrize("line", sorted(JOURNAL_KEYS))
def test_a_key_of_the_journal_that_comes_later_is_refused_by_name(line: str) -> None:
    """The same within `journal`."""
    found = complaints(SITE + f"journal: {{{line}}}\n")
    assert found == [f"site.yaml:3:11: `{line.split(':', maxsplit=1)[0]}` is not yet supported"]


@pytest.mark.parametrize(
    ("part", "tested"),
    [
        (models.TankFile, TANK_KEYS),
        (models.SiteFile, SITE_KEYS),
        (models.Actuator, ACTUATOR_KEYS),
        (models.Rule, RULE_KEYS),
        (models.Command, {"repeat: 30 s"}),
        (models.Journal, JOURNAL_KEYS),
        (models.Broker, set()),
    ],
)
def test_every_key_that_comes_later_is_tried_here(part: type[models.TankFile], tested: set[str]) -> None:
    """Each key of the lists stands in the tests above, and none has meanwhile become a key that is read."""
    assert {key.split(":")[0] for key in tested} == set(part.LATER)
    assert not set(part.LATER) & {field.alias or name for name, field in part.model_fields.items()}


@pytest.mark.parametrize(
    ("old", "new", "message"),
    [
        (
            "topic: farm/pump",
            "topic: farm/pump, payloads: {on: ^'1 {seq}', off: '0 {seqs}'}",
            "`{seq}` is not yet supported",
        ),
        ("demand: pump on", "demand: ^2 of pumps on", "pump sets are not yet supported"),
        ("level above 1.5 m", "^time between 22:00 and 06:00", "`time between … and …` is not yet supported"),
        ("level above 1.5 m", "^day is mon to fri", "is not yet supported"),
        ("level above 1.5 m", "^month is nov to mar", "is not yet supported"),
        ("level above 1.5 m", "^any of vat-*.level above 1 m", "is not yet supported"),
        ("level above 1.5 m", "^starts of pump in 1 h above 5", "is not yet supported"),
        ("level above 1.5 m", "^run time of pump in today above 1 h", "is not yet supported"),
        ("level above 1.5 m", "pump ^is faulty", "`is faulty` is not yet supported"),
        ("level above 1.5 m", "pump ^is locked out", "`is locked out` is not yet supported"),
    ],
)
def test_a_value_that_comes_later_is_refused_by_name(old: str, new: str, message: str) -> None:
    """Forms, ways to sense and words of conditions that are described and not read yet."""
    text, places = marks(changed(TANK, old, new))
    (found,) = complaints(sump=text)
    assert found.startswith(f"tanks/sump.yaml:{places[0]}: "), found
    assert message in found


def test_typicals_are_refused_by_name() -> None:
    """One description for many tanks comes later."""
    text, places = marks(SITE + "tanks: [^{typical: vat, each: {n: 1 to 24}}]\n")
    assert complaints(text) == [f"site.yaml:{places[0]}: `typical` is not yet supported"]
