"""Packets are cut as the standard says: checked against an independent reader of the same bytes, in any chunking."""

import contextlib
import struct
from itertools import pairwise

import pytest
from hypothesis import given
from hypothesis import strategies as st
from paho.mqtt import _packet  # the reference: how the client library itself reads a PUBLISH
from paho.mqtt.enums import MQTTProtocolVersion

from gateway.link.packets import PACKET_MOST, PAYLOAD_KEPT, BreachError, Published, Splitter, puback, remaining_length

PINGRESP = b"\xd0\x00"
SUBACK = b"\x90\x03\x00\x01\x01"


def length(value: int) -> bytes:
    """Encode a length as MQTT 5.0 section 1.5.5 does (the non-normative code given there)."""
    out = bytearray()
    while True:
        value, digit = divmod(value, 128)
        out.append(digit | (0x80 if value else 0))
        if not value:
            return bytes(out)


def publish(
    topic: bytes,
    payload: bytes,
    *,
    mid: int = 0,
    retain: bool = False,
    dup: bool = False,
    properties: bytes | None = None,
) -> bytes:
    """Write a PUBLISH as section 3.3 of the standard lays it out; `properties` None: MQTT 3.1.1."""
    head = 0x30 | (0x08 if dup else 0) | (0x02 if mid else 0) | (0x01 if retain else 0)
    body = struct.pack("!H", len(topic)) + topic + (struct.pack("!H", mid) if mid else b"")
    if properties is not None:
        body += length(len(properties)) + properties
    body += payload
    return bytes([head]) + length(len(body)) + body


def split(data: bytes, *, v5: bool, cuts: tuple[int, ...] = ()) -> Splitter:
    """Feed the bytes in pieces cut at the given places."""
    splitter = Splitter(v5=v5, topics={b"dairy/probe": "dairy/probe"})
    places = [0, *sorted(cut % (len(data) + 1) for cut in cuts), len(data)]
    for begin, end in pairwise(places):
        splitter.feed(data[begin:end])
    return splitter


def by_the_library(packet: bytes, *, v5: bool) -> Published:
    """Read one PUBLISH with the client library."""
    found = remaining_length(packet, 1)
    assert found
    version = MQTTProtocolVersion.MQTTv5 if v5 else MQTTProtocolVersion.MQTTv311
    read = _packet.decode_publish(packet[0], packet[found[1] :], version)
    return read.topic.decode(), bytes(read.payload), read.retain, read.mid


EXPIRY = b"\x02\x00\x00\x00\x3c"  # Message Expiry Interval, 60 s (MQTT 5.0, 3.3.2.3.3)
USER = b"\x26\x00\x01k\x00\xc8" + b"v" * 200  # a User Property long enough for a length of two bytes

topics = st.sampled_from(["dairy/probe", "a", "tank/ä/水"]).map(str.encode)
messages = st.builds(
    publish,
    topics,
    st.binary(max_size=300),
    mid=st.integers(0, 65_535),
    retain=st.booleans(),
    dup=st.booleans(),
)
messages_of_5 = st.builds(
    publish,
    topics,
    st.binary(max_size=300),
    mid=st.integers(0, 65_535),
    retain=st.booleans(),
    properties=st.sampled_from([b"", EXPIRY, USER, EXPIRY + USER]),
)


@given(messages)
def test_a_message_is_read_as_the_library_reads_it(packet: bytes) -> None:
    """Topic, payload, retain flag and identifier are those that the client library finds (MQTT 3.1.1)."""
    assert split(packet, v5=False).published == [by_the_library(packet, v5=False)]


@given(messages_of_5)
def test_properties_are_passed_over_as_the_library_does(packet: bytes) -> None:
    """The same under MQTT 5, whatever properties stand in between."""
    assert split(packet, v5=True).published == [by_the_library(packet, v5=True)]


@given(st.lists(st.one_of(messages, st.sampled_from([PINGRESP, SUBACK])), max_size=12), st.lists(st.integers(0, 9999)))
def test_chunking_changes_nothing(packets: list[bytes], cuts: list[int]) -> None:
    """However the network cuts the stream, the same messages and the same rest come out, in order."""
    data = b"".join(packets)
    whole, pieces = split(data, v5=False), split(data, v5=False, cuts=tuple(cuts))
    assert pieces.published == whole.published
    assert pieces.rest == whole.rest == b"".join(p for p in packets if p in {PINGRESP, SUBACK})
    assert len(whole.published) + sum(p in {PINGRESP, SUBACK} for p in packets) == len(packets)


@given(st.binary(max_size=400), st.booleans())
def test_no_bytes_end_in_anything_but_messages_or_a_breach(data: bytes, v5: bool) -> None:  # noqa: FBT001 - given
    """Whatever arrives, the splitter goes on or says that the peer breaks the standard."""
    with contextlib.suppress(BreachError):
        splitter = split(data, v5=v5)
        assert sum(len(payload) for _, payload, _, _ in splitter.published) + len(splitter.rest) <= len(data)


@given(st.lists(st.integers(0, PACKET_MOST * 2), max_size=6))
def test_a_huge_message_is_cut_and_what_follows_is_whole(cuts: list[int]) -> None:
    """Of a message above the limit its beginning is kept, enough to see its size; the next one is not touched."""
    data = publish(b"dairy/probe", b"x" * (PACKET_MOST + 70_000), mid=7) + publish(b"a", b"1", mid=8)
    splitter = split(data, v5=False, cuts=tuple(cuts))
    assert splitter.published == [("dairy/probe", b"x" * PAYLOAD_KEPT, False, 7), ("a", b"1", False, 8)]
    assert PAYLOAD_KEPT > 64 * 1024


def test_a_huge_packet_of_another_kind_is_a_breach() -> None:
    """No broker has a reason for it, and it will not be collected."""
    with pytest.raises(BreachError):
        split(b"\x90" + length(PACKET_MOST) + b"\x00" * 10, v5=False)


@pytest.mark.parametrize(
    "packet",
    [
        b"\x30\x00",  # no topic at all
        b"\x30\x02\x00\x00",  # an empty topic
        b"\x30\x03\x00\x05a",  # a topic longer than its packet
        b"\x32\x05\x00\x01a\x00\x00",  # identifier 0, which 2.2.1 forbids
        b"\x32\x04\x00\x01a\x00",  # ends within the identifier
        b"\x30\xff\xff\xff\xff\x01",  # a length of five bytes
    ],
)
def test_a_broken_message_is_a_breach(packet: bytes) -> None:
    """What the standard calls malformed ends the connection, also when bytes of the next packet follow."""
    for follows in (b"", PINGRESP * 3):
        with pytest.raises(BreachError):
            split(packet + follows, v5=False)


def test_a_topic_that_is_no_utf8_is_kept_readable() -> None:
    """It is somebody's mistake, and no reason to lose the connection or to raise."""
    (message,) = split(publish(b"a/\xff", b"1"), v5=False).published
    assert message[0] == "a/\\xff"


def test_acknowledgements_are_laid_out_as_the_standard_says() -> None:
    """MQTT 3.1.1 section 3.4: 0x40, length 2, identifier with the high byte first."""
    assert puback([1, 0x1234, 65_535]) == b"\x40\x02\x00\x01\x40\x02\x12\x34\x40\x02\xff\xff"
    assert puback([]) == b""


@given(st.integers(0, 268_435_455))
def test_lengths_are_read_back(value: int) -> None:
    """Every length that the standard's own algorithm writes is read back (MQTT 5.0, 1.5.5)."""
    assert remaining_length(b"\x30" + length(value), 1) == (value, 1 + len(length(value)))
