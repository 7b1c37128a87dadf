"""`brimward replay`: a trace through the site's own rules, in virtual time."""

import contextlib
import json
import sys
from pathlib import Path
from typing import Annotated

import typer

from gateway.cli.common import SiteArgument
from gateway.errors import InputError
from gateway.plant import Plant
from gateway.review.replay import record_of, replay
from gateway.review.trace import read_trace
from gateway.settings.assemble import plant_plan
from gateway.settings.load import load


def replay_command(
    site: SiteArgument,
    messages: Annotated[Path | None, typer.Option(help="The trace to run: JSON Lines, as `record` writes.")] = None,
    output: Annotated[Path | None, typer.Option("-o", "--output", help="Where to write; else standard output.")] = None,
    values: Annotated[bool, typer.Option("--values", help="Also tell every tank's values.")] = False,
) -> None:
    """Run a trace of messages through the site's rules in virtual time, and print what would be commanded.

    Example: brimward replay config_examples/hill-dairy --messages morning.jsonl
    """
    if messages is None:
        raise InputError("replay of the journal is not yet supported; name a trace with --messages FILE")
    plant = Plant(plant_plan(load(site)))
    try:
        out = output.open("w", encoding="utf-8") if output else sys.stdout
    except OSError as problem:
        raise InputError(f"{output}: cannot be written: {problem.strerror}") from None
    with out if output else contextlib.nullcontext():
        for effect in replay(plant, read_trace(messages)):
            record = record_of(effect, values=values)
            if record is not None:
                out.write(json.dumps(record, sort_keys=True, ensure_ascii=False, allow_nan=False) + "\n")
