"""Limits: what a fiber or the supply cannot do, one object each, in one table."""
