"""The tree of a condition after reading and after checking.

Frozen nodes and nothing else. Names in a checked tree are full (`tank.name`), values are in SI units. Every node knows
its canonical text, with all parentheses, which reads back to the same tree.
"""
