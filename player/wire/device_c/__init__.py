"""The device in portable C99 (device.h, device.c, frames.h, frames.c), and a simulated board around it (posix)."""
