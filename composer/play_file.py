"""Play files: a score made ready to play, as a NumPy .npz without pickles. `composer/manual/play-file.md` lists the arrays."""

import io
import os
import tokenize
import zipfile
from dataclasses import dataclass
from typing import IO, Any, NoReturn

import numpy as np
from numpy.typing import NDArray

from composer.faults import fault
from composer.files import read_bytes, replacing, say_bytes
from composer.load import CuePoint
from composer.quivers import NONE, Quivers
from composer.score.bounds import RANGES
from composer.score.expand import MOST_SWINGS
from composer.score.tempo import TempoMap
from composer.shapes import NAMES
from composer.tracks import HOLD, STEP, SUDDEN, Tracks, end_strain

Array = NDArray[np.float64]

VERSION = 1
"""Raised when a file of the new kind would be misread by who knows the old; a reader takes its own version alone."""

MOST_FIBERS, MOST_KNOTS, MOST_CUES, MOST_TEXT = 65536, 4_000_000, 10_000, 4 << 20
MOST_BYTES = 512 << 20
"""Fibers, knots, cues, bytes of one text, bytes of a file (packed or not) that are taken."""

LONGEST_S, WIDEST = 1e6, 1e3
"""Longest score and greatest strain that are believed."""

MOST_PAIRS = 4 * MOST_KNOTS
"""Segments under quivers, those under several counted for each."""

JOINT = 1e-6
"""Strain by which a segment may miss the start of the next: rounding, not a jump."""

ARRAYS: dict[str, tuple[str, str]] = {
    "version": ("<i4", ""),
    "title": ("|u1", "T"),
    "rig_path": ("|u1", "R"),
    "fingerprint": ("<u4", ""),
    "fibers": ("|u1", "N"),
    "duration_s": ("<f8", ""),
    "first": ("<i8", "F+1"),
    "time_s": ("<f8", "K"),
    "curve": ("<f8", "K,6"),
    "manner": ("|i1", "K"),
    "shape": ("|i1", "K"),
    "line": ("<i4", "K"),
    "phrase_line": ("<i4", "K"),
    "tempo_count": ("<f8", "S"),
    "tempo_s": ("<f8", "S"),
    "rate": ("<f8", "S"),
    "slope": ("<f8", "S"),
    "meter_count": ("<f8", "M"),
    "meter_bar": ("<f8", "M"),
    "bar_counts": ("<f8", "M"),
    "cue_names": ("|u1", "L"),
    "cue_s": ("<f8", "C"),
    "cue_wait": ("|b1", "C"),
    "warp_was_s": ("<f8", "W"),
    "warp_now_s": ("<f8", "W"),
}
"""Every array of a play file: dtype and shape; letters are lengths, the same letter the same length."""

QUIVERS: dict[str, tuple[str, str]] = {
    "quiver_knot": ("<i8", "Q"),
    "quiver_until": ("<i8", "Q"),
    "quiver_hertz": ("<f8", "Q"),
    "quiver_amplitude": ("<f8", "Q"),
}
"""The further arrays of a file in which something quivers: all of them or none."""

MOST = {"T": MOST_TEXT, "R": MOST_TEXT, "N": MOST_TEXT, "L": MOST_TEXT, "F+1": MOST_FIBERS + 1, "K": MOST_KNOTS} | {
    "S": 200_000, "M": 200_000, "C": MOST_CUES, "W": MOST_KNOTS + 1, "Q": MOST_KNOTS, "6": 6
}  # fmt: skip
"""The greatest length for each letter."""


_DAMAGED = (
    zipfile.BadZipFile, zipfile.zlib.error, ValueError, OSError, EOFError, NotImplementedError, RuntimeError, MemoryError,
    TypeError, SyntaxError, tokenize.TokenError,
)  # fmt: skip
"""What unpacking an array may raise; the last three where its header is no Python value, the way NumPy reads it."""


@dataclass(frozen=True, slots=True, eq=False)
class Play:
    """What a play file holds.

    fibers: names in the rig's order; rig_path: from where the program runs (in the file: from the play file)
    cues: as played; tempo: counts and bars of the score as written
    warp_was_s, warp_now_s: (W,) instants as written and as played, rising from 0; straight lines between
    """

    title: str
    rig_path: str
    fingerprint: int
    fibers: tuple[str, ...]
    tracks: Tracks
    tempo: TempoMap
    cues: tuple[CuePoint, ...]
    warp_was_s: Array
    warp_now_s: Array


