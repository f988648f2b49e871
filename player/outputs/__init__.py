"""Where sets go: simulated rig, recording, serial line. One file each, one row in the table of `player.outputs.targets`."""
