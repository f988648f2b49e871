"""Plain plots: what makes can do, fits over their data, a run as it was."""