def write_play(path: str | os.PathLike[str], play: Play) -> None:
    """Write a play file, the same bytes for the same score; the target is replaced only when it is complete."""
    folder = os.path.dirname(os.path.abspath(os.fspath(path)))
    try:
        rig_path = os.path.relpath(play.rig_path, folder)
    except ValueError:  # on another drive there is no relative way
        rig_path = os.path.abspath(play.rig_path)
    tracks, tempo = play.tracks, play.tempo
    values: dict[str, Any] = {
        "version": VERSION,
        "title": _bytes(play.title),
        "rig_path": _bytes(rig_path.replace(os.sep, "/")),
        "fingerprint": play.fingerprint,
        "fibers": _bytes("\n".join(play.fibers)),
        "cue_names": _bytes("\n".join(cue.name for cue in play.cues)),
        "cue_s": [cue.seconds for cue in play.cues],
        "cue_wait": [cue.wait for cue in play.cues],
        "warp_was_s": play.warp_was_s,
        "warp_now_s": play.warp_now_s,
    }
    tables = ARRAYS | QUIVERS if len(tracks.quivers) else ARRAYS
    for name, (dtype, _) in tables.items():
        if name in QUIVERS:
            values[name] = getattr(tracks.quivers, name.removeprefix("quiver_"))
        elif name not in values:
            values[name] = getattr(tracks, name, None) if hasattr(tracks, name) else getattr(tempo, name)
        values[name] = np.ascontiguousarray(np.asarray(values[name]).astype(dtype)).reshape(np.shape(values[name]))
    with replacing(path, "wb") as file, zipfile.ZipFile(file, "w", zipfile.ZIP_DEFLATED, compresslevel=4) as packed:
        for name in tables:
            whole = io.BytesIO()
            np.lib.format.write_array(whole, values[name], version=(1, 0), allow_pickle=False)
            packed.writestr(
                zipfile.ZipInfo(f"{name}.npy", (1980, 1, 1, 0, 0, 0)), whole.getvalue(), zipfile.ZIP_DEFLATED, compresslevel=4
            )


def _bytes(text: str) -> NDArray[np.uint8]:
    return np.frombuffer(text.encode("utf-8"), dtype=np.uint8)


def read_play(path: str | os.PathLike[str]) -> Play:
    """Read a play file, believing nothing that it says of itself. Raises Faults."""
    name = os.fspath(path)
    values = _arrays(name, read_bytes(name, MOST_BYTES))
    _check_tracks(name, values)
    _check_tempo(name, values)
    names = _names(name, values["fibers"], "fibers")
    if len(names) != len(values["first"]) - 1:
        _wrong(name, f"fibers names {len(names)} fibers and first has tracks for {len(values['first']) - 1}")
    if len(set(names)) != len(names):
        _wrong(name, "fibers names one fiber twice")
    cues = _names(name, values["cue_names"], "cue_names")
    if len(cues) != len(values["cue_s"]):
        _wrong(name, f"cue_names names {len(cues)} cues and cue_s has {len(values['cue_s'])} instants")
    _rising(name, values, "cue_s", 0.0)
    _rising(name, values, "warp_was_s", 0.0)
    _rising(name, values, "warp_now_s", 0.0)
    if not len(values["warp_was_s"]) or values["warp_was_s"][0] != 0.0 or values["warp_now_s"][0] != 0.0:
        _wrong(name, "warp_was_s and warp_now_s do not begin at 0")
    rig_path = _text(name, values["rig_path"], "rig_path")
    if not rig_path:
        _wrong(name, "rig_path is empty")
    return Play(
        title=_text(name, values["title"], "title"),
        rig_path=os.path.normpath(os.path.join(os.path.dirname(name), rig_path)),
        fingerprint=int(values["fingerprint"]),
        fibers=names,
        tracks=_tracks(values),
        tempo=TempoMap(*(values[field] for field in TempoMap.__dataclass_fields__)),
        cues=tuple(
            CuePoint(cue, float(at), bool(wait))
            for cue, at, wait in zip(cues, values["cue_s"], values["cue_wait"], strict=True)
        ),
        warp_was_s=values["warp_was_s"],
        warp_now_s=values["warp_now_s"],
    )


def _tracks(values: dict[str, NDArray]) -> Tracks:
    arrays = {field: values[field] for field in Tracks.__dataclass_fields__ if field in ARRAYS and field != "duration_s"}
    quivers = Quivers(*(values[array] for array in QUIVERS)) if "quiver_knot" in values else NONE
    return Tracks(**arrays, duration_s=float(values["duration_s"]), quivers=quivers)


def _wrong(name: str, found: str, expected: str = "") -> NoReturn:
    raise fault(name, f"this is no sound play file: {found}", expected, "make it anew with 'drawcord retime SCORE -o OUT.play'")


