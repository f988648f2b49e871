"""`drawcord ports`: the ports found on this machine."""

import click


@click.command("ports")
def command() -> int:
    """List the serial ports found on this machine, and the simulated boards that run on it.

    Each line has the path to use after `serial:` in `drawcord play SCORE --to serial:PATH`.
    """
    from player.outputs.serial_ports import ports_found

    ports = ports_found()
    if not ports:
        click.echo("No serial port was found, and no simulated board runs. Is the board plugged in, and has it power?")
        click.echo("A simulated board is started with 'drawcord device RIG'.")
        return 0
    widest = max(len(port.path) for port in ports)
    for port in ports:
        click.echo(f"{port.path:<{widest}}  {port.kind:<9}  {port.says}".rstrip())
    return 0
