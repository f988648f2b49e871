"""Play files: what is written reads back, and no file that is unsound gets past the reader."""

import io
import zipfile
from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from composer.faults import Faults
from composer.load import CuePoint
from composer.play_file import ARRAYS, QUIVERS, Play, read_play, write_play
from composer.quivers import Quivers
from composer.score.tempo import TempoMap
from composer.tracks import Tracks

TRACKS = Tracks(
    first=np.array([0, 3, 4]),
    time_s=np.array([0.0, 1.0, 2.0, 0.0]),
    curve=np.array([[0, 0.3, 0, 0, 0, 0], [0.3, -0.3, 0, 0, 0, 0], [0.0] * 6, [0.0] * 6]),
    manner=np.array([1, 1, 0, 0], dtype=np.int8),
    shape=np.array([1, 1, -1, -1], dtype=np.int8),
    line=np.array([3, 3, 0, 0], dtype=np.int32),
    phrase_line=np.array([1, 2, 0, 0], dtype=np.int32),
    duration_s=2.5,
)
TEMPO = TempoMap(*(np.array(part, dtype=float) for part in ([0, 8], [0, 8], [1, 1], [0, 0.125], [0], [0], [4])))


@pytest.fixture
def play(tmp_path) -> Play:
    return Play(
        title="Gannet",
        rig_path=str(tmp_path / "gannet.rig.toml"),
        fingerprint=0xFEDCBA98,
        fibers=("left.1", "left.2"),
        tracks=TRACKS,
        tempo=TEMPO,
        cues=(CuePoint("auf Tauchgang", 1.0, True),),
        warp_was_s=np.array([0.0, 1.0]),
        warp_now_s=np.array([0.0, 1.2]),
    )


def parts(path) -> dict[str, bytes]:
    with zipfile.ZipFile(path) as packed:
        return {name: packed.read(name) for name in packed.namelist()}


def packed(path, contents: dict[str, bytes], kind=zipfile.ZIP_DEFLATED) -> None:
    with zipfile.ZipFile(path, "w", kind) as file:
        for name, data in contents.items():
            file.writestr(name, data)


def npy(value, **more) -> bytes:
    whole = io.BytesIO()
    np.lib.format.write_array(whole, np.asarray(value), version=(1, 0), **more)
    return whole.getvalue()


def test_what_is_written_reads_back(tmp_path, play):
    path = tmp_path / "a.play"
    write_play(path, play)
    found = read_play(path)
    for name in ("title", "rig_path", "fingerprint", "fibers", "cues"):
        assert getattr(found, name) == getattr(play, name), name
    for thing, other in ((found.tracks, TRACKS), (found.tempo, TEMPO)):
        for name in type(thing).__dataclass_fields__:
            assert np.array_equal(getattr(thing, name), getattr(other, name)), name
            assert np.asarray(getattr(thing, name)).dtype == np.asarray(getattr(other, name)).dtype, name
    assert np.array_equal(found.warp_now_s, play.warp_now_s)


def test_numpy_reads_it_without_pickles(tmp_path, play):
    write_play(tmp_path / "a.play", play)
    with np.load(tmp_path / "a.play", allow_pickle=False) as found:
        assert set(found.files) == set(ARRAYS)
        for name, (dtype, _) in ARRAYS.items():
            assert found[name].dtype == np.dtype(dtype), name


def test_the_same_score_gives_the_same_bytes(tmp_path, play):
    write_play(tmp_path / "a.play", play)
    write_play(tmp_path / "b.play", play)
    assert (tmp_path / "a.play").read_bytes() == (tmp_path / "b.play").read_bytes()


def test_the_rig_is_found_from_where_the_play_file_lies(tmp_path, play, monkeypatch):
    (tmp_path / "out").mkdir()
    write_play(tmp_path / "out" / "a.play", play)
    monkeypatch.chdir(tmp_path / "out")
    assert read_play("a.play").rig_path == "../gannet.rig.toml"


def test_a_play_file_cut_short_anywhere_is_refused(tmp_path, play):
    write_play(tmp_path / "a.play", play)
    whole = (tmp_path / "a.play").read_bytes()
    for length in range(0, len(whole), 97):
        (tmp_path / "b.play").write_bytes(whole[:length])
        with pytest.raises(Faults):
            read_play(tmp_path / "b.play")


