"""Traces: JSON Lines of messages with their time, as `record` writes them and `replay` reads them."""

import json
from collections.abc import Iterable, Iterator
from datetime import UTC, datetime
from pathlib import Path
from typing import Any, NamedTuple

from gateway.errors import InputError
from gateway.topics import FIRST_YEAR, LAST_YEAR, moment

LONGEST_LINE = 1_000_000  # characters


class TraceLine(NamedTuple):
    """One line: a message at `t` (ns since 1970), or, without a topic, time passing until then."""

    t: int
    topic: str | None
    payload: bytes


def written(at: int, topic: str, payload: bytes) -> str:
    """Return a message as a line of a trace; bytes that are not UTF-8 turn into replacement characters."""
    line = {"at": moment(at), "topic": topic, "payload": payload.decode("utf-8", "replace")}
    return json.dumps(line, ensure_ascii=False) + "\n"


def ended(at: int) -> str:
    """Return the last line of a trace: time passes until then."""
    return json.dumps({"at": moment(at)}) + "\n"


def read_trace(path: Path) -> Iterator[TraceLine]:
    """Yield the lines of a trace; raise InputError with the line's number for one that cannot be used."""
    try:
        with path.open(encoding="utf-8", errors="replace") as file:
            yield from _lines(path, file)
    except OSError as problem:
        raise InputError(f"{path}: cannot be read: {problem.strerror}") from None


def _lines(path: Path, lines: Iterable[str]) -> Iterator[TraceLine]:
    before: int | None = None
    for number, text in enumerate(lines, 1):
        if not text.strip():
            continue
        try:
            line = _line(text)
        except ValueError as problem:
            raise InputError(f"{path}:{number}: {problem}") from None
        if before is not None and line.t < before:
            raise InputError(f"{path}:{number}: this is earlier than the line before; a trace is in the order of time")
        before = line.t
        yield line


def _line(text: str) -> TraceLine:
    if len(text) > LONGEST_LINE:
        raise ValueError("the line is too long")
    try:
        found: Any = json.loads(text)
    except (ValueError, RecursionError):
        raise ValueError("this line is not JSON") from None
    if not isinstance(found, dict) or not isinstance(found.get("at"), str):
        raise ValueError('expected a line such as `{"at": "2026-05-01T10:00:00.000Z", "topic": …, "payload": …}`')
    if "act" in found:
        raise ValueError("acts of operators are not yet supported")
    t = _time(found["at"])
    if "topic" not in found:
        return TraceLine(t, None, b"")
    topic, payload = found["topic"], found.get("payload")
    if not isinstance(topic, str) or not isinstance(payload, str):
        raise ValueError("`topic` and `payload` are text")
    return TraceLine(t, topic, payload.encode("utf-8", "replace"))


def _time(text: str) -> int:
    try:
        when = datetime.fromisoformat(text)
    except ValueError:
        raise ValueError(f"`{text}` is not a time such as `2026-05-01T10:00:00.000Z`") from None
    if when.tzinfo is None:
        raise ValueError(f"`{text}` does not say in which zone it is; end it with `Z` for UTC")
    if not FIRST_YEAR <= when.year <= LAST_YEAR:
        raise ValueError(f"`{text}` is before the year {FIRST_YEAR} or after {LAST_YEAR}")
    whole = when.astimezone(UTC).replace(microsecond=0)
    return int(whole.timestamp()) * 1_000_000_000 + when.microsecond * 1000
