"""What an edit of a score's text is: colours, completion, explanation, drags, mends, the retiming taken in. No screen, no files."""
