"""The packets of MQTT that come by the thousand, read and written without detour: PUBLISH in, PUBACK out.

Everything else of the protocol is left to the client library. The library reads a packet in three or four system
calls and, under MQTT 5, builds a table of all properties for each; that is its whole worth of a processor at some
20,000 messages a second, and none would be left to think. Here one system call brings hundreds of packets.

The layout is that of the OASIS standards MQTT 3.1.1 and MQTT 5.0, sections 2.2 (fixed header), 3.3 (PUBLISH) and 3.4
(PUBACK); only quality of service 0 and 1. Pure: bytes in, values out.
"""

import struct
from collections.abc import Mapping, Sequence

PACKET_MOST = 1 << 18
"""Bytes of the largest packet that is taken in whole; what is larger is cut, see `PAYLOAD_KEPT`."""

PAYLOAD_KEPT = (1 << 16) + 1
"""Bytes of a payload that are kept of a packet above `PACKET_MOST`: enough to see that it is above 64 KiB."""

Published = tuple[str, bytes, bool, int]
"""Topic, payload, the retain flag, and the packet identifier (0: quality of service 0, nothing to acknowledge)."""


class BreachError(Exception):
    """The peer does not speak MQTT as the standard says; the connection is of no use any more."""


def remaining_length(data: bytes, pos: int) -> tuple[int, int] | None:
    """Read a variable byte integer (MQTT 5.0, 1.5.5) at `pos`: its value and where it ends; None: not all here yet."""
    value = 0
    for count in range(4):
        if pos + count >= len(data):
            return None
        byte = data[pos + count]
        value |= (byte & 0x7F) << (7 * count)
        if byte < 0x80:
            return value, pos + count + 1
    raise BreachError("a length of more than four bytes")


def puback(mids: Sequence[int]) -> bytes:
    """PUBACK packets for these packet identifiers, all successes (MQTT 5.0, 3.4.2.1: the reason may be left out)."""
    return struct.pack(f"!{len(mids)}I", *[0x40020000 | mid for mid in mids])


class Splitter:
    """Cuts a stream of bytes into messages and the rest.

    `published` collects what was published to us at quality of service 0 and 1, in order of arrival. `rest` collects
    whole packets of every other kind, for the client library. Any chunking of the same bytes gives the same result.
    """

    __slots__ = ("_known", "_need", "_skip", "_tail", "_v5", "published", "rest")

    def __init__(self, *, v5: bool, topics: Mapping[bytes, str]) -> None:
        self._v5 = v5
        self._known = topics
        self._tail = bytearray()  # the beginning of a packet whose end has not come
        self._need = 0  # how long the tail must become before it is worth looking at
        self._skip = 0  # bytes still to come of a packet that was cut
        self.published: list[Published] = []
        self.rest = bytearray()

    def feed(self, chunk: bytes) -> None:
        """Take what has arrived. Raises BreachError when it cannot be MQTT."""
        if self._skip:
            skipped = min(self._skip, len(chunk))
            self._skip -= skipped
            chunk = chunk[skipped:]
        if self._tail:
            self._tail += chunk
            if len(self._tail) < self._need:
                return
            chunk = bytes(self._tail)
            self._tail.clear()
        self._need = 0
        used = self._split(chunk)
        self._tail += chunk[used:]

    def _split(self, data: bytes) -> int:
        """Take the whole packets off the front of `data`; returns how many bytes they were."""
        pos, have = 0, len(data)
        while have - pos >= 2:
            head, size, start = data[pos], data[pos + 1], pos + 2
            if size & 0x80:
                length = remaining_length(data, pos + 1)
                if length is None:
                    return pos
                size, start = length
                if start + size - pos > PACKET_MOST:
                    cut = self._cut(data, pos, start, start + size)
                    if cut is None:
                        return pos
                    pos = cut
                    continue
            end = start + size
            if end > have:
                self._need = end - pos
                return pos
            if head in _LIGHT:
                self.published.append(self._message(head, data, start, end))
            else:
                self.rest += data[pos:end]
            pos = end
        return pos

    def _message(self, head: int, data: bytes, start: int, end: int) -> Published:
        """Read the PUBLISH whose variable header begins at `start`."""
        try:
            at = start + 2 + (data[start] << 8 | data[start + 1])
            name = data[start + 2 : at]
            mid = 0
            if head & 0x06:
                mid = data[at] << 8 | data[at + 1]
                at += 2
            if self._v5:
                if data[at] < 0x80:
                    at += 1 + data[at]
                else:
                    at = _after_properties(data, at)
        except IndexError:
            raise BreachError("a PUBLISH that ends before its header does") from None
        if at > end or not name or (head & 0x06 and not mid):
            raise BreachError("a PUBLISH without a topic, without an identifier, or shorter than its header")
        topic = self._known.get(name)
        if topic is None:
            topic = name.decode("utf-8", "backslashreplace")
        return topic, data[at:end], bool(head & 0x01), mid

    def _cut(self, data: bytes, pos: int, start: int, end: int) -> int | None:
        """Take the beginning of a packet that is too large; returns where to go on, None: not enough of it is here."""
        if data[pos] not in _LIGHT:
            raise BreachError("a packet of more than 256 KiB that is no message")
        if len(data) - pos < PACKET_MOST:
            self._need = PACKET_MOST
            return None
        topic, payload, retained, mid = self._message(data[pos], data, start, pos + PACKET_MOST)
        self.published.append((topic, payload[:PAYLOAD_KEPT], retained, mid))
        self._skip = max(0, end - len(data))
        return min(end, len(data))


_LIGHT = frozenset((0x30, 0x31, 0x32, 0x33, 0x38, 0x39, 0x3A, 0x3B))
"""First bytes of a PUBLISH at quality of service 0 or 1, with and without the flags DUP and RETAIN."""


def _after_properties(data: bytes, at: int) -> int:
    """Where the properties that begin at `at` with their length end."""
    length = remaining_length(data, at)
    if length is None:
        raise BreachError("a PUBLISH that ends within its properties")
    return length[0] + length[1]