@settings(max_examples=150, deadline=None)
@given(st.data())
def test_a_play_file_with_bytes_changed_is_read_or_refused_in_words(tmp_path_factory, data):
    folder = tmp_path_factory.mktemp("changed")
    path = folder / "a.play"
    write_play(path, Play("t", str(folder / "r.toml"), 1, ("a", "b"), TRACKS, TEMPO, (), np.zeros(1), np.zeros(1)))
    whole = bytearray(path.read_bytes())
    for _ in range(data.draw(st.integers(1, 4))):
        whole[data.draw(st.integers(0, len(whole) - 1))] = data.draw(st.integers(0, 255))
    path.write_bytes(whole)
    try:
        read_play(path)
    except Faults as refused:
        assert str(path) in str(refused)


QUIVERING = replace(TRACKS, quivers=Quivers(np.array([0, 1]), np.array([2, 2]), np.array([3.0, 0.5]), np.array([0.01, 0.02])))


def test_quivers_are_kept_in_arrays_of_their_own_and_read_back(tmp_path, play):
    write_play(tmp_path / "a.play", replace(play, tracks=QUIVERING))
    found = read_play(tmp_path / "a.play").tracks.quivers
    for name in Quivers.__dataclass_fields__:
        assert getattr(found, name).tolist() == getattr(QUIVERING.quivers, name).tolist()
    assert set(parts(tmp_path / "a.play")) == {f"{name}.npy" for name in ARRAYS | QUIVERS}


UNSOUND_QUIVERS = {
    "quiver_knot": [np.array([-1, 1]), np.array([2, 1]), np.array([0, 3]), np.array([0])],
    "quiver_until": [np.array([4, 2]), np.array([2, 1]), np.array([3, 2]), np.array([2.0, 2.0])],
    "quiver_hertz": [np.array([0.0, 1.0]), np.array([1e9, 1.0]), np.array([float("nan"), 1.0])],
    "quiver_amplitude": [np.array([-0.1, 0.1]), np.array([1e9, 0.1])],
    "manner": [np.array([1, 2, 0, 0], np.int8)],
    "time_s": [np.array([0.0, 1.0, 9e5, 0.0])],
}


@pytest.mark.parametrize(("array", "value"), [(name, value) for name, values in UNSOUND_QUIVERS.items() for value in values])
def test_unsound_quivers_are_refused(tmp_path, play, array, value):
    path = tmp_path / "a.play"
    longer = replace(QUIVERING, duration_s=9e5) if array == "time_s" else QUIVERING
    write_play(path, replace(play, tracks=longer))
    packed(path, parts(path) | {f"{array}.npy": npy(value)})
    with pytest.raises(Faults, match="no sound play file"):
        read_play(path)


def test_a_file_with_some_of_the_arrays_of_quivers_is_refused(tmp_path, play):
    path = tmp_path / "a.play"
    write_play(path, replace(play, tracks=QUIVERING))
    contents = parts(path)
    del contents["quiver_hertz.npy"]
    packed(path, contents)
    with pytest.raises(Faults, match="it lacks quiver_hertz"):
        read_play(path)


NAN, HUGE = float("nan"), 1 << 40
UNSOUND = {
    "curve": [np.full((4, 6), NAN), np.full((4, 6), 1e6), np.zeros((4, 5)), np.ones((4, 6)), np.zeros((4, 6), np.float32)],
    "time_s": [np.array([0, 2.0, 1, 0]), np.array([0, 1, NAN, 0]), np.array([0.5, 1, 2, 0]), np.zeros(3), np.zeros((4, 1))],
    "first": [np.array(value) for value in ([0, 3, 5], [0, 4, 3], [1, 3, 4], [0, 4], [0, 4, 4], [0, -3, 4])],
    "manner": [np.array([1, 9, 0, 0], np.int8), np.array([1, 1, 1, 0], np.int8), np.array([0, 1, 0, 0], np.int8)],
    "shape": [np.array([77, 1, -1, -1], np.int8)],
    "line": [np.array([-3, 3, 0, 0], np.int32)],
    "duration_s": [np.float64(1.0), np.float64(1e12), np.float64(NAN)],
    "version": [np.int32(2), np.int64(1)],
    "fibers": [np.frombuffer(b"left.1", np.uint8), np.frombuffer(b"a\na", np.uint8), np.frombuffer(b"\xff\n\xfe", np.uint8)],
    "cue_names": [np.frombuffer(b"a\nb", np.uint8), np.frombuffer(b"\n", np.uint8)],
    "cue_s": [np.array([-1.0]), np.array([NAN])],
    "rate": [np.array([1.0, -1.0]), np.array([0.0, 1.0])],
    "slope": [np.array([-1.0, 0.0]), np.array([0.0, -1.0])],
    "bar_counts": [np.array([0.0])],
    "tempo_count": [np.array([8.0, 0.0])],
    "warp_was_s": [np.array([0.0, -1.0]), np.array([1.0, 2.0]), np.array([0.0])],
    "rig_path": [np.frombuffer(b"a\x00b", np.uint8), np.empty(0, np.uint8)],
    "title": [np.frombuffer(b"a\x1b[2J", np.uint8)],
}  # fmt: skip


