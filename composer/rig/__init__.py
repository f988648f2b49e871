"""The rig file: what hangs on the wall or on the body."""
