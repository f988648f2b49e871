"""The engine: clock, transport, safety states, loop."""
