"""`brimward demo`: a whole site on this machine."""


def demo_command() -> None:
    """Run a whole site on this machine."""
