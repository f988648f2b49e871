"""The score language: reading it, tempo, expanding it to tracks, writing it back."""
