"""What the gateway tells the world: its own topics, and the JSON on them. Pure."""

import json
from datetime import UTC, datetime
from typing import Any

from gateway.effects import Command, Reason, Value

MILLI = 1_000_000  # ns
FIRST_YEAR, LAST_YEAR = 1970, 2261  # what ns since 1970 reach in 63 bits


def moment(at: int) -> str:
    """Return a wall time in ns as UTC, RFC 3339, with milliseconds."""
    seconds, rest = divmod(at // MILLI, 1000)
    return f"{datetime.fromtimestamp(seconds, UTC):%Y-%m-%dT%H:%M:%S}.{rest:03d}Z"


def compact(document: dict[str, Any]) -> bytes:
    """Return JSON in its shortest form, keys sorted, numbers finite."""
    return json.dumps(document, sort_keys=True, allow_nan=False, ensure_ascii=False, separators=(",", ":")).encode()


def segment(name: str) -> str:
    """Return a name as part of a topic."""
    return name.replace(" ", "-").replace(".", "/")


class Topics:
    """The gateway's own topics under one root."""

    def __init__(self, root: str) -> None:
        self.gateway = f"{root}/gateway"
        self.echo = f"{root}/gateway/echo"
        self._root = root

    def tank(self, name: str) -> str:
        """Return the topic of a tank's values."""
        return f"{self._root}/tank/{segment(name)}"

    def actuator(self, name: str) -> str:
        """Return the topic of an actuator's state."""
        return f"{self._root}/actuator/{segment(name)}"


def rounded(value: float | None, digits: int) -> float | None:
    """Return a number for people, without noise; never the negative nothing."""
    return None if value is None else round(value, digits) + 0.0


def tank_told(value: Value, since: int) -> dict[str, Any]:
    """Return a tank's values as they are published: level in m, volume in litres, net flow in litres a second."""
    return {
        "level_m": rounded(value.level if isinstance(value.level, float) else None, 4),
        "percent": rounded(None if value.share is None else value.share * 100, 2),
        "volume_l": rounded(None if value.volume is None else value.volume * 1000, 1),
        "flow_l_s": rounded(None if value.flow is None else value.flow * 1000, 4),
        "status": value.status,
        "since": moment(since),
    }


def actuator_told(effect: Command | Reason, since: int) -> dict[str, Any]:
    """Return an actuator's state as it is published. Feedback and limits are not followed yet."""
    return {
        "state": effect.state,
        "reason": effect.reason,
        "rank": effect.rank,
        "rule": effect.rule,
        "since": moment(since),
        "feedback": None,
        "limits": [],
    }
