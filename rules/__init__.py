"""The control core: conditions, rules, ranks, actuators.

Law of this package: no I/O, no clock, no threads, no randomness. Time arrives inside events as an integer
number of nanoseconds; what is to happen leaves as effects. Given the same site and the same events, the effects
are the same, byte for byte.

The only door is `rules.engine.Engine.step`.
"""
