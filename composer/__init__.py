"""Composing: what should move, and whether it can."""
