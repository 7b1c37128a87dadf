"""Plain YAML, read strictly, every value with its place.

Only what a settings file needs: mappings, lists, text, whole and decimal numbers, `true`, `false` and null. So `on`,
`off`, `yes` and `no` are words. Duplicate keys, tags, merge keys and a second document are complaints; nesting, size
and the weight of aliases are bounded. The parser is PyYAML's; what it means is decided here.
"""

import re
from collections.abc import Iterator
from dataclasses import dataclass, field
from typing import Any

import yaml

from gateway.settings.complaint import Complaint

LONGEST_FILE = 1_000_000  # characters
DEEPEST = 20  # levels of nesting; the settings use eight
MOST_VALUES = 200_000  # values in one file, aliases counted with all that they stand for

_LOADER = getattr(yaml, "CSafeLoader", yaml.SafeLoader)  # the C parser reads ten times faster, where it is there
_WHOLE = re.compile(r"[-+]?(0|[1-9][0-9]{0,17})")
_DECIMAL = re.compile(r"[-+]?(0|[1-9][0-9]*)\.[0-9]+([eE][-+]?[0-9]+)?")
_BREAK = re.compile("\r\n|[\r\n\x85\u2028\u2029]")  # line breaks of YAML 1.1, section 5.4
_WORDS: dict[str, Any] = {"true": True, "false": False, "null": None, "~": None, "": None}


Place = tuple[int, int]  # line, column


@dataclass(slots=True)
class Node:
    """A value and its place, counted from 1. `value` is a dict of nodes, a list of nodes, or a scalar."""

    value: Any
    line: int
    column: int
    keys: dict[str, Place] = field(default_factory=dict)  # where each key of a mapping stands
    quoted: bool = False
    weight: int = 1  # how many values it holds, itself counted, aliases in full
    height: int = 0  # levels of nesting inside

    def plain(self) -> Any:
        """Return the value without places."""
        if isinstance(self.value, dict):
            return {key: node.plain() for key, node in self.value.items()}
        if isinstance(self.value, list):
            return [node.plain() for node in self.value]
        return self.value

    def child(self, step: str | int) -> "Node | None":
        """Return the value under a key or at an index."""
        if isinstance(self.value, dict):
            return self.value.get(str(step))
        if isinstance(self.value, list) and isinstance(step, int) and 0 <= step < len(self.value):
            found: Node = self.value[step]
            return found
        return None

    def place(self, *path: str | int) -> Place:
        """Return where the value under `path` stands, or the nearest value around it."""
        node = self
        for step in path:
            found = node.child(step)
            if found is None:
                break
            node = found
        return node.line, node.column

    def key_place(self, *path: str | int) -> Place:
        """Return where the key that ends `path` stands."""
        node: Node | None = self
        for step in path[:-1]:
            node = node.child(step) if node else None
        last = str(path[-1])
        return node.keys[last] if node and last in node.keys else self.place(*path)


def place_within(text: str, node: Node, column: int) -> Place:
    """Return where the character number `column` (from 1) of the text that `node` holds stands in its file's `text`.

    Blanks and line breaks change when YAML folds lines, other characters do not: so those are counted. Escapes within
    double quotes, which no setting needs, make the place come out too early.
    """
    value = str(node.value)
    at_end = column > len(value.rstrip())
    ahead = sum(not one.isspace() for one in value[: column - 1]) - at_end
    lines = _BREAK.split(text)[node.line - 1 :]
    lines[0] = " " * (node.column - 1) + lines[0][node.column - 1 :]
    if node.quoted:
        opening = lines[0].lstrip()[:1]
        lines[0] = "" if opening in {"|", ">"} else lines[0].replace(opening, " ", 1)
    for line, found in enumerate(lines, node.line):
        for place, one in enumerate(found, 1):
            if not one.isspace():
                if ahead <= 0:
                    return line, place + at_end
                ahead -= 1
    return node.line, node.column


def _place(event: yaml.Event) -> Place:
    mark = event.start_mark
    return (mark.line + 1, mark.column + 1) if mark else (1, 1)


class _RefusedError(Exception):
    """Reading cannot go on; the complaint is already noted."""


