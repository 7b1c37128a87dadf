"""Writing a calibration: the file beside the tanks', with the points that were in force before."""

import json
from collections.abc import Sequence
from pathlib import Path

from gateway.settings.beside import CALIBRATIONS

Pair = tuple[str, str]  # raw value and level, each with its unit


def calibration_file(folder: Path, sensor: str) -> Path:
    """Return the file of a sensor's calibration; `sensor` is its full name."""
    return folder / CALIBRATIONS / f"{sensor}.yaml"


def written(points: Sequence[Pair], at: str, by: str, before: Sequence[tuple[Sequence[Pair], str, str]]) -> str:
    """Return the text of a calibration file. `before` are earlier points with their date and author, newest first."""
    lines = [
        "# Written by `brimward calibrate`; these points replace those of the sensor's own file.",
        f"points: {_pairs(points)}",
        f"at: {json.dumps(at)}",
        f"by: {json.dumps(by, ensure_ascii=False)}",
    ]
    if before:
        lines.append("before:")
    for pairs, when, who in before:
        lines.append(
            f"  - {{points: {_pairs(pairs)}, at: {json.dumps(when)}, by: {json.dumps(who, ensure_ascii=False)}}}"
        )
    return "\n".join(lines) + "\n"


def comments_of(text: str) -> str:
    """Return the lines of a file that people have added: comments that are not ours."""
    lines = [line for line in text.splitlines() if line.startswith("#") and "brimward calibrate" not in line]
    return "".join(f"{line}\n" for line in lines)


def _pairs(points: Sequence[Pair]) -> str:
    return "[" + ", ".join(f"[{raw}, {level}]" for raw, level in points) + "]"
