"""Files that the program writes itself and that may come back hostile, as targets: play files, logs, takes and others.

What has checksums is changed beneath them as well, so that what lies behind the checksum is reached.
"""

import io
import json
import struct
import zipfile
import zlib
from collections.abc import Callable, Sequence
from pathlib import Path
from random import Random
from tokenize import TokenError

import numpy as np
from mido import MetaMessage, MidiFile, MidiTrack

from composer.editor import recovery
from composer.editor.deltas import Delta
from composer.faults import Faults
from composer.limits.check import check
from composer.motion import strain_at
from composer.play_file import Play, read_play, write_play
from composer.score.reading import read_score
from player.commands.log_report import as_object, sentences
from player.engine.framed import framed, frames
from player.engine.run_log import KINDS, MAGIC, RunLog, records
from player.engine.told import Senseless, apart, landings, lateness, told
from player.inputs.file_to_score import score_of
from player.inputs.midi_file import read_midi
from player.outputs import recording
from player.takes import form
from player.takes.form import Recorder, read_take

from .mutations import REALS, WORDS, mutated_bytes, mutated_json
from .running import Target
from .texts import DEMOS, gannet


def plays(folder: Path) -> tuple[Sequence[bytes], Callable[[bytes], object]]:
    """Play files on *Gannet*, read as every command reads them; what is let through is checked."""
    known = gannet()
    names = tuple(fiber.name for fiber in known.rig.fibers)
    end = np.array([0.0, known.tracks.duration_s])
    made = Play(
        known.score.title,
        str(DEMOS / "gannet.rig.toml"),
        known.rig.fingerprint,
        names,
        known.tracks,
        known.tempo,
        known.cues,
        end,
        end,
    )
    good = folder / "good.play"
    write_play(good, made)

    def read(data: bytes) -> None:
        path = folder / "fuzz.play"
        path.write_bytes(data)
        play = read_play(path)
        if play.fibers == names:
            check(play.tracks, known.rig, known.abilities)
            strains = strain_at(play.tracks, known.abilities, np.linspace(0.0, play.tracks.duration_s, 50))
            assert np.isfinite(strains).all()

    return [good.read_bytes()], read


def repacked(chance: Random, examples: Sequence[bytes]) -> bytes:
    """A play file with one of its arrays changed, packed anew."""
    if chance.random() < 0.25:
        return mutated_bytes(chance, examples)
    with zipfile.ZipFile(io.BytesIO(chance.choice(examples))) as packed:
        parts = {name: packed.read(name) for name in packed.namelist()}
    for _ in range(1 if chance.random() < 0.7 else 3):
        name = chance.choice(list(parts))
        parts[name] = mutated_bytes(chance, [parts[name]]) if chance.random() < 0.3 else _array(chance, parts[name])
    if chance.random() < 0.05:
        parts.pop(chance.choice(list(parts)))
    whole = io.BytesIO()
    with zipfile.ZipFile(whole, "w", chance.choice((zipfile.ZIP_STORED, zipfile.ZIP_DEFLATED))) as packed:
        for name, data in parts.items():
            packed.writestr(name, data)
    return whole.getvalue()


def _array(chance: Random, data: bytes) -> bytes:
    """An array with a value, its shape or its type changed."""
    try:
        value = np.lib.format.read_array(io.BytesIO(data), allow_pickle=False).copy()
    except (ValueError, EOFError, OSError, SyntaxError, TokenError):
        return data
    kind, flat = chance.random(), value.reshape(-1)
    if kind < 0.7 and len(flat):
        at = chance.randrange(len(flat))
        with np.errstate(all="ignore"):
            if value.dtype.kind == "f":
                flat[at] = chance.choice((*REALS, flat[at] * chance.choice((-1.0, 2.0, 1e6)), flat[max(at - 1, 0)]))
            elif value.dtype.kind in "iu":
                low, high = int(np.iinfo(value.dtype).min), int(np.iinfo(value.dtype).max)
                wanted = chance.choice((*WORDS, low, int(flat[at]) + 1, int(flat[at]) - 1, -1))
                flat[at] = max(low, min(wanted, high))
            else:
                flat[at] = not flat[at]
    elif kind < 0.8 and value.ndim:
        value = value[: chance.randrange(len(value) + 1)]
    elif kind < 0.9 and value.ndim:
        value = np.concatenate([value, value[-1:]])
    else:
        value = (
            value.astype(chance.choice(("<f4", ">f8", "<i8", "|u1", "<c16", "|S3")), casting="unsafe")
            if value.dtype.kind != "V"
            else value
        )
    whole = io.BytesIO()
    np.lib.format.write_array(whole, value, allow_pickle=False)
    return whole.getvalue()


