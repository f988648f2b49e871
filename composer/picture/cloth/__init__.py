"""The cloth: time to the right, a thread a fiber; drawn whole into a file or on pages, or living in a window."""
