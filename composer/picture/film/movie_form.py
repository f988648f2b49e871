"""The forms that a movie may have, by the ending of its name, and what the encoder is told for each."""

MP4 = (
    "-vf", "scale=out_color_matrix=bt709:out_range=tv,format=yuv420p", "-c:v", "libx264", "-preset", "veryfast", "-crf", "18",
    "-colorspace", "bt709", "-color_primaries", "bt709", "-color_trc", "bt709", "-movflags", "+faststart", "-f", "mp4",
)  # fmt: skip
GIF = (
    "-lavfi",
    "split[a][b];[a]palettegen=stats_mode=single:max_colors=255[p];[b][p]paletteuse=new=1:dither=none",
    "-f",
    "gif",
)

FORMS: dict[str, tuple[str, ...]] = {".mp4": MP4, ".gif": GIF}
"""What the encoder is told for each ending that a movie's name may have."""

FASTEST_GIF_FPS = 50.0
"""A GIF counts in hundredths of a second, and viewers take a single one for ten."""


def form_of(path: str) -> str | None:
    """The ending that says what a movie is to be, None where it is none that can be made."""
    return next((ending for ending in FORMS if path.lower().endswith(ending)), None)
