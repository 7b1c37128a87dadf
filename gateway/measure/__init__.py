"""Measurement: payload in, judged level out. Pure: no clock, no I/O; time comes as a number."""
