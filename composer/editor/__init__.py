"""The compose window: text and cloth side by side, with everything slow done in a process of its own."""