def _arrays(name: str, data: bytes) -> dict[str, NDArray]:
    """All arrays, each unpacked only once its name, type, shape and size are known to be right."""
    try:
        packed = zipfile.ZipFile(io.BytesIO(data))
    except (zipfile.BadZipFile, ValueError, OSError, EOFError, NotImplementedError, UnicodeDecodeError):
        _wrong(name, "it is cut short, or not a NumPy .npz at all")
    with packed:
        members = packed.infolist()
        found = [member.filename for member in members]
        tables = ARRAYS | QUIVERS if any(member.removesuffix(".npy") in QUIVERS for member in found) else ARRAYS
        if sorted(found) != sorted(f"{array}.npy" for array in tables):
            missing = [array for array in tables if f"{array}.npy" not in found]
            more = [member[:40] for member in found if member.removesuffix(".npy") not in tables]
            _wrong(name, f"it lacks {', '.join(missing[:4])}" if missing else f"it has a part too many: {(more or found)[0]!r}")
        if sum(member.file_size for member in members) > MOST_BYTES:
            _wrong(name, f"unpacked it is more than {say_bytes(MOST_BYTES)}")
        lengths: dict[str, int] = {}
        values: dict[str, NDArray] = {}
        for array in tables:
            try:
                with packed.open(f"{array}.npy") as file:
                    values[array] = _array(name, array, file, lengths)
            except _DAMAGED:
                _wrong(name, f"its part {array} is damaged")
            if array == "version" and int(values[array]) != VERSION:
                raise fault(
                    name,
                    f"this play file is of version {int(values[array])}",
                    f"version {VERSION}",
                    "make it anew with this program: 'drawcord retime SCORE -o OUT.play'",
                )
    return values


def _array(name: str, array: str, file: IO[bytes], lengths: dict[str, int]) -> NDArray:
    """One array from its .npy, its shape checked against what the letters stand for so far."""
    dtype, letters = (ARRAYS | QUIVERS)[array]
    if np.lib.format.read_magic(file) != (1, 0):
        _wrong(name, f"its part {array} is of another .npy version", "1.0")
    shape, fortran, found = np.lib.format.read_array_header_1_0(file)
    if found.hasobject or found.str != np.dtype(dtype).str or fortran:
        _wrong(name, f"{array} is of type {found.str}", np.dtype(dtype).str)
    wanted = letters.split(",") if letters else []
    if len(shape) != len(wanted):
        _wrong(name, f"{array} has {len(shape)} dimensions", str(len(wanted)))
    for length, letter in zip(shape, wanted, strict=True):
        if not 0 <= length <= MOST[letter]:
            _wrong(name, f"{array} has a length of {length}", f"at most {MOST[letter]}")
        known = 6 if letter == "6" else lengths.setdefault(letter, length)
        if length != known:
            _wrong(name, f"{array} has a length of {length}", str(known))
    size = int(np.prod(shape, dtype=np.int64)) * np.dtype(dtype).itemsize
    data = file.read(size + 1)
    if len(data) != size:
        _wrong(name, f"{array} has {'more' if len(data) > size else 'fewer'} bytes than its shape says")
    value = np.frombuffer(data, dtype=dtype).reshape(shape).astype(np.dtype(dtype).newbyteorder("="))
    if value.dtype.kind == "f" and not np.isfinite(value).all():
        _wrong(name, f"{array} holds a number that is not finite")
    return value


def _text(name: str, value: NDArray, array: str) -> str:
    try:
        text = value.tobytes().decode("utf-8")
    except UnicodeDecodeError:
        _wrong(name, f"{array} is not UTF-8")
    if any(ord(c) < 32 and c != "\n" for c in text) or (array in ("title", "rig_path") and "\n" in text):
        _wrong(name, f"{array} holds control characters")
    return text


def _names(name: str, value: NDArray, array: str) -> tuple[str, ...]:
    text = _text(name, value, array)
    found = tuple(text.split("\n")) if text else ()
    if not all(found):
        _wrong(name, f"{array} holds an empty name")
    return found


def _rising(name: str, values: dict[str, NDArray], array: str, low: float) -> None:
    value = values[array]
    if len(value) and (value[0] < low or value[-1] > LONGEST_S or (np.diff(value) < 0.0).any()):
        _wrong(name, f"{array} does not rise from {low:g} to at most {LONGEST_S:g}")


