"""The preview window: a piece played on the screen, its work in a process beside it."""
