"""The physics of fibers: kinds, how they are mounted, what they can do."""
