"""`drawcord ports`: the ports found on this machine."""

import click


@click.command("ports")
def command() -> int:
    """List the serial ports found on this machine, the simulated boards that run on it, and the MIDI ports.

    Each serial line has the path to use after `serial:` in `drawcord play SCORE --to serial:PATH`; each MIDI line has the
    name for `drawcord live … --midi NAME`, of which a part is enough.
    """
    from player.inputs.midi_ports import NO_MIDI, is_midi_there, midi_ports_found
    from player.outputs.serial_ports import ports_found

    ports = [(port.path, port.kind, port.says) for port in ports_found()]
    midi = [(port.name, f"midi {port.way}", port.system) for port in midi_ports_found()]
    if not ports:
        click.echo("No serial port was found, and no simulated board runs. Is the board plugged in, and has it power?")
        click.echo("A simulated board is started with 'drawcord device RIG'.")
    widest = max((len(row[0]) for row in ports + midi), default=0)
    for name, kind, says in ports + midi:
        click.echo(f"{name:<{widest}}  {kind:<9}  {says}".rstrip())
    if not midi:
        click.echo("No MIDI port was found. Is the controller plugged in?" if is_midi_there() else f"N{NO_MIDI[1:]}.")
    return 0
