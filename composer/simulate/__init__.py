"""The simulated rig: how the fibers would really move."""
