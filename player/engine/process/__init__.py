"""A run in a process of its own: what is said over its local socket, what it shows in shared memory, both ends, its start.

A front end (terminal, window) uses `start.start` or `room.runs` and `client.Client`; it needs nothing else of this room.
"""
