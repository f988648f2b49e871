"""What the window shows of a run, moment by moment, and which of its buttons mean something now."""

import numpy as np
from PySide6.QtCore import QElapsedTimer
from PySide6.QtWidgets import QAbstractButton

from player.engine.process.layout import Snapshot
from player.engine.process.messages import DISARMED
from player.window import words
from player.window.actions import ACTIONS, Standing, why_not_now, word_of, words_of
from player.window.count_in import count_in
from player.window.dimming import DIMS, SAID
from player.window.next_view import Coming
from player.window.parted import METERS, PREFLIGHT, Parted, put
from player.window.preflight_view import rows_of

FRAME_MS = 28


class Seeing(Parted):
    """From snapshots and what was told to the parts of the window."""

    def say_place(self, at_s: float) -> str:
        """An instant as played, as bar and count."""
        tempo = self.material.tempo
        return f"{at_s:.1f} s" if tempo is None else tempo.say_place(self.material.warp.was(at_s))

    def _frame(self) -> None:
        """The next moment; then the time until the one after, which leaves some of this thread's to keys."""
        clock = QElapsedTimer()
        clock.start()
        self._draw()
        spent = clock.nsecsElapsed() / 1e6
        self._frames.start(round(max(FRAME_MS - spent, 6.0)))

    def _draw(self) -> None:
        self.link.look()
        now = self.link.snapshot()
        if now is None:
            return
        if not self._behind and self.now is not None and now.count == self.now.count and now.state == self.now.state:
            return
        self._behind = False
        before, self.now = self.now, now
        if before is not None and before.state == "vented" and now.state != "vented":
            # That vent is done with.
            self._vented_s, self._unsent = None, False
        if before is not None and before.state in DISARMED and now.state not in DISARMED:
            self._rested = False
            self.told.since.clear()
        if before is None or before.state != now.state:
            self._stand()
        parts = self.parts
        if self._drawn:
            sensed = now.array("sensed")
            # Where boards are disarmed nothing is wanted, whatever was last.
            wanted = sensed if now.state in DISARMED else now.array("wanted")
            parts.hang.show_strain(np.nan_to_num(wanted), sensed)
        parts.meters.show_now(now)
        parts.next.show_coming(self._coming(now))
        place = now.text("place")
        whole = place.partition(".")[0] if now.state == "playing" else place
        put(parts.place, f"bar {whole}" if ":" in whole else whole)
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
            state, more = "COMES …", "the run is begun, or attached to"
        put(self.parts.state, state)
        put(self.parts.more, more)
        # Else the line begins with a gap.
        self.parts.more.setVisible(bool(more))

    def _slow(self) -> None:
        """What need not be seen at once."""
        now, told = self.now, self.told
        if now is not None and self._known_stage(now) != self.stage:
            self.stage = self._known_stage(now)
            self._stand()
        if now is not None and told.about:
            self.parts.instruments.show_now(now, told.about, told.inputs, self._clock(), self.is_gone)
            self.parts.meters.setAccessibleDescription(self.parts.meters.describe())
        client = self.link.client
        who = ""
        if client is not None and self.link.on:
            who = "commands" if client.commands else "watches"
            who += f", {int(now.number('watching'))} attached" if now is not None else ""
        take = told.inputs.get("take", "")
        parts = [client.run if client is not None else "", who, words.rule_said(told.rule), take, self._light_said()]
        put(self.parts.status, "     ".join(part for part in parts if part))
        self._show_state()
        self._show_banner()

    def _light_said(self) -> str:
        """How much light the window gives."""
        return "light look" if self._theme_name == "light" else SAID[DIMS[self._light]]

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
            again=self.ways.begin is not None and not self.link.busy,
        )
        for name, button in self.parts.deeds.items():
            why = why_not_now(name, self._standing)
            button.setEnabled(not why)
            _wide_enough(button, words_of(name))
            button.setText(word_of(name, self._standing))
            says = why or ACTIONS[name].says
            keys = " or ".join(ACTIONS[name].keys)
            button.setToolTip(f"{says} ({keys})" if keys else says)
            button.setAccessibleDescription(says)
        self.parts.deeds["hold"].setVisible(self._standing.holds)
        self.parts.deeds["command"].setVisible(not why_not_now("command", self._standing))
        self.parts.deeds["again"].setVisible(not why_not_now("again", self._standing))
        self.parts.deeds["preflight"].setVisible(not why_not_now("preflight", self._standing))
        for name in ("record", "let_go"):
            self.parts.deeds[name].setVisible(self._standing.live)
        self._say_why()
        self._show_next()
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
        elif now.stage == "running" and not why_not_now("arm", now):
            why = "disarmed: hold A, or the button, for one second to arm and go on"
        elif now.stage == "over":
            why = "the run is over" + ("; B begins again" if now.again else "")
        put(self.parts.why, why)

    def _show_next(self) -> None:
        """What comes next gives its room to a long list as long as nothing comes; instruments to takes and map."""
        panel = self.parts.stack.currentIndex()
        self.parts.next.setVisible(self.stage == "running" or panel == METERS)
        self.parts.instruments.setVisible(panel in (METERS, PREFLIGHT))

    def _renew_preflight(self) -> None:
        marks = None if self.told.marks is None else self.told.marks["marks"]
        rig = self.material.rig
        told = words.cautions(rig) if rig is not None and self.stage != "none" else ()
        self.parts.preflight.show_rows(rows_of(marks, told, self.margins, self.wrong))

    def _foretold(self, told: object) -> None:
        if isinstance(told, list):
            self.margins = told
        elif isinstance(told, float) and self.stage != "none":
            self.margins = [f"tonight's run is simulated, {100.0 * told:.0f} % done …"]
        self._renew_preflight()


def _wide_enough(button: QAbstractButton, words: tuple[str, ...]) -> None:
    """As wide as its widest word, in the font that it has just now."""
    if len(words) < 2:
        return
    metrics, shown = button.fontMetrics(), button.text()
    spare = button.sizeHint().width() - metrics.horizontalAdvance(shown)
    button.setMinimumWidth(spare + max(metrics.horizontalAdvance(word) for word in words))
