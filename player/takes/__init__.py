"""Takes: what was played by hand, recorded as it went, and written as a score."""