class _Reader:
    """Builds nodes from the parser's events."""

    def __init__(self, file: str, text: str, complaints: list[Complaint]) -> None:
        self.file = file
        self.complaints = complaints
        self.events: Iterator[yaml.Event] = yaml.parse(text, Loader=_LOADER)
        self.anchors: dict[str, Node | None] = {}
        self.values = 0

    def complain(self, place: Place, message: str) -> None:
        self.complaints.append(Complaint(self.file, *place, message))

    def refuse(self, place: Place, message: str) -> _RefusedError:
        self.complain(place, message)
        return _RefusedError()

    def document(self) -> Node | None:
        """Return the only document of the text, or None when there is none."""
        found: Node | None = None
        for event in self.events:
            if isinstance(event, yaml.DocumentStartEvent):
                if found is not None:
                    raise self.refuse(_place(event), "a settings file has one document only; this begins a second")
                found = self.node(next(self.events), 0)
        return found

    def node(self, event: yaml.Event, depth: int) -> Node:
        if depth > DEEPEST:
            raise self.refuse(_place(event), f"this is nested more than {DEEPEST} levels deep")
        if isinstance(event, yaml.AliasEvent):
            return self.weighed(self.alias(event, depth), _place(event))
        tag, anchor = getattr(event, "tag", None), getattr(event, "anchor", None)
        if tag is not None:
            self.complain(_place(event), f"tags such as `{tag}` are not used in settings")
        if anchor is not None:
            self.anchors[anchor] = None  # until it is whole, so that it cannot hold itself
        node = self.inner(event, depth)
        if anchor is not None:
            self.anchors[anchor] = node
        return node

    def inner(self, event: yaml.Event, depth: int) -> Node:
        if isinstance(event, yaml.MappingStartEvent):
            return self.mapping(event, depth)
        if isinstance(event, yaml.SequenceStartEvent):
            return self.sequence(event, depth)
        if isinstance(event, yaml.ScalarEvent):
            place = _place(event)
            quoted = event.style in {"'", '"', "|", ">"}
            value = event.value if quoted else scalar(event.value)
            return self.weighed(Node(value, *place, quoted=quoted), place)
        raise self.refuse(_place(event), "this cannot be read as a value")

    def weighed(self, node: Node, place: Place) -> Node:
        """Count a value with all that it stands for."""
        self.values += node.weight
        if self.values > MOST_VALUES:
            raise self.refuse(place, f"the file holds more than {MOST_VALUES} values, aliases counted in full")
        return node

    def alias(self, event: yaml.AliasEvent, depth: int) -> Node:
        found = self.anchors.get(event.anchor or "")
        if found is None:
            raise self.refuse(_place(event), f"the alias *{event.anchor} stands for nothing, or for itself")
        if depth + found.height > DEEPEST:
            raise self.refuse(_place(event), f"with this alias, values are nested more than {DEEPEST} levels deep")
        return found

    def sequence(self, event: yaml.SequenceStartEvent, depth: int) -> Node:
        node = self.weighed(Node([], *_place(event)), _place(event))
        while not isinstance(inner := next(self.events), yaml.SequenceEndEvent):
            child = self.node(inner, depth + 1)
            node.value.append(child)
            node.weight += child.weight
            node.height = max(node.height, child.height + 1)
        return node

    def mapping(self, event: yaml.MappingStartEvent, depth: int) -> Node:
        node = self.weighed(Node({}, *_place(event)), _place(event))
        while not isinstance(inner := next(self.events), yaml.MappingEndEvent):
            key = self.node(inner, depth + 1)
            value = self.node(next(self.events), depth + 1)
            self.put(node, key, value, _place(inner))
            node.weight += value.weight + 1
            node.height = max(node.height, value.height + 1)
        return node

    def put(self, node: Node, key: Node, value: Node, place: Place) -> None:
        name = key.value
        if isinstance(name, dict | list) or name is None:
            self.complain(place, "a key is a word")
            return
        name = name if isinstance(name, str) else str(name).lower() if isinstance(name, bool) else str(name)
        if name == "<<":
            self.complain(place, "merge keys are not used in settings; actuators have `like`")
        elif name in node.value:
            line, column = node.keys[name]
            self.complain(place, f"`{name}` stands here a second time; the first is at {line}:{column}")
        else:
            node.value[name] = value
            node.keys[name] = place


def scalar(text: str) -> Any:
    """Return what unquoted text means."""
    if text in _WORDS:
        return _WORDS[text]
    if _WHOLE.fullmatch(text):
        return int(text)
    return float(text) if _DECIMAL.fullmatch(text) else text


def read_yaml(file: str, text: str, complaints: list[Complaint]) -> Node | None:
    """Return the mapping that `text` holds, with places; add what is wrong to `complaints`.

    None when it cannot be read at all.
    """
    if len(text) > LONGEST_FILE:
        complaints.append(Complaint(file, 1, 1, f"the file has more than {LONGEST_FILE} characters"))
        return None
    reader = _Reader(file, text, complaints)
    try:
        node = reader.document()
    except _RefusedError:
        return None
    except yaml.YAMLError as problem:
        complaints.append(_syntax(file, problem))
        return None
    if node is None or not isinstance(node.value, dict):
        complaints.append(Complaint(file, 1, 1, "a settings file holds `key: value` lines; this one does not"))
        return None
    return node


def _syntax(file: str, problem: yaml.YAMLError) -> Complaint:
    mark = getattr(problem, "problem_mark", None)
    words = getattr(problem, "problem", None) or getattr(problem, "reason", None) or str(problem).splitlines()[0]
    line, column = (mark.line + 1, mark.column + 1) if mark else (1, 1)
    return Complaint(file, line, column, f"this is not YAML: {words}")
