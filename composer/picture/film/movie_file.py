"""Frames into a movie file: raw pictures to the encoder that imageio-ffmpeg brings along, a file that is whole or not there."""

import subprocess
from collections.abc import Callable
from contextlib import suppress

from composer.files import replacing_by_name
from composer.picture.film.movie import Film
from composer.picture.film.movie_form import FORMS, form_of


class EncoderFailedError(Exception):
    """The encoder ended before its time; what it said."""


def encoder() -> str:
    """The encoder's program. Raises EncoderFailedError where this machine has none."""
    import imageio_ffmpeg

    try:
        return imageio_ffmpeg.get_ffmpeg_exe()
    except RuntimeError as wrong:
        raise EncoderFailedError(str(wrong)) from None


def write_movie(path: str, film: Film, progress: Callable[[int], None] = lambda frame: None) -> None:
    """Draw all frames and write the movie; whatever ends it before the last frame leaves no file behind.

    progress: called with the number of every frame that was handed over
    Raises Faults where the file cannot be written, EncoderFailedError where the encoder fails.
    """
    take = film.take
    form = form_of(path)
    if form is None:
        raise ValueError(path)
    program = encoder()
    with replacing_by_name(path) as name:
        command = (
            program, "-hide_banner", "-loglevel", "error", "-y", "-f", "rawvideo", "-pix_fmt", "bgr0",
            "-s", f"{take.width}x{take.height}", "-r", f"{take.fps:g}", "-i", "-", "-an", *FORMS[form], name,
        )  # fmt: skip
        # In a session of its own, so that Ctrl-C comes here alone and ends the encoder in order.
        running = subprocess.Popen(
            command, stdin=subprocess.PIPE, stdout=subprocess.DEVNULL, stderr=subprocess.PIPE, start_new_session=True
        )
        try:
            _hand_over(running, film, progress)
            said = running.communicate()[1].decode(errors="replace").strip()
        finally:
            with suppress(OSError):
                running.kill()
            running.wait()
        if running.returncode != 0:
            raise EncoderFailedError(said or f"it ended with {running.returncode}")


def _hand_over(running: "subprocess.Popen[bytes]", film: Film, progress: Callable[[int], None]) -> None:
    """Write every frame; an encoder that has gone says why when it is asked."""
    try:
        for number in range(film.take.frames):
            running.stdin.write(film.frame(number).constBits())
            progress(number)
    except BrokenPipeError:
        pass
