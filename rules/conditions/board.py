"""Every signal as it is now: what conditions read."""

from collections.abc import Iterable
from typing import Any

from rules.model import ActuatorDecl, Fault, Signal, SignalDecl, Value, restored, saved


class Board:
    """Every signal as it is now. An actuator is a signal too: its value is the state it was last commanded to."""

    def __init__(self, signals: Iterable[SignalDecl], actuators: Iterable[ActuatorDecl]) -> None:
        decls = list(signals)
        names = [decl.name for decl in decls] + [decl.name for decl in actuators]
        self.slot = {name: slot for slot, name in enumerate(names)}
        self.unit = {decl.name: decl.dimension.unit if decl.dimension else "" for decl in decls}
        self.values: list[Value] = [None] * len(names)
        self.faults: list[Fault] = [Fault.AWAITED] * len(names)

    def put(self, slot: int, signal: Signal) -> None:
        """Let a signal be what it is now."""
        self.values[slot], self.faults[slot] = signal

    def forget(self) -> None:
        """Know nothing of any signal."""
        self.values[:] = [None] * len(self.values)
        self.faults[:] = [Fault.AWAITED] * len(self.faults)

    def save(self) -> list[list[Any]]:
        """Return every signal as plain JSON values."""
        return [[saved(value) for value in self.values], [int(fault) for fault in self.faults]]

    def restore(self, plain: list[list[Any]]) -> None:
        """Take up what `save` returned."""
        self.values[:] = [restored(value) for value in plain[0]]
        self.faults[:] = [Fault(fault) for fault in plain[1]]
