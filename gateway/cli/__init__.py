"""The command line: one module a command, gathered here.

Exit status: 0 done; 1 it ran and the answer is bad; 2 it could not run. Never a traceback for what a user can cause.
"""

import os
import sys

import typer

from gateway.cli.calibrate import calibrate_command
from gateway.cli.check import check_command
from gateway.cli.convert import convert_command
from gateway.cli.demo import demo_command
from gateway.cli.journal import journal
from gateway.cli.listen import listen_command
from gateway.cli.record import record_command
from gateway.cli.replay import replay_command
from gateway.cli.run import run_command
from gateway.cli.why import why_command
from gateway.errors import BrimwardError

app = typer.Typer(
    name="brimward",
    help="Turns raw tank-level readings into pump and valve commands, and can say why.",
    no_args_is_help=True,
    pretty_exceptions_enable=False,
    add_completion=False,
    rich_markup_mode=None,
)
app.command("check")(check_command)
app.command("run")(run_command)
app.command("demo")(demo_command)
app.command("listen")(listen_command)
app.command("convert")(convert_command)
app.command("calibrate")(calibrate_command)
app.command("record")(record_command)
app.command("replay")(replay_command)
app.command("why")(why_command)
app.add_typer(journal, name="journal")


def main() -> None:
    """Run the command line; a user's mistake ends with a sentence and exit status 2."""
    try:
        app()
    except BrimwardError as error:
        print(error, file=sys.stderr)  # noqa: T201 - this is the command line's own voice
        sys.exit(2)
    finally:
        _flush()


def _flush() -> None:
    """Write out what is left; where nobody reads any more, let the interpreter's own try at its end go nowhere."""
    try:
        sys.stdout.flush()
    except BrokenPipeError:
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
