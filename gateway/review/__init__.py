"""Review: why, replay. Drives the plant; has no engine of its own."""
