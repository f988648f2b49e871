"""The commands of playing, and the entry point that gathers all commands."""
