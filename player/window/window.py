"""The rehearse window: wires its parts to a run, and every key and button to what is asked of that run."""

from typing import Any

import numpy as np
from PySide6.QtCore import QEvent, QObject, QSize, Qt, QTimer
from PySide6.QtGui import QCloseEvent, QKeyEvent, QKeySequence, QResizeEvent
from PySide6.QtWidgets import QAbstractSpinBox, QApplication, QComboBox, QLineEdit, QWidget

from composer.picture import palette
from composer.picture.chrome import scale_of
from composer.picture.hang_camera import VIEWS
from composer.picture.showing_process import Beside
from player.engine.clock import SteadyClock
from player.engine.process.layout import Snapshot
from player.live.screen import meters_of
from player.window import words
from player.window.actions import ACTIONS, BY_KEY, Standing, fields_of, message_of, why_not_now, word_of
from player.window.building import Parts, build
from player.window.chrome import sheet_of
from player.window.count_in import count_in
from player.window.dimming import DIMS, SAID, dimmed
from player.window.foretelling import foretell
from player.window.link import Link
from player.window.next_view import Coming
from player.window.preflight_view import rows_of
from player.window.vent import VentKey
from player.window.ways import Material, Told, Ways, fits, groups_of_run

FRAME_MS = 28
SLOW_MS = 200
BLINK_MS = 500
HOLD_MS = 100
CONFIRMS_S = 0.5
MOST_LINES = 300
OPENS_AT = (1280, 800)
WRITTEN_IN = (QLineEdit, QAbstractSpinBox)

METERS, PREFLIGHT, TAKES, MAP = range(4)


