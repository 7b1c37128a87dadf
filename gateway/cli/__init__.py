"""The command line: one module a command, gathered here.

Exit status: 0 done; 1 it ran and the answer is bad; 2 it could not run. Never a traceback for what a user can cause.
"""

import sys

import typer

from gateway.cli.check import check
from gateway.cli.convert import convert
from gateway.cli.demo import demo
from gateway.cli.journal import journal
from gateway.cli.listen import listen
from gateway.cli.record import record
from gateway.cli.replay import replay
from gateway.cli.run import run
from gateway.cli.why import why
from gateway.errors import BrimwardError

app = typer.Typer(
    name="brimward",
    help="Turns raw tank-level readings into pump and valve commands, and can say why.",
    no_args_is_help=True,
    pretty_exceptions_enable=False,
    add_completion=False,
    rich_markup_mode=None,
)
for command in (check, run, demo, listen, convert, record, replay, why):
    app.command()(command)
app.add_typer(journal, name="journal")


def main() -> None:
    """Run the command line; a user's mistake ends with a sentence and exit status 2."""
    try:
        app()
    except BrimwardError as error:
        print(error, file=sys.stderr)  # noqa: T201 - this is the command line's own voice
        sys.exit(2)
    except BrokenPipeError:
        sys.stderr.close()  # whoever read us has seen enough; the interpreter would complain about it
        sys.exit(0)
