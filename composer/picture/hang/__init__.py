"""The hang view: fibers where they hang, moving."""
