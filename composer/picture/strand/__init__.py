"""The strand: one fiber over time, what it is asked for over what it can do."""
