"""What happens at the hill dairy of the examples: an invented morning, told in flows and incidents.

The morning is made so that in twenty minutes each of the site's rules has something to do.
"""

from collections.abc import Callable
from dataclasses import dataclass

from gateway.simulate.devices import Device
from gateway.simulate.water import Flow, States

LITRE = 1e-3  # m3
MINUTE = 60.0

START_LEVELS = {"condensate-drum": 0.62, "wash-sump": 0.55, "cistern": 0.62, "header-tank": 0.40}


def _washing(_: States, t: float) -> bool:
    """Return whether somebody is washing: the first seven minutes of every ten."""
    return t % (10 * MINUTE) < 7 * MINUTE


FLOWS = (
    Flow(
        rate=0.18 * LITRE,
        sink="condensate-drum",
        while_=lambda states, _: states["condensate-drum.cooling-unit"] == "running",
    ),
    Flow(  # once the unit has been stopped, somebody carries the water away
        rate=1.2 * LITRE,
        source="condensate-drum",
        while_=lambda states, t: (
            states["condensate-drum.cooling-unit"] == "stopped" and 7 * MINUTE < t % (10 * MINUTE) < 9 * MINUTE
        ),
    ),
    Flow(
        rate=1.6 * LITRE,
        sink="wash-sump",
        while_=lambda states, t: states["wash-sump.wash-hose"] == "free" and _washing(states, t),
    ),
    Flow(
        rate=3.2 * LITRE,
        source="wash-sump",
        while_=lambda states, _: states["wash-sump.pump"] == "on",
        draws_above=0.15,
    ),
    Flow(
        rate=1.4 * LITRE,
        source="cistern",
        sink="header-tank",
        while_=lambda states, _: states["cistern.transfer-pump"] == "on",
        draws_above=0.25,
    ),
    Flow(rate=0.9 * LITRE, source="header-tank", while_=_washing),
    Flow(rate=1.0 * LITRE, sink="cistern", while_=lambda _, t: 12 * MINUTE < t < 16 * MINUTE),  # a shower
)


@dataclass(frozen=True, slots=True)
class Incident:
    """Something that happens to the devices at `t` seconds, and the sentence that tells of it."""

    t: float
    sentence: str
    happen: Callable[[dict[str, Device]], None]


def _cut(devices: dict[str, Device]) -> None:
    devices["wash-sump.transmitter"].broken = 3.2  # mA: what a transmitter sends through a broken wire, or less


def _mend(devices: dict[str, Device]) -> None:
    devices["wash-sump.transmitter"].broken = None


INCIDENTS = (
    Incident(7.5 * MINUTE, "a rat bites through the wire of the wash sump's transmitter", _cut),
    Incident(11 * MINUTE, "somebody mends the wire", _mend),
    Incident(12 * MINUTE, "a shower of rain fills the cistern for four minutes", lambda _: None),
)
