"""From a site's folder to its settings, or to every complaint about it at once."""

import difflib
import hashlib
import json
import os
import types
import typing
from collections.abc import Iterator, Mapping
from dataclasses import replace
from pathlib import Path
from typing import Annotated, Any

from pydantic import BaseModel, ValidationError

from gateway.errors import InputError
from gateway.settings.beside import (
    CalibrationFile,
    calibrated,
    files_beside,
    is_beside,
    read_table,
    sensor_of,
    table_of,
    with_table,
)
from gateway.settings.complaint import Complaint, SettingsError
from gateway.settings.fields import is_pattern
from gateway.settings.models import Site, SiteFile, TankFile
from gateway.settings.yaml_reader import DEEPEST, LONGEST_FILE, MOST_VALUES, Node, read_yaml

SITE_FILE = "site.yaml"


def load(path: str | Path) -> Site:
    """Return the settings of the site whose folder, or whose `site.yaml`, is `path`.

    Raises InputError when there is nothing to read, SettingsError with every complaint when it cannot be used.
    """
    folder = Path(path)
    folder = folder.parent if folder.name == SITE_FILE else folder
    if not (folder / SITE_FILE).is_file():
        raise InputError(f"{folder}: there is no {SITE_FILE} here; a site is a folder that holds one")
    complaints: list[Complaint] = []
    return _whole(_texts(folder, complaints), folder, complaints)


def load_texts(texts: Mapping[str, str], folder: Path) -> Site:
    """Return the settings that `texts` (relative file name → text) hold; as `load`, for texts kept elsewhere."""
    return _whole(texts, folder, [])


def _whole(texts: Mapping[str, str], folder: Path, complaints: list[Complaint]) -> Site:
    yaml = {file: text for file, text in texts.items() if not file.lower().endswith(".csv")}
    files = {file: _Read(file, text, complaints) for file, text in yaml.items()}
    site_file = files[SITE_FILE].model(SiteFile, complaints) if SITE_FILE in files else None
    read = {
        file: files[file].model(TankFile, complaints) for file in files if file != SITE_FILE and not is_beside(file)
    }
    read = {file: _with_table(tank, files[file], texts, complaints) for file, tank in read.items()}
    tanks = _by_name(read, files, complaints)
    if isinstance(site_file, SiteFile):
        site_file = _calibrated(site_file, tanks, files, complaints)
    if complaints or not isinstance(site_file, SiteFile):
        raise SettingsError(complaints)
    site = Site(file=site_file, tanks=tanks, folder=folder, texts=dict(texts), digest=digest(texts))
    from gateway.settings.cross import cross_check  # noqa: PLC0415 - it needs this module's places

    complaints += cross_check(
        site, {file: one.node for file, one in files.items() if one.node is not None and not is_beside(file)}
    )
    if complaints:
        raise SettingsError(complaints)
    return site


def digest(texts: Mapping[str, str]) -> str:
    """Return the SHA-256 of the texts with their names, in file order; the same settings have the same digest."""
    return hashlib.sha256(json.dumps(list(texts.items())).encode()).hexdigest()


# ---- files --------------------------------------------------------------------------------------------------


def _texts(folder: Path, complaints: list[Complaint]) -> dict[str, str]:
    """Return the texts of the site's files, `site.yaml` first, then the tanks in the order of their path's bytes."""
    texts = {SITE_FILE: _text(folder, SITE_FILE, complaints)}
    for file in sorted(_tank_files(folder, texts[SITE_FILE], complaints), key=os.fsencode):
        texts[file] = _text(folder, file, complaints)
    tables = {file: node for file, text in texts.items() if ".csv" in text and (node := read_yaml(file, text, []))}
    for file in files_beside(folder, tables):
        texts[file] = _text(folder, file, complaints)
    return texts


def _text(folder: Path, file: str, complaints: list[Complaint]) -> str:
    path = folder / file
    try:
        with path.open("rb") as opened:
            return opened.read(LONGEST_FILE * 4 + 1).decode("utf-8-sig")
    except UnicodeDecodeError:
        raise SettingsError([*complaints, Complaint(file, 1, 1, "the file is not UTF-8 text")]) from None
    except OSError as problem:
        raise InputError(f"{path}: cannot be read: {problem.strerror}") from None


def _tank_files(folder: Path, site_text: str, complaints: list[Complaint]) -> set[str]:
    """Return the files that `tanks` asks for; complain of a pattern that finds none."""
    node = read_yaml(SITE_FILE, site_text, [])
    written = node.child("tanks") if node else None
    patterns = ["tanks/*.yaml"] if written is None else written.plain()
    found: set[str] = set()
    for index, pattern in enumerate(patterns if isinstance(patterns, list) else []):
        if not isinstance(pattern, str) or not is_pattern(pattern):
            continue  # complained of where the site's file is read
        files = {path.relative_to(folder).as_posix() for path in folder.glob(pattern) if path.is_file()}
        if node is not None and written is not None and not files - {SITE_FILE}:
            complaints.append(Complaint(SITE_FILE, *node.place("tanks", index), f"no file is found by `{pattern}`"))
        found |= files
    return found - {SITE_FILE}


