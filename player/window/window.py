"""The rehearse window: wires its parts to a run, and every key and button to what is asked of that run."""

import gc
from typing import Any

import numpy as np
from PySide6.QtCore import QSize, Qt, QTimer
from PySide6.QtGui import QCloseEvent, QMouseEvent, QResizeEvent
from PySide6.QtWidgets import QApplication

from composer.picture import palette
from composer.picture.chrome import scale_of
from composer.picture.hang.camera import VIEWS
from composer.picture.preview.beside import Beside
from player.engine.clock import SteadyClock
from player.engine.process.layout import Snapshot
from player.live.screen import meters_of
from player.window import words
from player.window.actions import ACTIONS, Standing, fields_of, message_of, why_not_now
from player.window.alarming import Alarming
from player.window.building import Parts, build
from player.window.chrome import sheet_of
from player.window.dimming import DIMS, dimmed
from player.window.foretelling import foretell
from player.window.keyed import WRITTEN_IN, Keyed
from player.window.link import Link
from player.window.parted import MAP, METERS, PREFLIGHT, TAKES
from player.window.seeing import Seeing
from player.window.vent import VentKey
from player.window.ways import Material, Told, Ways, fits, groups_of_run

SLOW_MS = 200
BLINK_MS = 500
HOLD_MS = 100
HERE_MS = 500
MOST_LINES = 300
OPENS_AT = (1280, 800)


