"""The rehearse window: a front end of a run's process, in Qt. The run does not depend on it."""