def _check_tracks(name: str, values: dict[str, NDArray]) -> None:
    """Knots in order, curves that join, kinds that exist."""
    first, time, manner, curve = (values[array] for array in ("first", "time_s", "manner", "curve"))
    if not len(first) or first[0] != 0 or first[-1] != len(time) or (np.diff(first) < 1).any():
        _wrong(name, "first does not part the knots among the fibers")
    starts, ends = first[:-1], first[1:] - 1
    if len(time) and (time[starts] != 0.0).any():
        _wrong(name, "in time_s a fiber's first knot is not at 0 s")
    step = np.diff(time)
    inside = np.ones(max(len(time) - 1, 0), dtype=bool)
    inside[ends[:-1]] = False
    if (step[inside] < 0.0).any():
        _wrong(name, "a fiber's knots are out of order in time_s")
    longest = float(values["duration_s"])
    if not time.max(initial=0.0) <= longest <= LONGEST_S:
        _wrong(name, f"duration_s is {longest:g}", f"from the last knot, at {time.max(initial=0.0):g} s, to {LONGEST_S:g} s")
    if ((manner < HOLD) | (manner > STEP)).any() or (manner[ends] != HOLD).any():
        _wrong(name, "manner holds a kind of segment that there is not, or a fiber does not end in a hold")
    if ((values["shape"] < -1) | (values["shape"] >= len(NAMES))).any():
        _wrong(name, "shape holds a shape that there is not")
    if (values["line"] < 0).any() or (values["phrase_line"] < 0).any():
        _wrong(name, "line or phrase_line is negative")
    if (np.abs(curve) > WIDEST).any() or (curve[manner == HOLD, 1:] != 0.0).any():
        _wrong(name, "curve holds strains that no fiber has, or a hold that moves")
    tracks = _tracks(values)
    gap = curve[1:, 0] - end_strain(tracks)[:-1]
    if (np.abs(gap[inside]) > JOINT).any():
        _wrong(name, "a segment of curve does not begin where the one before it ends")
    if (step[inside][manner[:-1][inside] == STEP] > 1e-9).any():
        _wrong(name, "a jump takes time")
    _check_quivers(name, tracks)


def _check_quivers(name: str, tracks: Tracks) -> None:
    """Quivers that begin and end on the knots of one fiber, lie over what moves or jumps, and swing as a score's may."""
    quivers, knots = tracks.quivers, len(tracks.time_s)
    if not len(quivers):
        return
    if ((quivers.knot < 0) | (quivers.until >= knots) | (quivers.until <= quivers.knot)).any():
        _wrong(name, "a quiver begins or ends at a knot that there is not")
    fiber = np.searchsorted(tracks.first, np.stack([quivers.knot, quivers.until]), side="right")
    if (fiber[0] != fiber[1]).any():
        _wrong(name, "a quiver goes from one fiber to another")
    frequency = RANGES["quiver"]
    if ((quivers.hertz < float(frequency.low)) | (quivers.hertz > float(frequency.high))).any():
        _wrong(name, "quiver_hertz holds a frequency that no quiver has", f"{frequency.says}, {frequency.told}")
    if ((quivers.amplitude < 0.0) | (quivers.amplitude > WIDEST)).any():
        _wrong(name, "quiver_amplitude holds a strain that no fiber has")
    lasts = tracks.time_s[quivers.until] - tracks.time_s[quivers.knot]
    if (swings := float(quivers.hertz @ lasts)) > 2 * MOST_SWINGS:
        _wrong(name, f"its quivers swing {swings:.0f} times", f"at most {2 * MOST_SWINGS}")
    steady = np.concatenate([[0], np.cumsum((tracks.manner == HOLD) | (tracks.manner == SUDDEN))])
    if (steady[quivers.until] > steady[quivers.knot]).any() or int((quivers.until - quivers.knot).sum()) > MOST_PAIRS:
        _wrong(name, "a quiver lies over a hold or a sudden move, or many over very many")


def _check_tempo(name: str, values: dict[str, NDArray]) -> None:
    """Stretches in order, at paces that are paces."""
    for arrays in (("tempo_count", "tempo_s"), ("meter_count", "meter_bar")):
        for array in arrays:
            value = values[array]
            if not len(value) or (np.diff(value) <= 0.0).any() or np.abs(value).max() > 1e9:
                _wrong(name, f"{array} does not rise")
    rate, slope = values["rate"], values["slope"]
    reached = rate[:-1] + slope[:-1] * np.diff(values["tempo_count"])
    if (rate <= 0.0).any() or (reached <= 0.0).any() or np.abs(rate).max() > 1e3 or (slope[-1:] < 0.0).any():
        _wrong(name, "rate or slope holds a pace that is none")
    if (values["bar_counts"] < 1.0).any() or (values["bar_counts"] > 1e6).any():
        _wrong(name, "bar_counts holds a bar of less than one count")
