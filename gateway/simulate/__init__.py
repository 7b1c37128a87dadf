"""The simulated plant of the demo: tanks by mass balance, sensors answering in raw units, relays obeying."""
