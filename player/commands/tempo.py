"""`drawcord tempo`: meters, tempi and markers of a MIDI file as a score has them, and the way back."""

import os

import click


@click.command("tempo")
@click.argument("source", metavar="FILE.mid|SCORE", type=click.Path(path_type=str))
@click.option(
    "-o", "output", metavar="OUT", type=click.Path(path_type=str), help="OUT.score from a MIDI file, OUT.mid from a score."
)
def command(source: str, output: str | None) -> int:
    """Meters, tempi and markers of a standard MIDI file as statements of a score, on stdout or into OUT.score.

    Given a score, with -o OUT.mid: its meters, tempi and cues as a MIDI file, so that the music can follow it.
    """
    from composer.faults import fault
    from composer.files import check_writable, read_bytes, replacing
    from composer.score.bounds import most
    from composer.score.tempo import tempo_map
    from player.inputs.file_to_score import score_of
    from player.inputs.midi_file import MOST_BYTES, read_midi, write_midi
    from player.inputs.score_to_file import times_of

    data = read_bytes(source, max(MOST_BYTES, most("file")))
    is_midi = data[:4] == b"MThd" or os.path.splitext(source)[1].lower() in (".mid", ".midi", ".smf")
    if output is not None:
        if os.path.exists(output) and os.path.exists(source) and os.path.samefile(output, source):
            raise fault(output, "the output is the input", "another file to write to")
        _suits(output, is_midi)
        check_writable(output, "# from " if is_midi else "")
    elif not is_midi:
        raise fault(source, "a score becomes a MIDI file, which cannot be shown", hint="say where to: -o OUT.mid")
    if is_midi:
        text = score_of(read_midi(data, source), source)
        if output is None:
            click.echo(text, nl=False)
        else:
            with replacing(output) as file:
                file.write(text)
        return 0
    score = _score(source)
    made = write_midi(times_of(score, tempo_map(score)))
    with replacing(output or "", "wb") as file:
        file.write(made)
    return 0


def _score(path: str):
    """The score of a file, without its rig."""
    from composer.files import read_text
    from composer.score.bounds import most
    from composer.score.reading import read_score

    folder = os.path.dirname(path)
    return read_score(read_text(path, most("file")), path, lambda used: read_text(os.path.join(folder, used), most("file")))


def _suits(output: str, is_midi: bool) -> None:
    """An output's ending says what it is to be; the wrong one is a slip of the hand."""
    from composer.faults import fault

    ending = os.path.splitext(output)[1].lower()
    if is_midi and ending in (".mid", ".midi", ".smf"):
        raise fault(output, "the input is a MIDI file already", "an output such as OUT.score")
    if not is_midi and ending == ".score":
        raise fault(output, "the input is a score already", "an output such as OUT.mid")
