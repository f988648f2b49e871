"""The wire protocol: messages, frames, host side, device side."""
