"""What several commands share: the SITE argument, printing, and finding a name that was typed."""

import difflib
import json
from collections.abc import Iterable
from pathlib import Path
from typing import Annotated, Any

import typer

from gateway.errors import InputError
from gateway.settings.units import read_as
from rules.quantity import Dimension

SiteArgument = Annotated[Path, typer.Argument(help="The site's folder, or its site.yaml.", metavar="SITE")]
AsJson = Annotated[bool, typer.Option("--json", help="Print JSON, for programs.")]


def print_json(document: Any) -> None:
    """Print one JSON document on a line, keys sorted."""
    typer.echo(json.dumps(document, sort_keys=True, allow_nan=False, ensure_ascii=False))


def named(typed: str, known: Iterable[str], kind: str) -> str:
    """Return the full name that was meant: typed in full, or its last part where only one thing is called so.

    Raises InputError, with the nearest known name, when there is none.
    """
    names = list(known)
    if typed in names:
        return typed
    ending = [name for name in names if name.partition(".")[2] == typed]
    if len(ending) == 1:
        return ending[0]
    if ending:
        raise InputError(f"`{typed}` could be {' or '.join(ending)}; type it in full")
    by_part = {name.partition(".")[2] or name: name for name in names} | {name: name for name in names}
    nearest = difflib.get_close_matches(typed, by_part, n=1, cutoff=0.5)
    hint = f"did you mean `{by_part[nearest[0]]}`?" if nearest else f"known: {', '.join(names) or 'none'}"
    raise InputError(f"`{typed}` is no {kind} of this site; {hint}")


def read_span(text: str) -> float:
    """Return a length of time, such as `10 min`, in seconds."""
    try:
        return read_as(text, Dimension.TIME).value
    except ValueError as problem:
        raise InputError(str(problem)) from None
