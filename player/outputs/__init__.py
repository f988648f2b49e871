"""Where motion goes: simulator, serial line, file."""
