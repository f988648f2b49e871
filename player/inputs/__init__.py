"""What comes in from hands and clocks: the map file, MIDI, OSC, followed and sent time."""
