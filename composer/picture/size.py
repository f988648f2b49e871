"""The sizes that a picture may have, in pixels: below, words run into one another; above, memory runs out."""

SMALLEST = (640, 400)
LARGEST = (7680, 4320)

SMALLEST_MOVIE = (320, 240)
LARGEST_MOVIE = (3840, 2160)
SLOWEST_FPS, FASTEST_FPS = 5.0, 60.0
"""The same for movies, and how many frames a second they may have."""