def _by_name(
    read: Mapping[str, BaseModel | None], files: Mapping[str, "_Read"], complaints: list[Complaint]
) -> dict[str, TankFile]:
    tanks: dict[str, TankFile] = {}
    for file, tank in read.items():
        if not isinstance(tank, TankFile):
            continue
        if tank.tank in tanks:
            complaints.append(files[file].complaint(("tank",), f"there is a tank `{tank.tank}` already"))
        tanks[tank.tank] = tank
    return tanks


def _with_table(
    tank: BaseModel | None, file: "_Read", texts: Mapping[str, str], complaints: list[Complaint]
) -> BaseModel | None:
    """Return a tank with the strapping table that stands in a file of its own, if it has one."""
    if not isinstance(tank, TankFile) or tank.shape is None or not isinstance(tank.shape.table, str):
        return tank
    name = table_of(file.file, file.node) if file.node is not None else None
    if name is None or name not in texts:
        message = f"there is no file `{tank.shape.table}` beside this one; expected a table such as `cistern.csv`"
        complaints.append(file.complaint(("shape", "table"), message))
        return tank
    pairs, slips = read_table(name, texts[name])
    complaints += slips
    return tank if slips else with_table(tank, pairs)


def _calibrated(
    site: SiteFile, tanks: dict[str, TankFile], files: Mapping[str, "_Read"], complaints: list[Complaint]
) -> SiteFile:
    """Put the calibrations that stand in files of their own into their sensors."""
    for file, read in files.items():
        if not is_beside(file):
            continue
        found = read.model(CalibrationFile, complaints)
        name, sensor = sensor_of(file)
        part = tanks.get(name) if name else site
        if part is None or sensor not in part.sensors:
            complaints.append(Complaint(file, 1, 1, f"there is no sensor `{name + '.' if name else ''}{sensor}`"))
        elif isinstance(found, CalibrationFile):
            whole = calibrated(part, sensor, found)
            if isinstance(whole, TankFile):
                tanks[whole.tank] = whole
            elif isinstance(whole, SiteFile):
                site = whole
    return site


class _Read:
    """One file as read."""

    def __init__(self, file: str, text: str, complaints: list[Complaint]) -> None:
        self.file = file
        self.node = read_yaml(file, text, complaints)
        if self.node is not None:
            complaints += _without_value(file, self.node)
            _merge_likes(file, self.node, complaints)

    def complaint(self, path: tuple[str | int, ...], message: str, *, at_key: bool = False) -> Complaint:
        assert self.node is not None  # noqa: S101 - only asked of a file that has been read
        place = self.node.key_place(*path) if at_key else self.node.place(*path)
        return Complaint(self.file, *place, message)

    def model(self, kind: type[BaseModel], complaints: list[Complaint]) -> BaseModel | None:
        """Return the file as a model, or None with what is wrong added to `complaints`."""
        if self.node is None:
            return None
        try:
            return kind.model_validate(self.node.plain())
        except ValidationError as problem:
            errors = problem.errors(include_url=False)
            complaints.extend(self._translated(kind, error) for error in errors if not self._is_empty(error["loc"]))
            return None

    def _is_empty(self, path: tuple[str | int, ...]) -> bool:
        """Return whether nothing is written at `path`; `_without_value` has complained of it already."""
        node = self.node
        for step in path:
            if not str(step).startswith("["):  # what tells kinds of values apart is not written
                node = node.child(step) if node else None
        return node is not None and node.value is None

    def _translated(self, kind: type[BaseModel], error: Any) -> Complaint:
        """Return one of pydantic's errors in our words, at its place."""
        path = tuple(step for step in error["loc"] if not str(step).startswith("["))
        last = path[-1] if path else ""
        match error["type"]:
            case "extra_forbidden":
                return self.complaint(path, _unknown_key(model_at(kind, path[:-1]), str(last)), at_key=True)
            case "missing":
                return self.complaint(path[:-1], f"`{last}` is missing")
            case "value_error":
                return self.complaint(path, str(error["ctx"]["error"]), at_key="[key]" in error["loc"])
            case _:
                return self.complaint(path, f"`{_shown(error['input'])}`: {_expectation(error)}")


def _without_value(file: str, node: Node) -> Iterator[Complaint]:
    """Complain of keys and items that nothing is written for: nobody can tell what was meant."""
    if isinstance(node.value, dict):
        for key, inner in node.value.items():
            if inner.value is None:
                yield Complaint(file, *node.keys[key], f"`{key}` has no value; give it one, or leave the key out")
            yield from _without_value(file, inner)
    elif isinstance(node.value, list):
        for inner in node.value:
            if inner.value is None:
                yield Complaint(file, inner.line, inner.column, "there is nothing here; expected a value")
            yield from _without_value(file, inner)


def _shown(value: Any) -> str:
    text = str(value)
    return text if len(text) <= 40 else f"{text[:40]}…"


