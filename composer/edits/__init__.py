"""Edits of a score's text: colours, completion, explanation, drags, mends, the retiming taken in. No screen, no files."""
