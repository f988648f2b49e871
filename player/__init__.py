"""Playing: making it move, on a simulator, a file or real valves."""
