"""A hundred thousand random and malicious payloads, between readings that say that all is well."""

import json
import random
from collections.abc import Callable

import pytest

from gateway.effects import Command, RuleChange
from gateway.events import LinkUp, Message, Start
from gateway.examples import example
from gateway.plant import Plant
from gateway.settings.assemble import plant_plan
from gateway.settings.load import load

SECOND = 1_000_000_000
MANY = 100_000
ROUNDS = 8  # seeds: each has an eighth of them

# What each sensor says when all is well.
CALM = {
    "dairy/condensate-drum/probe": b'{"hz": 9000}',
    "dairy/condensate-drum/float": b"0",
    "dairy/wash-sump/ma": b'{"current": {"ma": 10}}',
    "dairy/wash-sump/float": b"0",
    "dairy/wash-sump/alive": b"1",
    "dairy/header-tank/pf": b"1500",
    "dairy/cistern/mm": b"1000",
}
STRANGE_NUMBERS = [
    "NaN", "-NaN", "Infinity", "-Infinity", "1e999", "-1e999", "1e-999x", "0x7f", "0b1", "1_000", "1,5", "٣", "½", "⁵",
    "+-1", "--1", "1e", "e1", ".", "-", "1 2", "1;2", "9" * 5_000, "-" * 5_000, "1e+", "null", "true", "[]", "{}", '""',
    "1e6", "-1e6", "1e15", "-99999", "$(reboot)", "'; DROP TABLE inputs; --", "%s%n", "\x00", "\x001000", "1000\x00",
]  # fmt: skip
FIELDS = ["hz", "current", "ma", "", "/hz", "HZ", "hz ", "__proto__", "\u202e", "hz\x00"]


def _bytes(dice: random.Random) -> bytes:
    return b"\xff" + dice.randbytes(dice.randrange(200))  # never UTF-8, so never a reading


def _mangled(dice: random.Random) -> bytes:
    """Return a good payload with a byte in it that no number, and no JSON, has there."""
    good = bytearray(dice.choice(list(CALM.values())))
    good.insert(dice.randrange(len(good) + 1), dice.choice(b"\x00\x01\x7f\x80\xc3\xed\xf5\xff~`"))
    return bytes(good)


def _number(dice: random.Random) -> bytes:
    return dice.choice(STRANGE_NUMBERS).encode()


def _number_in_a_field(dice: random.Random) -> bytes:
    return f'{{"hz": {dice.choice(STRANGE_NUMBERS)}, "current": {{"ma": {dice.choice(STRANGE_NUMBERS)}}}}}'.encode()


def _wrong_kind(dice: random.Random) -> bytes:
    kinds: list[object] = [None, True, False, [], [9000], "9000", [[[]]], "", "wet", -1, 10**400]
    value = dice.choice(kinds)
    return json.dumps({"hz": value, "current": dice.choice([value, {"ma": value}])}).encode()


def _wrong_field(dice: random.Random) -> bytes:
    name = dice.choice([field for field in FIELDS if field not in {"hz", "current"}])
    return json.dumps({name: {name: 9000}}).encode()


def _twice(dice: random.Random) -> bytes:
    """Return an object in which a name stands twice: nobody knows which is meant."""
    one, other = dice.sample([2600, 9000, 70_000], 2)
    return b'{"hz": %d, "hz": %d, "current": {"ma": 19, "ma": 5}}' % (one, other)


def _deep(dice: random.Random) -> bytes:
    opening = dice.choice([b"[", b'{"hz":', b'{"current":{"ma":', b'["', b"{"])
    return opening * dice.choice([50, 5_000, 60_000 // len(opening)])


def _long(dice: random.Random) -> bytes:
    return dice.choice([b" ", b"0", b"9", b"\x00", b'"', b"\\"]) * dice.choice([0, 1_000, 65_537, 200_000]) + b"."


KINDS: list[Callable[[random.Random], bytes]] = [
    _bytes, _bytes, _mangled, _mangled, _number, _number_in_a_field, _wrong_kind, _wrong_field, _twice,
]  # fmt: skip
SLOW = [_deep, _long]  # one in a hundred, for their length


def _hostile(dice: random.Random) -> bytes:
    return dice.choice(SLOW if dice.randrange(100) == 0 else KINDS)(dice)


@pytest.mark.parametrize("seed", range(ROUNDS))
def test_no_payload_of_a_hundred_thousand_moves_anything(seed: int) -> None:
    """Nor raises, nor makes a rule change; each is counted as rejected, and the plant still works after all of them."""
    dice = random.Random(seed)
    plant = Plant(plant_plan(load(example("hill-dairy"))))
    t = 0
    plant.step(Start(t, 0))
    plant.step(LinkUp(t))
    for _ in range(30):  # until every delay of every rule is over
        t += SECOND
        for topic, payload in CALM.items():
            plant.step(Message(t, topic, payload))
    heard = [topic for topic in CALM if not topic.endswith("/alive")]
    before = sum(sensor.rejected for sensor in plant.meters.sensors)
    for _ in range(MANY // ROUNDS):
        t += SECOND // 100
        topic = dice.choice(heard)
        payload = _hostile(dice)
        effects = plant.step(Message(t, topic, payload))
        effects += plant.step(Message(t, topic, CALM[topic]))
        if dice.randrange(50) == 0:
            for one, calm in CALM.items():
                effects += plant.step(Message(t, one, calm))
        assert not [effect for effect in effects if isinstance(effect, (Command, RuleChange))], (topic, payload)
    assert sum(sensor.rejected for sensor in plant.meters.sensors) - before == MANY // ROUNDS
    drum = [*plant.step(Message(t, "dairy/condensate-drum/float", b"1")), *plant.step(LinkUp(t + 2 * SECOND))]
    assert [effect.payload for effect in drum if isinstance(effect, Command) and not effect.again] == ["stopped"]


@pytest.mark.parametrize("seed", range(ROUNDS))
def test_no_payload_on_the_topic_of_life_counts_as_life(seed: int) -> None:
    """What cannot be understood there is no sign of life."""
    dice = random.Random(seed)
    plant = Plant(plant_plan(load(example("hill-dairy"))))
    plant.step(Start(0, 0))
    plant.step(LinkUp(0))
    plant.step(Message(0, "dairy/wash-sump/float", b"0"))
    float_ = next(sensor for sensor in plant.meters.sensors if sensor.plan.name == "wash-sump.high-float")
    for _ in range(200):
        plant.step(Message(1, "dairy/wash-sump/alive", _hostile(dice)))
        assert float_.signal.value is None
    plant.step(Message(2, "dairy/wash-sump/alive", b"1"))
    assert float_.signal.value == "dry"
