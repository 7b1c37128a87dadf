"""`brimward record`: the messages of a site's topics, as they come, into a trace."""

import sys
import time
from collections.abc import Callable
from pathlib import Path
from typing import Annotated

import typer

from gateway.cli.common import SiteArgument, read_span
from gateway.connect import link_options
from gateway.errors import InputError
from gateway.link.tap import Tap
from gateway.plant import Plant
from gateway.review.trace import ended, written
from gateway.settings.assemble import plant_plan
from gateway.settings.load import load


def record_command(
    site: SiteArgument,
    output: Annotated[Path, typer.Option("-o", "--output", help="The trace to write.")],
    duration: Annotated[
        str | None, typer.Option("--for", help="How long, such as `10 min`; else until Ctrl-C.")
    ] = None,
) -> None:
    """Write the messages of the site's topics, as they come, into a trace that `replay` can run.

    Example: brimward record config_examples/hill-dairy -o morning.jsonl --for "10 min"
    """
    settings = load(site)
    topics = Plant(plant_plan(settings)).topics
    until = time.monotonic() + (read_span(duration) if duration is not None else float("inf"))
    tap = Tap(link_options(settings, topics), topics)
    try:
        with output.open("w", encoding="utf-8") as file:
            count = _record(tap, file.write, until)
    except OSError as problem:
        raise InputError(f"{output}: cannot be written: {problem.strerror}") from None
    finally:
        tap.close()
    typer.echo(f"{count} messages in {output}")


def _record(tap: Tap, write: Callable[[str], object], until: float) -> int:
    count = 0
    watched = sys.stderr.isatty()
    try:
        while time.monotonic() < until:
            for heard in tap.heard(within_s=min(1.0, max(0.0, until - time.monotonic()))):
                write(written(time.time_ns(), heard.topic, heard.payload))
                count += 1
                if time.monotonic() >= until:
                    break
            if watched:
                typer.echo(f"\r{count} messages", err=True, nl=False)
    except KeyboardInterrupt:
        typer.echo(err=True)
    write(ended(time.time_ns()))
    return count
