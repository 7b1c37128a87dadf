"""Brimward, the edge gateway: everything that touches the world.

The way of a reading through the house: `link` receives it, `measure` turns it into a judged level, `plant` hands it to
the control core in `rules`, `link` sends what the core commands, `journal` keeps it all, `review` explains it.
`service` wires the threads together; `settings` reads what the user wrote; `cli` is the command line.
"""

__version__ = "0.1.0"
