"""Retiming: the least change that makes a score doable, and the proof that it is the least."""
