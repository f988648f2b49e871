"""Movies, decoded by an independent library and held against screenshots of the same instants."""

import av
import numpy as np
import pytest

from composer.faults import Faults
from composer.picture.film import movie_file
from composer.picture.film.movie import Film, Take, plan_of, simulated
from composer.picture.film.movie_file import EncoderFailedError, write_movie
from composer.picture.film.movie_form import form_of

TAKE = Take(1.0, 5.0, 10.0, 480, 270)


@pytest.fixture
def film(make_piece):
    piece = make_piece()
    return Film(piece, TAKE, simulated(piece, TAKE, 100.0))


def pixels(picture):
    """An image of Qt as (height, width, 3)."""
    height, width = picture.height(), picture.width()
    return np.frombuffer(picture.constBits(), np.uint8).reshape(height, width, 4)[:, :, 2::-1].astype(int)


def decoded(path):
    with av.open(str(path)) as container:
        return [frame.to_ndarray(format="rgb24").astype(int) for frame in container.decode(video=0)]


def test_a_take_has_a_frame_for_every_instant_up_to_its_end():
    assert TAKE.frames == 41
    assert TAKE.time_s(40) == pytest.approx(5.0)
    assert Take(0.0, 1.04, 10.0, 480, 270).frames == 11


@pytest.mark.parametrize(("ending", "apart"), [("mp4", 6.0), ("gif", 4.0)])
def test_frames_decoded_elsewhere_are_the_screenshots_of_the_same_instants(film, tmp_path, ending, apart):
    path = tmp_path / f"out.{ending}"
    write_movie(str(path), film)
    found = decoded(path)
    assert len(found) == 41
    for number in (0, 12, 25, 40):
        shot = pixels(film.frame(number))
        near = np.abs(found[number] - shot).mean()
        assert near < apart
        others = [np.abs(found[number] - pixels(film.frame(other))).mean() for other in (5, 18, 33)]
        assert near < min(others)


def test_a_movie_lasts_as_long_as_its_take(film, tmp_path):
    write_movie(str(tmp_path / "out.mp4"), film)
    with av.open(str(tmp_path / "out.mp4")) as container:
        stream = container.streams.video[0]
        assert float(stream.average_rate) == pytest.approx(10.0)
        assert float(stream.duration * stream.time_base) == pytest.approx(4.1, abs=0.01)
        assert (stream.codec_context.width, stream.codec_context.height) == (480, 270)
        assert stream.codec_context.name == "h264"


def test_a_frame_is_the_same_whatever_was_drawn_before_it(film, make_piece):
    piece = make_piece()
    once = pixels(Film(piece, TAKE, simulated(piece, TAKE, 100.0)).frame(20))
    for number in (40, 0, 33):
        film.frame(number)
    assert (pixels(film.frame(20)) == once).all()


def test_what_a_movie_shows_is_what_the_whole_run_would_show(make_piece):
    piece = make_piece()
    late = simulated(piece, Take(4.0, 5.0, 10.0, 480, 270), 100.0)
    whole = simulated(piece, Take(0.0, 8.0, 10.0, 480, 270), 100.0)
    assert late.frames == pytest.approx(whole.frames[:, 40:51], abs=1e-6)


def test_the_play_head_goes_from_the_cloths_left_to_its_right(film):
    box = plan_of(TAKE).cloth

    def head(number):
        row = pixels(film.frame(number))[box.bottom() + 1, :].sum(axis=1)
        return int(np.argmax(row))

    assert head(0) == pytest.approx(box.left(), abs=2)
    assert head(20) == pytest.approx(box.left() + box.width() / 2, abs=2)
    assert head(40) == pytest.approx(box.left() + box.width(), abs=2)


def test_a_film_that_is_stopped_leaves_no_file_and_an_older_one_as_it_was(film, tmp_path):
    path = tmp_path / "out.mp4"
    path.write_bytes(b"older")

    def stop(frame):
        if frame == 7:
            raise KeyboardInterrupt

    with pytest.raises(KeyboardInterrupt):
        write_movie(str(path), film, stop)
    assert path.read_bytes() == b"older"
    assert [file.name for file in tmp_path.iterdir()] == ["out.mp4"]


def test_an_encoder_that_fails_says_why_and_leaves_no_file(film, tmp_path, monkeypatch):
    script = tmp_path / "encoder"
    script.write_text("#!/bin/sh\necho no room in here >&2\nexit 3\n")
    script.chmod(0o755)
    monkeypatch.setattr(movie_file, "encoder", lambda: str(script))
    with pytest.raises(EncoderFailedError, match="no room in here"):
        write_movie(str(tmp_path / "out.mp4"), film)
    assert [file.name for file in tmp_path.iterdir()] == ["encoder"]


def test_no_movie_goes_into_a_device(film, tmp_path):
    link = tmp_path / "out.mp4"
    link.symlink_to("/dev/null")
    with pytest.raises(Faults, match="device or a pipe"):
        write_movie(str(link), film)


def test_the_ending_says_the_form_in_any_case():
    assert form_of("a/B.MP4") == ".mp4"
    assert form_of("b.gif") == ".gif"
    assert form_of("b.mp4.txt") is None


@pytest.mark.parametrize("size", [(320, 240), (1280, 720), (3840, 2160)])
def test_everything_in_a_frame_has_room_at_every_size(size):
    plan = plan_of(Take(0.0, 1.0, 30.0, *size))
    assert plan.head.bottom() < plan.hang.bottom() < plan.bars.bottom() < plan.cloth.bottom() < size[1]
    assert plan.hang.height() > size[1] / 3
