"""Whether a value can be used, and in what form: its age, its plausibility, its spikes, and the judge over all."""
