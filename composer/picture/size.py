"""The sizes that a picture may have, in pixels: below, words run into one another; above, memory runs out."""

SMALLEST = (640, 400)
LARGEST = (7680, 4320)