@pytest.mark.parametrize(("name", "value"), [(name, value) for name, values in UNSOUND.items() for value in values])
def test_an_unsound_array_is_refused_by_name(tmp_path, play, name, value):
    path = tmp_path / "a.play"
    write_play(path, play)
    packed(path, parts(path) | {f"{name}.npy": npy(value)})
    with pytest.raises(Faults) as refused:
        read_play(path)
    said = str(refused.value)
    assert str(path) in said
    # A length that differs is told of the array that comes second.
    partners = {"manner": "curve", "first": "fibers time_s", "time_s": "curve", "warp_was_s": "warp_now_s"}
    assert any(word in said for word in (name, *partners.get(name, "").split()))


def test_a_pickle_is_never_unpacked(tmp_path, play):
    path = tmp_path / "a.play"
    write_play(path, play)

    class Trap:
        def __reduce__(self):
            return (open, (str(tmp_path / "sprung"), "w"))

    trap = np.empty(1, dtype=object)
    trap[0] = Trap()
    packed(path, parts(path) | {"title.npy": npy(trap, allow_pickle=True)})
    with pytest.raises(Faults, match="title"):
        read_play(path)
    assert not (tmp_path / "sprung").exists()


def test_a_zip_bomb_is_refused_before_it_is_unpacked(tmp_path, play):
    path = tmp_path / "a.play"
    write_play(path, play)
    head = npy(np.zeros((4, 6)))[:128].replace(b"(4, 6)", b"(9,6) ")
    packed(path, parts(path) | {"curve.npy": head + bytes(64 << 20)})
    assert path.stat().st_size < 1 << 20
    with pytest.raises(Faults, match="curve"):
        read_play(path)


def test_a_length_beyond_all_bounds_is_refused_before_anything_is_allocated(tmp_path, play):
    path = tmp_path / "a.play"
    write_play(path, play)
    head = npy(np.zeros(4))[:128].replace(b"(4,), }", f"({HUGE},), }}".encode()[:20])
    packed(path, parts(path) | {"time_s.npy": head})
    with pytest.raises(Faults, match="time_s"):
        read_play(path)


@pytest.mark.parametrize("change", ["missing", "more", "twice"])
def test_a_play_file_has_its_arrays_and_no_others(tmp_path, play, change):
    path = tmp_path / "a.play"
    write_play(path, play)
    contents = parts(path)
    if change == "missing":
        del contents["slope.npy"]
    if change == "more":
        contents["../evil.npy"] = b""
    packed(path, contents)
    if change == "twice":
        with pytest.warns(UserWarning), zipfile.ZipFile(path, "a") as file:
            file.writestr("slope.npy", contents["slope.npy"])
    with pytest.raises(Faults, match="lacks slope" if change == "missing" else "too many"):
        read_play(path)


def test_a_failed_write_leaves_the_old_file(tmp_path, play):
    path = tmp_path / "a.play"
    path.write_bytes(b"old")
    with pytest.raises((TypeError, ValueError)):
        write_play(path, replace(play, warp_was_s=["no number"]))
    assert path.read_bytes() == b"old"
    assert [item.name for item in tmp_path.iterdir()] == ["a.play"]


def test_a_play_file_that_is_not_there_is_said_so(tmp_path):
    with pytest.raises(Faults, match="no such file"):
        read_play(tmp_path / "none.play")
