"""The way to the broker: one connection at a time, made afresh, proven by its own echo, and never waited for."""