def logs(folder: Path) -> tuple[Sequence[bytes], Callable[[bytes], object]]:
    """Logs of runs, told and reported."""
    written: list[bytes] = []
    log = RunLog(written.append)
    head = {
        "fibers": ["r.1", "r.2"],
        "stroke": [0.3, 0.3],
        "rate_Hz": 200.0,
        "lead_s": 0.0,
        "ahead_s": 0.06,
        "drivers": ["main"],
    }
    head |= {
        "played": "a.score",
        "kind": "score",
        "title": "Bench",
        "rig": "a.rig.toml",
        "fingerprint": "1234abcd",
        "targets": ["sim"],
    }
    log.tell("head", 0.0, **head, date="2026-05-01")
    log.tell("hits", 0.0, hits=[[20_000, "1:1", [0]], [50_000, "1:2", [0, 1]]])
    log.tell("state", 0.0, was="armed", now="playing", why="")
    for n in range(20):
        at = 0.005 * n
        log.set(at, at + 0.06, 0.0001, at, np.array([n, 2 * n], dtype=np.uint16), np.array([9 * n, 8 * n], dtype=np.uint16))
        if n % 4 == 0:
            log.sense(at, at, np.array([0, 1]), np.array([0.01 * n, 0.02 * n]))
            log.supply(at, 0, 480.0)
    log.tell("board", 0.05, driver="main", kind="fault", code=3, say="not armed", place="1:2")
    log.tell("alarm", 0.06, fiber="r.1", kind="leak", say="falls", place="1:2")
    log.tell("slip", 0.07, seconds=0.5, place="1:2")
    log.tell("end", 0.1, ended="end", why="", place="1:3", exit=0, stood={"at_rest": [0.0, None], "held": [0.1, None]})
    whole = b"".join(written)

    def read(data: bytes) -> None:
        try:
            found, left = records(data)
            log = told(found)
        except ValueError as why:  # as the command takes it
            raise Senseless(why) from None
        landings(log), apart(log), lateness(log)
        whole = as_object(log, str(folder / "fuzz.log"), left)
        json.dumps(whole, allow_nan=False)
        assert "\n".join(sentences(whole)).encode().decode().replace("\n", "").isprintable()

    return [whole, whole[: len(whole) // 2]], read


def reframed(magic: bytes, kinds) -> Callable[[Random, Sequence[bytes]], bytes]:
    """Mutations of a file of framed records: bodies changed beneath their checksums, records moved, doubled, taken out."""

    def mutate(chance: Random, examples: Sequence[bytes]) -> bytes:
        data = chance.choice(examples)
        if chance.random() < 0.25:
            return mutated_bytes(chance, examples)
        rows = [[kind, time_us, body] for kind, time_us, body, _ in frames(data, len(magic), kinds)]
        for _ in range(1 if chance.random() < 0.6 else 4):
            if not rows:
                break
            row, what = chance.choice(rows), chance.random()
            if what < 0.6:
                row[2] = mutated_json(chance, row[2]) if row[2][:1] == b"{" else mutated_bytes(chance, [row[2]])
            elif what < 0.7:
                row[0] = chance.choice(list(kinds))
            elif what < 0.8:
                row[1] = chance.choice(WORDS) % (1 << 64)
            elif what < 0.9:
                rows.remove(row)
            else:
                rows.insert(chance.randrange(len(rows) + 1), list(row))
        return data[: len(magic)] + b"".join(framed(kind, time_us, body) for kind, time_us, body in rows)

    return mutate


def takes(folder: Path) -> tuple[Sequence[bytes], Callable[[bytes], object]]:
    """Takes."""
    written: list[bytes] = []
    recorder = Recorder(
        written.append, ("r.1", "r.2", "r.3"), rig="a.rig.toml", score="a.score", fingerprint=7, rate_Hz=200.0, date=""
    )
    for n in range(30):
        recorder.input(0.005 * n, "box", "cc 21", n / 30.0)
        recorder.sample(0.005 * n, np.array([0.01 * n, 0.0, 0.1]), np.array([0.01 * n, 0.0, 0.05 * (n > 9)]))
    recorder.end()

    def read(data: bytes) -> None:
        take = read_take(data, "fuzz.take")
        for changes in (take.wanted, take.governed):
            for fiber in range(min(len(take.fibers), 8)):
                assert np.isfinite(take.strain(changes, fiber)).all()

    return [b"".join(written)], read


def recordings(folder: Path) -> tuple[Sequence[bytes], Callable[[bytes], object]]:
    """Recordings."""
    data = recording.head(7, 200.0, (("left", 3), ("right", 2)), "a.rig.toml")
    data += b"".join(recording.frame(recording.SET, 0.005 * n, np.arange(5, dtype=np.uint16) * n) for n in range(12))
    data += recording.frame(recording.REST, 0.06) + recording.frame(recording.END, 0.07)
    return [data], lambda given: recording.read(given, "fuzz.rec")


def resealed(chance: Random, examples: Sequence[bytes]) -> bytes:
    """A recording whose head is changed beneath its checksum."""
    data = chance.choice(examples)
    if chance.random() < 0.4:
        return mutated_bytes(chance, examples)
    length = next(n for n in range(20, len(data)) if struct.unpack_from("<I", data, n)[0] == zlib.crc32(data[:n]))
    head = mutated_bytes(chance, [data[:length]])
    return head + zlib.crc32(head).to_bytes(4, "little") + data[length + 4 :]


def midi_files(folder: Path) -> tuple[Sequence[bytes], Callable[[bytes], object]]:
    """MIDI files, made into scores, which are read."""
    first = MidiTrack(
        [
            MetaMessage("time_signature", numerator=3, denominator=8),
            MetaMessage("set_tempo", tempo=500_000),
            MetaMessage("marker", text="dive", time=480),
            MetaMessage("set_tempo", tempo=400_000, time=960),
            MetaMessage("set_tempo", tempo=390_000, time=10),
            MetaMessage("time_signature", numerator=4, denominator=4, time=470),
            MetaMessage("cue_marker", text="up", time=300),
            MetaMessage("end_of_track", time=10),
        ]
    )
    examples = []
    for kind, tracks in ((0, [first]), (1, [first, first])):
        whole = io.BytesIO()
        MidiFile(type=kind, ticks_per_beat=960, tracks=tracks).save(file=whole)
        examples.append(whole.getvalue())

    def read(data: bytes) -> None:
        text = score_of(read_midi(data, "fuzz.mid"), "fuzz.mid")
        if len(text) < 20_000:
            # What it writes is a score that can be read.
            try:
                read_score(text, "fuzz.score")
            except Faults as why:
                raise AssertionError(f"the score that was made is none: {why}") from None

    return examples, read


def recoveries(folder: Path) -> tuple[Sequence[bytes], Callable[[bytes], object]]:
    """What is kept of a text that was not saved."""
    data = b"".join(recovery.begin("a.score", "0" * 64, "tempo 72\nphrase a 4\n"))
    data += b"".join(recovery.change(Delta(n, n % 2, "é😀x"[n % 3])) for n in range(12))
    return [data], recovery.read


def rewritten(chance: Random, examples: Sequence[bytes]) -> bytes:
    """Lines with a checksum each, changed beneath it."""
    if chance.random() < 0.3:
        return mutated_bytes(chance, examples)
    lines = chance.choice(examples).split(b"\n")[:-1]
    at = chance.randrange(len(lines))
    body = mutated_json(chance, lines[at][9:])
    lines[at] = b"%08x %s" % (zlib.crc32(body), body)
    return b"\n".join(lines) + b"\n"


TARGETS = (
    Target("play", plays, (Faults,), 150, repacked),
    Target("log", logs, (Senseless,), 600, reframed(MAGIC, KINDS)),
    Target("take", takes, (Faults,), 1000, reframed(form.MAGIC, form.KINDS)),
    Target("recording", recordings, (Faults,), 1500, resealed),
    Target("midi-file", midi_files, (Faults,), 1000),
    Target("recovery", recoveries, (), 1500, rewritten),
)
