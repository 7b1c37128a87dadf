"""The link to the broker, as the control thread sees it."""

import logging
from collections.abc import Callable, Sequence

from gateway.link.messages import Incoming, LinkNews, Receipt
from gateway.link.options import LinkOptions


class Link:
    """Used by the control thread only. Signatures first; the body follows."""

    next_due: int
    proven: bool

    def __init__(
        self,
        options: LinkOptions,
        clock: Callable[[], int],
        wake: Callable[[], None],
        log: logging.Logger,
    ) -> None:
        raise NotImplementedError

    def start(self) -> None:
        """Begin to dial."""
        raise NotImplementedError

    def close(self, farewell: bytes | None) -> None:
        """Leave in order; `farewell` is published, retained, on the status topic first."""
        raise NotImplementedError

    def sockets(self) -> tuple[list[int], list[int], bool]:
        """File descriptors to wait for: readable, writable; and whether input is pending without waiting."""
        raise NotImplementedError

    def service(self, *, readable: bool, writable: bool, limit: int = 500) -> list[Incoming]:
        """Do what is due. Call it when a socket is ready, when woken, and at `next_due`."""
        raise NotImplementedError

    def events(self) -> list[LinkNews]:
        """What has happened since last asked, oldest first."""
        raise NotImplementedError

    def transit_bound(self, t: int) -> int | None:
        """How old an undated message read at `t` can be, in ns; None: unknown."""
        raise NotImplementedError

    def publish(
        self,
        topic: str,
        payload: bytes,
        *,
        qos: int = 1,
        retain: bool = False,
        expiry_s: int | None = None,
        even_unproven: bool = False,
    ) -> bool:
        """Send now or never. False: not sent, as the link is not proven."""
        raise NotImplementedError

    def acknowledge(self, receipts: Sequence[Receipt]) -> None:
        """Tell the broker that these are safely kept. Receipts of an earlier connection are dropped."""
        raise NotImplementedError
