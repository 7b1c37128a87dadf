"""A publisher that is never the bottleneck: packets made beforehand, sent as fast as the broker takes them.

Run as a program: `blaster.py PORT COUNT RATE TOPICS…`; RATE 0 is as fast as possible. MQTT 3.1.1, QoS 1, to 127.0.0.1.
"""

import itertools
import socket
import sys
import threading
import time

CONNECT = b"\x10\x13\x00\x04MQTT\x04\x02\x00\x3c\x00\x07blaster"


def publish_packet(topic: str, payload: bytes, mid: int) -> bytes:
    """Return a PUBLISH at QoS 1. Source: MQTT 3.1.1, section 3.3."""
    name = topic.encode()
    body = len(name).to_bytes(2, "big") + name + mid.to_bytes(2, "big") + payload
    size, length = len(body), bytearray()
    while True:
        size, digit = divmod(size, 128)
        length.append(digit | (0x80 if size else 0))
        if not size:
            return b"\x32" + bytes(length) + body


def packets(count: int, topics: list[str]) -> list[bytes]:
    """Return `count` readings that wander up and down, over the topics in turn."""
    made = []
    for number, topic in zip(range(count), itertools.cycle(topics), strict=False):
        hertz = 5000 + number * 37 % 4000 + number % 10 / 10
        made.append(publish_packet(topic, b'{"hz": %.1f, "n": %d}' % (hertz, number), number % 65_000 + 1))
    return made


def _swallow(sock: socket.socket, count: int) -> None:
    """Read the broker's acknowledgements, four bytes each, so that it never has to wait for us, until all are there."""
    left = 4 * count
    while left > 0 and (piece := sock.recv(65_536)):
        left -= len(piece)


def main() -> None:
    """Publish."""
    port, count, rate = int(sys.argv[1]), int(sys.argv[2]), float(sys.argv[3])
    made = packets(count, sys.argv[4:])
    sock = socket.create_connection(("127.0.0.1", port))
    sock.setsockopt(socket.IPPROTO_TCP, socket.TCP_NODELAY, 1)
    sock.sendall(CONNECT)
    sock.recv(4)
    reader = threading.Thread(target=_swallow, args=(sock, count), daemon=True)
    reader.start()
    if rate == 0:
        for first in range(0, count, 100):
            sock.sendall(b"".join(made[first : first + 100]))
    else:
        began = time.perf_counter()
        for number, packet in enumerate(made):
            time.sleep(max(0.0, began + number / rate - time.perf_counter()))
            sock.sendall(packet)
    reader.join(60)
    sock.close()


if __name__ == "__main__":
    main()
