"""From the strain wanted to the set-point that is sent, so that a fiber lands on the count."""