_EXPECTATIONS = {
    "bool_type": "expected true or false",
    "int_type": "expected a whole number",
    "float_type": "expected a number",
    "string_type": "expected text",
    "list_type": "expected a list: `[…]`",
    "dict_type": "expected `key: value` lines",
    "model_type": "expected `key: value` lines",
    "model_attributes_type": "expected `key: value` lines",
    "tuple_type": "expected a pair: `[raw, level]`",
    "too_short": "expected more",
}


def _expectation(error: Any) -> str:
    facts = error.get("ctx", {})
    match error["type"]:
        case "literal_error":
            return f"expected {facts['expected'].replace(chr(39), '')}"
        case "greater_than_equal":
            return f"expected {facts['ge']} or more"
        case "less_than_equal":
            return f"expected {facts['le']} or less"
        case _:
            pass
    return _EXPECTATIONS.get(error["type"], str(error["msg"]))


def _unknown_key(model: type[BaseModel] | None, key: str) -> str:
    """Return the complaint about a key that a part does not have."""
    if key in getattr(model, "LATER", ()):
        return f"`{key}` is not yet supported"
    fields = {} if model is None else model.model_fields
    known = [field.alias or name for name, field in fields.items()]
    nearest = difflib.get_close_matches(key, known, n=1)
    return f"`{key}` is not known here; " + (
        f"did you mean `{nearest[0]}`?" if nearest else f"known: {', '.join(known)}"
    )


def model_at(model: type[BaseModel] | None, path: tuple[str | int, ...]) -> type[BaseModel] | None:
    """Return the part of the settings that stands at `path` within `model`."""
    annotation: Any = model
    for step in path:
        if isinstance(annotation, type) and issubclass(annotation, BaseModel):
            by_alias = {field.alias or name: field for name, field in annotation.model_fields.items()}
            field = by_alias.get(str(step))
            annotation = field.annotation if field else None
        elif typing.get_origin(annotation) is dict:
            annotation = typing.get_args(annotation)[1]
        else:
            return None
        annotation = _likeliest(annotation)
    return annotation if isinstance(annotation, type) and issubclass(annotation, BaseModel) else None


def _likeliest(annotation: Any) -> Any:
    """Return the part of a union that can hold keys; anything else as it is."""
    if typing.get_origin(annotation) is Annotated:
        return _likeliest(typing.get_args(annotation)[0])
    if typing.get_origin(annotation) not in {typing.Union, types.UnionType}:
        return annotation
    parts = [_likeliest(part) for part in typing.get_args(annotation) if part is not type(None)]
    models = [part for part in parts if isinstance(part, type) and issubclass(part, BaseModel)]
    return models[0] if models else parts[0]


# ---- like ---------------------------------------------------------------------------------------------------


def _merge_likes(file: str, root: Node, complaints: list[Complaint]) -> None:
    """Let each actuator with `like` take over, deeply, what the one it names has and it has not."""
    actuators = root.child("actuators")
    if actuators is None or not isinstance(actuators.value, dict):
        return
    failed = [name for name in actuators.value if not _merge_like(file, actuators, name, (name,), complaints)]
    for name in failed:
        del actuators.value[name]  # what it lacks because of that is not complained of as well
    if sum(actuator.weight for actuator in actuators.value.values()) > MOST_VALUES:
        message = f"the actuators hold more than {MOST_VALUES} values, `like` counted in full"
        complaints.append(Complaint(file, actuators.line, actuators.column, message))
        actuators.value.clear()


def _merge_like(file: str, actuators: Node, name: str, chain: tuple[str, ...], complaints: list[Complaint]) -> bool:
    """Merge one actuator, first those that it rests on; return whether it could be done."""
    own: Node = actuators.value[name]
    if not isinstance(own.value, dict) or "like" not in own.value:
        return True
    like: Node = own.value["like"]
    other = str(like.plain())
    if len(chain) > DEEPEST:
        complaints.append(Complaint(file, like.line, like.column, f"`like` is followed {DEEPEST} times at most"))
        return False
    if other not in actuators.value or other in chain:
        nearest = difflib.get_close_matches(other, [one for one in actuators.value if one != name], n=1)
        hint = f"; did you mean `{nearest[0]}`?" if nearest else ""
        message = f"`like` names another actuator of this file, not `{other}`{hint}"
        complaints.append(Complaint(file, like.line, like.column, message))
        return False
    if not _merge_like(file, actuators, other, (*chain, other), complaints):
        return False
    own = replace(own, value={key: node for key, node in own.value.items() if key != "like"})
    actuators.value[name] = _merged(own, actuators.value[other])
    return True


def _merged(own: Node, other: Node) -> Node:
    """Return `own` with what only `other` has. Neither is changed, since an alias may stand for either elsewhere."""
    if not isinstance(own.value, dict) or not isinstance(other.value, dict):
        return own
    value, keys = dict(own.value), dict(own.keys)
    for key, node in other.value.items():
        value[key] = _merged(value[key], node) if key in value else node
        keys.setdefault(key, (own.line, own.column))
    return replace(own, value=value, keys=keys, weight=own.weight + other.weight)
