"""The sound of the counts: what a click is, and the way to the machine's audio where there is one."""