class RehearseWindow(Keyed, Alarming, Seeing):
    """A window for a run. `ways`: how to come to one; `first`: the run to attach to, "" to begin one."""

    def __init__(self, ways: Ways, first: str = ""):
        super().__init__()
        self.ways = ways
        self.link = Link(self)
        self.told, self.material, self.stage = Told(), Material(), "none"
        self.now: Snapshot | None = None
        self.margins: list[str] = []
        self.wrong: list[str] = []
        self._standing = Standing()
        self._light, self._theme_name, self._scale = 0, "dark", 0.0
        self._clock = SteadyClock().now
        self._vented_s: float | None = None
        self._unsent = self._rested = self._held = self._drawn = self._behind = False
        self._beside = Beside(self)
        self._beside.said.connect(self._foretold)
        self.parts: Parts = build(self)
        self.setWindowTitle("rehearse")
        self.setMinimumSize(1000, 640)
        # Else the first button would have it, and Enter would press that.
        self.setFocusPolicy(Qt.FocusPolicy.StrongFocus)
        self.setFocus()
        application = QApplication.instance()
        assert isinstance(application, QApplication)
        self._vent_key = VentKey(application, self.vent, lambda: self.link.on)
        application.installEventFilter(self)
        self.link.came.connect(self._came)
        self.link.known.connect(self._known)
        self.link.did_not_come.connect(self._did_not_come)
        self.link.heard.connect(self._heard)
        self.link.lost.connect(self._lost)
        self._frames = self._timer(0, self._frame)
        self._frames.setSingleShot(True)
        self._frames.setTimerType(Qt.TimerType.PreciseTimer)
        self._timer(SLOW_MS, self._slow)
        self._blink = self._timer(BLINK_MS, self._blinked)
        # So that a window that stands still leaves the run to its rule as one that is closed does.
        self._timer(HERE_MS, lambda: self.link.say("here"))
        self._holding = self._timer(HOLD_MS, lambda: self.link.say("hold", down=True))
        self._holding.stop()
        self._letting_go = self._timer(0, self._let_go)
        self._letting_go.stop()
        self._letting_go.setSingleShot(True)
        self._wear()
        self._stand()
        if first:
            self.attach(first)
        elif ways.begin is not None:
            self.do_again()

    def _timer(self, ms: int, does) -> QTimer:
        timer = QTimer(self)
        timer.setInterval(ms)
        timer.timeout.connect(does)
        timer.start()
        return timer

    def sizeHint(self) -> QSize:
        """The size to open with."""
        return QSize(*OPENS_AT)

    def attach(self, run: str) -> None:
        """Attach to a run by name."""
        self._forget()
        self.link.make(lambda: self.ways.attach(run))
        self._stand()

    def do_again(self) -> None:
        """Begin the run, or begin it once more."""
        if self.ways.begin is not None:
            self._forget()
            self.link.make(self.ways.begin)
            self._stand()

    def _forget(self) -> None:
        self.told, self.stage, self.now = Told(lines=self.told.lines), "none", None
        self.wrong, self._vented_s, self._unsent, self._rested = [], None, False, False
        self.show_panel(PREFLIGHT)
        self._renew_preflight()
        self._stand()

    def _came(self) -> None:
        client = self.link.client
        assert client is not None
        about = client.about
        self.told.about, self.material = about, Material()
        self.stage, self._drawn, self.margins = "before", False, []
        self.setWindowTitle(f"{about['title']} - rehearse - {client.run}")
        self.parts.title.setText(f"{about['title']}   to {' '.join(about['targets'])}")
        self._not_drawn("the files of the run are read ...")
        self._set_rows()
        self.parts.takes.set_run(about, self.material)
        self.parts.map.set_run(about, self.material)
        self._fill_from(about)
        self.link.look()
        self._renew_preflight()
        self._stand()

    def _known(self, material: Material) -> None:
        """What the run plays has been read."""
        about, parts = self.told.about, self.parts
        self.material = material
        # What was read stays: to look through all of it for what is of no use any more would keep keys waiting.
        gc.freeze()
        self._drawn = fits(material, about)
        note = material.note
        if self._drawn:
            parts.hang.set_rig(material.rig, material.abilities)
            self._not_drawn("")
            # The picture comes with the next moment, whether anything moves or not.
            self._behind = True
        else:
            note = note or f"{about['rig']} is not the rig of this run any more: it is not drawn"
            self._not_drawn(note)
        if note:
            self.tell((note,))
        self._set_rows()
        self._fill_from(about)
        parts.takes.set_run(about, material)
        parts.map.set_run(about, material)
        if self._drawn and material.tracks is not None:
            self._beside.start(
                foretell, material.tracks, material.rig, material.abilities, material.tempo, material.warp
            )  # fmt: skip
        self._renew_preflight()

    def _not_drawn(self, why: str) -> None:
        self.parts.hang.setVisible(not why)
        self.parts.not_drawn.setVisible(bool(why))
        self.parts.not_drawn.setText(why)

    def _set_rows(self) -> None:
        about = self.told.about
        stroke = np.array(about["stroke"])
        self.parts.meters.set_rows(meters_of(groups_of_run(about, self.material), about["fibers"], stroke).rows, stroke)

    def _fill_from(self, about: dict[str, Any]) -> None:
        box = self.parts.start
        box.clear()
        box.addItem("the start", 0.0)
        if self.ways.from_s > 0.0:
            box.addItem(f"as asked, {self.say_place(self.ways.from_s)}", self.ways.from_s)
            box.setCurrentIndex(1)
        for name, at_s, waits in about["cues"]:
            box.addItem(f"{name}, {self.say_place(at_s)}" + (" (waits)" if waits else ""), at_s)

    def _did_not_come(self, why: str) -> None:
        self.stage = "none"
        self.wrong = why.splitlines() or ["no run came about"]
        self.tell(tuple(self.wrong))
        self._renew_preflight()
        self._stand()

    def _lost(self) -> None:
        self.stage = "over"
        self.tell((words.GONE,))
        self._stand()

    def _heard(self, name: str, fields: dict[str, Any]) -> None:
        told = self.told
        if name == "told":
            missed = int(fields["missed"])
            before = (f"... {missed} lines that did not get here",) if missed else ()
            lines = tuple(map(str, fields["lines"]))
            told.since += lines
            self.tell((*before, *lines))
        elif name == "refused":
            self.tell(
                (f"the map is saved, but not gone by yet: {fields['why']}" if fields["what"] == "map" else fields["why"],)
            )
        elif name == "marks":
            told.marks = fields
            if fields["ok"]:
                self.wrong = []
            self._renew_preflight()
        elif name == "command":
            told.rule, told.taken = fields["rule"], fields["taken"]
        elif name == "inputs":
            told.inputs = fields
            self.parts.takes.heard(fields.get("take", ""))
        elif name in ("ended", "failed"):
            told.last, self.stage = (name, fields), "over"
            lines = [str(line) for line in fields["lines"]]
            self.tell(tuple(lines))
            if name == "failed":
                self.wrong = lines
                self._renew_preflight()
            self.parts.takes.ended()
        self._stand()

    def tell(self, lines: tuple[str, ...]) -> None:
        """Lines for the log."""
        log = self.parts.log
        for line in lines:
            line = words.reworded(line)
            self.told.lines.append(line)
            log.addItem(line.replace("\n", " "))
        while log.count() > MOST_LINES:
            log.takeItem(0)
        log.scrollToBottom()

    def vent(self) -> None:
        """VENT: said at once."""
        if not self.link.on:
            self.tell(("nothing is vented: no run is attached",))
            return
        self._unsent = not self.link.say("vent")
        self._vented_s = self._clock()
        if isinstance(self.focusWidget(), WRITTEN_IN):
            # What comes next is not to be written into a field.
            self.setFocus()

    def do(self, name: str) -> None:
        """Do what a key or a button asks for, or say why not."""
        own = getattr(self, f"do_{name}", None)
        why = why_not_now(name, self._standing)
        if name == "vent":
            self.vent()
        elif why:
            self.parts.why.setText(f"{ACTIONS[name].word}: {why}")
        elif own is not None:
            own()
        else:
            asks = message_of(name, self._standing)
            fields = fields_of(asks, self.from_s if name == "jump" else self._first_s)
            if not self.link.say(asks, **fields):
                self.tell((f"{ACTIONS[name].word} did not get out: the run does not take what is said to it",))
            elif asks == "rest":
                self._rested = True
            elif asks in ("arm", "bring_back"):
                self.show_panel(METERS)

    @property
    def from_s(self) -> float:
        """The place chosen to play from, in s as played."""
        return float(self.parts.start.currentData() or 0.0)

    @property
    def _first_s(self) -> float:
        """Where a run begins to be played that has been armed: the place asked for, or the start."""
        return self.ways.from_s if self._standing.state in ("idle", "armed") else 0.0

    def do_view(self) -> None:
        """The next way of seeing the rig."""
        names = list(VIEWS)
        self.parts.hang.set_view(names[(names.index(self.parts.hang.view) + 1) % len(names)])

    def do_dim(self) -> None:
        """Less light, or full light again."""
        if self._theme_name == "light":
            self._theme_name, self._light = "dark", 0
        else:
            self._light = (self._light + 1) % len(DIMS)
        self._wear()

    def do_theme(self) -> None:
        """The other look."""
        self._theme_name = "light" if self._theme_name == "dark" else "dark"
        self._wear()

    def do_keys(self) -> None:
        """The sheet of keys."""
        from player.window.sheet import KeySheet

        KeySheet(self).show()

    def do_close(self) -> None:
        """Close the window."""
        self.close()

    def show_panel(self, which: int) -> None:
        """Meters, pre-flight, takes or map."""
        self.parts.stack.setCurrentIndex(which)
        for number, button in enumerate(self.parts.tabs):
            button.setChecked(number == which)
        self._show_next()

    def do_panel_1(self) -> None:
        """Meters."""
        self.show_panel(METERS)

    def do_panel_2(self) -> None:
        """Pre-flight."""
        self.show_panel(PREFLIGHT)

    def do_panel_3(self) -> None:
        """Takes."""
        self.show_panel(TAKES)

    def do_panel_4(self) -> None:
        """The map."""
        self.show_panel(MAP)

    def read_map_anew(self) -> None:
        """Have the run go by the map as it is saved now; where it does not, it says why."""
        if self._standing.live and self._standing.commands:
            self.link.say("map")

    def theme(self) -> palette.Theme:
        """The look in the light that is wanted."""
        return palette.LIGHT if self._theme_name == "light" else dimmed(palette.DARK, DIMS[self._light])

    def _wear(self) -> None:
        theme = self.theme()
        self._scale = scale_of(self.width(), self.height())
        self.setStyleSheet(sheet_of(theme, self._scale))
        parts = self.parts
        parts.hang.set_theme(theme)
        parts.next.set_theme(theme, self._scale)
        parts.meters.set_theme(theme)
        parts.preflight.set_theme(theme)
        parts.arm.theme = theme
        parts.map.set_theme(theme)
        edge = round(4 * self._scale)
        self.layout().setContentsMargins(edge, edge, edge, edge)
        self.layout().setSpacing(edge)
        parts.column.setFixedWidth(round(470 * self._scale))
        parts.log.setFixedHeight(round(70 * self._scale))

    def resizeEvent(self, event: QResizeEvent) -> None:
        """Everything grows with the window."""
        if scale_of(self.width(), self.height()) != self._scale:
            self._wear()
        if self.parts.banner.isVisible():
            self._place_banner()

    def mousePressEvent(self, event: QMouseEvent) -> None:
        """A click beside everything takes the keys back from a field."""
        self.setFocus()

    def closeEvent(self, event: QCloseEvent) -> None:
        """The run goes by its rule."""
        for timer in (self._frames, self._blink, self._holding):
            timer.stop()
        self._beside.stop()
        self.parts.map.close_ports()
        self.parts.takes.stop()
        self.parts.hang.end()
        self.link.leave()
        self._vent_key.remove()
        QApplication.instance().removeEventFilter(self)
        super().closeEvent(event)