class RehearseWindow(QWidget):
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
        self._unsent = self._held = self._drawn = False
        self._beside = Beside(self)
        self._beside.said.connect(self._foretold)
        self.parts: Parts = build(self)
        self.setWindowTitle("rehearse")
        self.setMinimumSize(1000, 640)
        application = QApplication.instance()
        assert isinstance(application, QApplication)
        self._vent_key = VentKey(application, self.vent, lambda: self.link.on)
        application.installEventFilter(self)
        self.link.came.connect(self._came)
        self.link.did_not_come.connect(self._did_not_come)
        self.link.heard.connect(self._heard)
        self.link.lost.connect(self._lost)
        self._frames = self._timer(FRAME_MS, self._frame)
        self._frames.setTimerType(Qt.TimerType.PreciseTimer)
        self._timer(SLOW_MS, self._slow)
        self._blink = self._timer(BLINK_MS, self._blinked)
        self._holding = self._timer(HOLD_MS, lambda: self.link.say("hold", down=True))
        self._holding.stop()
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

    # ---- to a run, and away from it

    def attach(self, run: str) -> None:
        """Attach to a run by name."""
        self._forget()
        self.link.make(lambda: self.ways.attach(run))

    def do_again(self) -> None:
        """Begin the run, or begin it once more."""
        if self.ways.begin is not None:
            self._forget()
            self.link.make(self.ways.begin)

    def _forget(self) -> None:
        self.told, self.stage, self.now = Told(lines=self.told.lines), "none", None
        self.wrong, self._vented_s, self._unsent = [], None, False
        self.show_panel(PREFLIGHT)
        self._renew_preflight()
        self._stand()

    def _came(self, material: Material) -> None:
        client = self.link.client
        assert client is not None
        about = client.about
        self.told.about, self.material = about, material
        self.stage = "before"
        self.setWindowTitle(f"{about['title']} - rehearse - {client.run}")
        parts = self.parts
        parts.title.setText(f"{about['title']}   to {' '.join(about['targets'])}")
        self._drawn = fits(material, about)
        note = material.note
        if self._drawn:
            parts.hang.set_rig(material.rig, material.abilities)
        elif not note:
            note = f"{about['rig']} is not the rig of this run any more: it is not drawn"
        parts.hang.setVisible(self._drawn)
        parts.not_drawn.setVisible(not self._drawn)
        parts.not_drawn.setText(note)
        if note:
            self.tell((note,))
        stroke = np.array(about["stroke"])
        parts.meters.set_rows(meters_of(groups_of_run(about, material), about["fibers"], stroke).rows, stroke)
        self._fill_from(about)
        parts.takes.set_run(about, material)
        parts.map.set_run(about, material)
        self.margins = []
        if self._drawn and material.tracks is not None:
            self._beside.start(
                foretell, material.tracks, material.rig, material.abilities, material.tempo, material.warp
            )  # fmt: skip
        self._renew_preflight()
        self.link.look()
        self._slow()

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
            self.tell((*before, *map(str, fields["lines"])))
        elif name == "refused":
            self.tell((fields["why"],))
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
            self.told.lines.append(line)
            log.addItem(line.replace("\n", " "))
        while log.count() > MOST_LINES:
            log.takeItem(0)
        log.scrollToBottom()

    # ---- what is asked of the run

    def vent(self) -> None:
        """VENT: said at once."""
        if not self.link.on:
            self.tell(("nothing is vented: no run is attached",))
            return
        self._unsent = not self.link.say("vent")
        self._vented_s = self._clock()

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
            fields = fields_of(asks, self.from_s if name in ("jump", "play") else 0.0)
            if not self.link.say(asks, **fields):
                self.tell((f"{ACTIONS[name].word} did not get out: the run does not take what is said to it",))
            elif asks in ("arm", "bring_back"):
                self.show_panel(METERS)

    @property
    def from_s(self) -> float:
        """The place chosen to play from, in s as played."""
        return float(self.parts.start.currentData() or 0.0)

    def do_view(self) -> None:
        """The next way of seeing the rig."""
        names = list(VIEWS)
        self.parts.hang.set_view(names[(names.index(self.parts.hang.view) + 1) % len(names)])

    def do_dim(self) -> None:
        """Less light, or full light again."""
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

    def hold(self, down: bool) -> None:
        """Hold-to-run goes down, and is said anew as long as it is, or up."""
        if down == self._held or (down and why_not_now("hold", self._standing)):
            return
        self._held = down
        self.link.say("hold", down=down)
        if down:
            self._holding.start()
        else:
            self._holding.stop()

    def read_map_anew(self) -> str:
        """Have the run take the map as it is saved now; what is to be said of it."""
        if not self.link.on or not why_is_not_live(self._standing):
            return ""
        return f"; {why_is_not_live(self._standing)}"

    # ---- what is seen

    def say_place(self, at_s: float) -> str:
        """An instant as played, as bar and count."""
        tempo = self.material.tempo
        return f"{at_s:.1f} s" if tempo is None else tempo.say_place(self.material.warp.was(at_s))

    def _frame(self) -> None:
        self.link.look()
        now = self.link.snapshot()
        if now is None or (self.now is not None and now.count == self.now.count and now.state == self.now.state):
            return
        before, self.now = self.now, now
        if before is None or before.state != now.state:
            self._stand()
        parts = self.parts
        if self._drawn:
            parts.hang.show_strain(np.nan_to_num(now.array("wanted")), now.array("sensed"))
        parts.meters.show_now(now)
        parts.next.show_coming(self._coming(now))
        place = now.text("place")
        whole = place.partition(".")[0] if now.state == "playing" else place
        _put(parts.place, f"bar {whole}" if ":" in whole else whole)
        self._show_state()

    def _coming(self, now: Snapshot) -> Coming:
        cue, at_s, waiting = now.text("next_cue"), now.number("next_cue_s"), now.text("waiting")
        if not self.told.about.get("duration_s"):
            return Coming(says="no score: the rig under the hands")
        if waiting:
            return Coming(says=f"waits at {waiting}")
        tempo, warp = self.material.tempo, self.material.warp
        if not cue or not np.isfinite(at_s):
            left = count_in(now.number("position_s"), now.number("duration_s"), tempo, warp)
            return Coming("the end", self.say_place(now.number("duration_s")), False, left)
        waits = any(name == cue and stays for name, _, stays in self.told.about["cues"])
        return Coming(cue, self.say_place(at_s), waits, count_in(now.number("position_s"), at_s, tempo, warp))

    def _show_state(self) -> None:
        now = self.now
        state, more = words.state_of(now, self.stage) if now is not None else ("NO RUN", "")
        if self.link.busy:
            state, more = "BEGINS", ""
        _put(self.parts.state, state)
        _put(self.parts.more, more)

    def _slow(self) -> None:
        """What need not be seen at once."""
        now, told = self.now, self.told
        if now is not None and self._known_stage(now) != self.stage:
            self.stage = self._known_stage(now)
            self._stand()
        if now is not None and told.about:
            self.parts.instruments.show_now(now, told.about, told.inputs, self._clock())
            self.parts.meters.setAccessibleDescription(self.parts.meters.describe())
        client = self.link.client
        who = ""
        if client is not None and self.link.on:
            who = "commands" if client.commands else "watches"
            who += f", {int(now.number('watching'))} attached" if now is not None else ""
        take = told.inputs.get("take", "")
        parts = [client.run if client is not None else "", who, words.rule_said(told.rule), take, SAID[DIMS[self._light]]]
        _put(self.parts.status, "     ".join(part for part in parts if part))
        self._show_state()
        self._show_banner()

    def _known_stage(self, now: Snapshot) -> str:
        """Before arming or running, as far as can be seen from outside; a window that comes later is told nothing of it."""
        if self.stage == "before" and (now.state in words.MOVES or now.number("ticks") > 0):
            return "running"
        return self.stage

    def _stand(self) -> None:
        """What can be done now: buttons say it, and why not."""
        client, about = self.link.client, self.told.about
        if self.now is not None:
            self.stage = self._known_stage(self.now)
        self._standing = Standing(
            stage=self.stage,
            state=self.now.state if self.now is not None else "idle",
            commands=client is not None and client.commands and self.link.on,
            taken=self.told.taken,
            marks=None if self.told.marks is None else bool(self.told.marks["ok"]),
            live=about.get("kind") == "live",
            takes=bool(about.get("takes")),
            holds=bool(about.get("hold_to_run")),
            scored=bool(about.get("duration_s")),
            again=self.ways.begin is not None,
        )
        for name, button in self.parts.deeds.items():
            why = why_not_now(name, self._standing)
            button.setEnabled(not why)
            button.setText(word_of(name, self._standing))
            says = why or ACTIONS[name].says
            button.setToolTip(f"{says} ({' or '.join(ACTIONS[name].keys)})")
            button.setAccessibleDescription(says)
        self.parts.deeds["hold"].setVisible(self._standing.holds)
        self.parts.deeds["command"].setVisible(not why_not_now("command", self._standing))
        self.parts.deeds["again"].setVisible(not why_not_now("again", self._standing))
        for name in ("record", "let_go"):
            self.parts.deeds[name].setVisible(self._standing.live)
        self._say_why()
        self._show_state()
        self._show_banner()

    def _say_why(self) -> None:
        now = self._standing
        why = ""
        if now.stage in ("before", "running") and not now.commands:
            why = why_not_now("play", now)
        elif now.stage == "before":
            why = why_not_now("arm", now) or "ready to arm: hold A, or the button, for one second"
        elif now.stage == "running" and now.state == "armed":
            why = "armed: Space plays"
        elif now.stage == "over":
            why = "the run is over" + ("; B begins again" if now.again else "")
        _put(self.parts.why, why)

    def _renew_preflight(self) -> None:
        marks = None if self.told.marks is None else self.told.marks["marks"]
        rig = self.material.rig
        told = words.cautions(rig) if rig is not None and self.stage != "none" else ()
        self.parts.preflight.show_rows(rows_of(marks, told, self.margins, self.wrong))

    def _foretold(self, sentences: object) -> None:
        if isinstance(sentences, list):
            self.margins = sentences
            self._renew_preflight()

    # ---- faults

    def banner(self) -> tuple[str, bool]:
        """What is wrong, said large, and whether it is a fault: "" where nothing is."""
        now, on = self.now, self.link.on
        if self.stage == "over" and self.told.last is None and self.link.client is not None:
            return words.GONE, True
        if self._unsent and on:
            return words.NOT_SENT, True
        if now is not None and on and now.state in words.MOVES and self._clock() - now.number("at_s") > words.STANDS_S:
            return words.STANDS, True
        waited = self._vented_s is not None and self._clock() - self._vented_s > CONFIRMS_S
        if waited and on and now is not None and now.state != "vented":
            return words.NOT_VENTED, True
        if self.wrong:
            return self.wrong[0], True
        if now is None:
            return "", False
        boards, bad = words.boards_said(self.told.about["boards"], now.texts("link")) if self.told.about else ("", False)
        last = next((line for line in reversed(self.told.lines) if line.strip()), "")
        if now.state == "vented":
            asked = self._vented_s is not None
            return f"VENTED{'' if asked else f': {last}'}" + (": hold A to arm and go on" if asked and on else ""), not asked
        if bad and on:
            return f"BOARDS: {boards}", True
        return "", False

    def _show_banner(self) -> None:
        text, fault = self.banner()
        banner = self.parts.banner
        if text != banner.text() or banner.property("calm") != (not fault):
            banner.setText(text)
            banner.setAccessibleDescription(text)
            banner.setProperty("calm", not fault)
            banner.setProperty("pale", False)
            _restyle(banner)
        banner.setVisible(bool(text))

    def _blinked(self) -> None:
        """A fault blinks, once a second; nothing else ever does."""
        banner = self.parts.banner
        if banner.isVisible() and not banner.property("calm"):
            banner.setProperty("pale", not banner.property("pale"))
            _restyle(banner)

    # ---- keys, sizes, the end

    def eventFilter(self, watched: QObject, event: QEvent) -> bool:
        """Keys of the table from wherever the focus is in this window, but not where somebody writes."""
        kind = event.type()
        if kind in (QEvent.Type.ApplicationDeactivate, QEvent.Type.WindowDeactivate) and watched in (
            self, QApplication.instance(),
        ):  # fmt: skip
            self._let_go_of_keys()
            return False
        if kind not in (QEvent.Type.KeyPress, QEvent.Type.KeyRelease) or not self._is_ours(watched):
            return False
        return self._key(event, kind == QEvent.Type.KeyPress)

    def _is_ours(self, watched: QObject) -> bool:
        if isinstance(watched, QWidget):
            return watched.window() is self
        return watched is self.windowHandle() and QApplication.activeWindow() in (self, None)

    def _key(self, event: QKeyEvent, down: bool) -> bool:
        focus = QApplication.focusWidget()
        if isinstance(focus, WRITTEN_IN) or QApplication.activePopupWidget() is not None:
            return False
        row = BY_KEY.get(name_of(event))
        if row is None or (row.name == "vent" and event.key() == Qt.Key.Key_Escape):
            return False
        if row.name == "go_on" and focus is not None and focus is not self and not isinstance(focus, QComboBox):
            # Enter presses the button, or takes the line, that has the focus.
            return False
        if event.isAutoRepeat():
            return True
        if row.held:
            self._held_key(row.name, down)
        elif down:
            self.do(row.name)
        return True

    def _held_key(self, name: str, down: bool) -> None:
        if name == "hold":
            self.hold(down)
        elif down:
            if why := why_not_now("arm", self._standing):
                self.parts.why.setText(f"{ACTIONS['arm'].word}: {why}")
            self.parts.arm.begin()
        else:
            self.parts.arm.end()

    def _let_go_of_keys(self) -> None:
        self.parts.arm.end()
        self.hold(False)

    def theme(self) -> palette.Theme:
        """The look in the light that is wanted."""
        return dimmed(palette.THEMES[self._theme_name], DIMS[self._light])

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
        parts.column.setFixedWidth(round(470 * self._scale))
        parts.log.setFixedHeight(round(92 * self._scale))

    def resizeEvent(self, event: QResizeEvent) -> None:
        """Everything grows with the window."""
        if scale_of(self.width(), self.height()) != self._scale:
            self._wear()

    def closeEvent(self, event: QCloseEvent) -> None:
        """The run goes by its rule."""
        for timer in (self._frames, self._blink, self._holding):
            timer.stop()
        self._beside.stop()
        self.parts.map.close_ports()
        self.parts.takes.stop()
        self.link.leave()
        self._vent_key.remove()
        QApplication.instance().removeEventFilter(self)
        super().closeEvent(event)


def name_of(event: QKeyEvent) -> str:
    """A key as the table of actions writes it; keypad and shift make no other key of it."""
    held = event.modifiers() & ~(Qt.KeyboardModifier.KeypadModifier | Qt.KeyboardModifier.ShiftModifier)
    text = QKeySequence(held.value | event.key()).toString(QKeySequence.SequenceFormat.PortableText)
    return {"Esc": "Escape"}.get(text, text)


def why_is_not_live(now: Standing) -> str:
    """Why a map that was saved is not what the run goes by yet."""
    return "the run goes by it from its next beginning on" if now.stage in ("before", "running") else ""


def _put(label, text: str) -> None:
    if label.text() != text:
        label.setText(text)


def _restyle(widget: QWidget) -> None:
    widget.style().unpolish(widget)
    widget.style().polish(widget)
