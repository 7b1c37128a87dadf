"""The command line: one module a command, gathered here.

Exit status: 0 done; 1 it ran and the answer is bad; 2 it could not run. Never a traceback for what a user can cause.
"""

import sys

import typer

from gateway.errors import BrimwardError

app = typer.Typer(
    name="brimward",
    help="Turns raw tank-level readings into pump and valve commands, and can say why.",
    no_args_is_help=True,
    pretty_exceptions_enable=False,
    add_completion=False,
)


def main() -> None:
    """Run the command line; a user's mistake ends with a sentence and exit status 2."""
    try:
        app()
    except BrimwardError as error:
        print(error, file=sys.stderr)  # noqa: T201 - this is the command line's own voice
        sys.exit(2)
