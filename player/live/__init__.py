"""Playing by hand: what controllers ask for, mixed with a score, through the governor to the valves; a screen; takes."""
