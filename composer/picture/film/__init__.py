"""Movies: a piece as moving pictures in a file."""
