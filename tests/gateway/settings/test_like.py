"""`like`: an actuator takes over, deeply, what another has and it has not."""

import pytest
from marked import SITE, complaints, marks, read

from gateway.settings.models import Actuator

FIRST = """\
tank: sump
actuators:
  pump-1:
    safe: off
    command: {topic: a/1, payloads: {on: "1", off: "0"}, expiry: 20 s}
"""


def actuators(text: str) -> dict[str, Actuator]:
    """Return the actuators of the first tank, with more lines after it."""
    return read(sump=FIRST + text).tanks["sump"].actuators


def test_what_is_not_written_is_taken_over_and_what_is_written_stands() -> None:
    """Also inside of `command`; in file order before or after makes no difference."""
    found = actuators("  pump-2: {like: pump-1, command: {topic: a/2, payloads: {on: run}}}\n")
    second = found["pump-2"]
    assert (second.safe, second.command.topic, second.command.expiry) == ("off", "a/2", 20_000_000_000)
    assert second.command.payloads == {"on": "run", "off": "0"}
    assert found["pump-1"].command.payloads == {"on": "1", "off": "0"}
    text = FIRST.replace("actuators:\n", "actuators:\n  pump-2: {like: pump-1, command: {topic: a/2}}\n")
    assert read(sump=text).tanks["sump"].actuators["pump-2"].command.expiry == 20_000_000_000


def test_like_can_be_followed_from_one_to_the_next() -> None:
    """The nearest that has a key gives it."""
    found = actuators(
        "  pump-3: {like: pump-2, command: {topic: a/3}}\n"
        "  pump-2: {like: pump-1, prefer: on, command: {topic: a/2, expiry: 5 s}}\n"
    )
    third = found["pump-3"]
    assert (third.safe, third.prefer, third.command.expiry) == ("off", "on", 5_000_000_000)


def test_an_alias_is_not_changed_by_a_like() -> None:
    """What two actuators share by an alias stays what it was for the one that has no `like`."""
    text = (
        "tank: sump\nactuators:\n"
        "  a: {command: {topic: x, payloads: {on: ON, off: OFF}}}\n"
        "  b: {command: &plain {topic: y}}\n"
        "  c: {like: a, command: *plain}\n"
    )
    # The two share a topic, which is the one complaint; that `b` has no payloads of `a` shows in the second reading.
    assert complaints(sump=text) == ["tanks/sump.yaml:4:31: `y` commands sump.b already"]
    site = "site: farm\nbroker: {url: embedded}\n" + text.split("\n", 1)[1].replace("*plain", "{topic: z}")
    assert read(site).file.actuators["b"].command.payloads is None


@pytest.mark.parametrize(
    ("lines", "message"),
    [
        ("  pump-2: {like: ^pump-3}\n", "`like` names another actuator of this file, not `pump-3`; did you mean"),
        ("  pump-2: {like: ^pump-2}\n", "`like` names another actuator of this file, not `pump-2`"),
        ("  pump-2: {like: ^[pump-1]}\n", "`like` names another actuator of this file, not"),
        (
            "  pump-2: {like: pump-1, command: {topic: x, ^topc: y}}\n",
            "`topc` is not known here; did you mean `topic`?",
        ),
        ("  pump-2: {like: pump-1, command: ^7}\n", "`7`: expected `key: value` lines"),
    ],
)
def test_a_like_that_cannot_be_followed_is_a_complaint(lines: str, message: str) -> None:
    """At its place, with the nearest name."""
    plain, places = marks(FIRST + lines)
    found = complaints(sump=plain)
    assert [one.split(": ")[0] for one in found] == [f"tanks/sump.yaml:{places[0]}"]
    assert message in found[0]


def test_a_circle_of_likes_is_a_complaint() -> None:
    """Nobody is like himself, nor by way of others."""
    found = complaints(sump=FIRST + "  a: {like: b}\n  b: {like: c}\n  c: {like: a}\n")
    assert found[0].startswith("tanks/sump.yaml:6:13: ")
    assert all("`like` names another actuator of this file, not" in one for one in found)


def test_a_mistake_taken_over_is_told_where_it_stands() -> None:
    """A complaint about a merged value has the place where the value was written."""
    found = complaints(
        sump=FIRST.replace("expiry: 20 s", "expiry: 20") + "  pump-2: {like: pump-1, command: {topic: x}}\n"
    )
    assert [one.split(": ")[0] for one in found] == ["tanks/sump.yaml:5:66"]


def test_likes_are_bounded() -> None:
    """A long chain ends in a complaint, and so does a short file that stands for a huge one."""
    chain = "".join(f"  p{n}: {{like: p{n + 1}}}\n" for n in range(5_000))
    found = complaints(sump=f"tank: sump\nactuators:\n{chain}  p5000: {{command: {{topic: x}}}}\n")
    assert found
    assert all(one.endswith("`like` is followed 20 times at most") for one in found)
    many = "".join(f"  p{n}: {{like: p}}\n" for n in range(5_000))
    payloads = ", ".join(f"w{n}: {n}" for n in range(1_000))
    found = complaints(
        SITE, sump=f"tank: sump\nactuators:\n  p: {{command: {{topic: x, payloads: {{{payloads}}}}}}}\n{many}"
    )
    assert found == ["tanks/sump.yaml:3:3: the actuators hold more than 200000 values, `like` counted in full"]
