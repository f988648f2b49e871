"""The commands of composing, one file each."""
