"""Where the example sites are: beside the packages in a checkout, inside the package when installed."""

from pathlib import Path

from gateway.errors import InputError


def example(name: str) -> Path:
    """Return the folder of an example site; raise InputError when it is not there."""
    here = Path(__file__).parent
    for folder in (here / "_examples" / name, here.parent / "config_examples" / name):
        if folder.is_dir():
            return folder
    raise InputError(f"the example site {name} is not part of this installation")
