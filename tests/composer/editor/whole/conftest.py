"""The whole compose window with its workers, once for all tests of it."""

import os

import pytest

from composer.editor.window import ComposeWindow

SCORE = """title "Bench"
rig bench.rig.toml
tempo 60

cue "turn" at 3:1

phrase lift 4
  1      full    linear
  3      rest

section one at 1:1
  r.1         lift
  r.2-4       lift   after 2

section two at 3:1
  r.*         lift   stretch 1/2
"""


@pytest.fixture(scope="package")
def home(tmp_path_factory):
    """A folder for the score, its rig and what the program keeps."""
    folder = tmp_path_factory.mktemp("compose")
    before = os.environ.get("DRAWCORD_STATE")
    os.environ["DRAWCORD_STATE"] = str(folder / "state")
    yield folder
    if before is None:
        os.environ.pop("DRAWCORD_STATE", None)
    else:
        os.environ["DRAWCORD_STATE"] = before


class Bench:
    """A window on a score, and the means to wait for it."""

    SCORE = SCORE

    def __init__(self, app, folder):
        self.app, self.folder = app, folder
        self.window = ComposeWindow()
        self.window.crew.warm()
        assert self.window.session.open(str(folder / "bench.score"))
        self.window.show()

    def until(self, holds, what, seconds=60):
        """Wait for something; say what did not come."""
        import time

        end = time.monotonic() + seconds
        while not holds():
            assert time.monotonic() < end, f"it did not come: {what}; {self.window.notices.said}"
            self.app.processEvents()
            time.sleep(0.005)

    def settled(self):
        """Wait until the text at hand is read, checked and retimed."""
        known, crew = self.window.showing.known, self.window.crew

        def done():
            newest = known.picture is not None and known.picture.version == crew.version
            return newest and known.checked is not None and known.retimed is not None

        self.until(done, "a picture, a check and a retiming of the text")

    def text(self, text):
        """Begin anew with a text."""
        self.window.session.put_text(text)
        self.settled()

    @property
    def known(self):
        return self.window.showing.known


@pytest.fixture(scope="package")
def bench(qapp, home, small_rig):
    (home / "bench.rig.toml").write_text(small_rig())
    (home / "bench.score").write_text(SCORE)
    one = Bench(qapp, home)
    one.settled()
    yield one
    one.window.pane.document().setModified(False)
    one.window.close()


@pytest.fixture(autouse=True)
def begun_anew(bench):
    """Every test begins with the score as it is in the file."""
    bench.text(SCORE)
    bench.window.pane.looks.light([])
