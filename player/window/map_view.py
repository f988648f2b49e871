"""Which control does what: binds listed, their curves drawn and changed; one is bound by moving it and clicking a group."""

from typing import Any

from PySide6.QtCore import Qt, QTimer
from PySide6.QtWidgets import (
    QComboBox,
    QDoubleSpinBox,
    QHBoxLayout,
    QLabel,
    QListWidget,
    QPushButton,
    QVBoxLayout,
    QWidget,
)

from composer.faults import Faults
from composer.picture.palette import Theme
from player.engine.clock import SteadyClock
from player.inputs.learn import Learner
from player.inputs.midi_ports import MidiPorts
from player.inputs.model import NO_MAP, Bind, Control, Does, Map, Play, Stroke
from player.inputs.schema import CURVES
from player.window import disk
from player.window.curve_view import CurveView
from player.window.ways import Material

POLL_MS = 15
MOVE = "Move a control, or press its key …"
NO_MIDI = "controls are heard only with --midi PORT"
NO_MAP_GIVEN = "binds are kept in a map file: begin with --map NAME.map.toml"


class MapView(QWidget):
    """The panel of the map. `window`: its `tell`, `show_panel`, and `read_map_anew`."""

    def __init__(self, window):
        super().__init__()
        self._window = window
        self._material = Material()
        self._about: dict[str, Any] = {}
        self.map: Map = NO_MAP
        self._ports: MidiPorts | None = None
        self._learner: Learner | None = None
        self.control: Control | None = None
        self._filling = False
        self._poll = QTimer(self)
        self._poll.setInterval(POLL_MS)
        self._poll.timeout.connect(self._hear)
        self.list = QListWidget()
        self.list.setAccessibleName("binds")
        self.list.setWordWrap(True)
        self.list.setHorizontalScrollBarPolicy(Qt.ScrollBarPolicy.ScrollBarAlwaysOff)
        self.list.setFocusPolicy(Qt.FocusPolicy.TabFocus)
        self.list.currentRowChanged.connect(self._chosen)
        self.curve_view = CurveView()
        self.learn = QPushButton("Bind a control")
        self.learn.setAccessibleName("Bind a control")
        self.learn.setCheckable(True)
        self.learn.setFocusPolicy(Qt.FocusPolicy.TabFocus)
        self.learn.clicked.connect(self._learn)
        self.curve = QComboBox()
        self.curve.setAccessibleName("curve")
        self.curve.setFocusPolicy(Qt.FocusPolicy.TabFocus)
        for name, curve in CURVES.items():
            self.curve.addItem(name)
            self.curve.setItemData(self.curve.count() - 1, curve.says, Qt.ItemDataRole.ToolTipRole)
        self.curve.currentTextChanged.connect(lambda name: self._change("curve", f'"{name}"'))
        self.low, self.high = self._share("from", "low"), self._share("to", "high")
        self.says = QLabel()
        self.says.setWordWrap(True)
        self.says.setObjectName("value")
        self.says.setTextFormat(Qt.TextFormat.PlainText)
        self.says.setAccessibleName("about the map")
        self.says.setAlignment(Qt.AlignmentFlag.AlignLeft | Qt.AlignmentFlag.AlignTop)
        row = QHBoxLayout()
        row.addWidget(self.learn)
        row.addStretch(1)
        for each in (self.curve, self.low, self.high):
            row.addWidget(each)
        whole = QVBoxLayout(self)
        whole.setContentsMargins(0, 0, 0, 0)
        whole.addWidget(self.list, 2)
        whole.addWidget(self.curve_view, 1)
        whole.addLayout(row)
        whole.addWidget(self.says)
        self._stand()

    def _share(self, word: str, key: str) -> QDoubleSpinBox:
        box = QDoubleSpinBox()
        box.setRange(0.0, 100.0)
        box.setDecimals(0)
        box.setSingleStep(5.0)
        box.setPrefix(f"{word} ")
        box.setSuffix(" %")
        box.setKeyboardTracking(False)
        box.setAccessibleName(f"{key}, per cent of the stroke")
        box.setFocusPolicy(Qt.FocusPolicy.StrongFocus)
        box.lineEdit().returnPressed.connect(self._window.setFocus)
        box.valueChanged.connect(lambda value: self._change(key, f"{value / 100.0:g}"))
        return box

    def set_theme(self, theme: Theme) -> None:
        """Draw in these colours."""
        self.curve_view.set_theme(theme)
        # Room for three lines: what is above is pressed, and must not move as the text grows.
        self.says.ensurePolished()
        self.says.setFixedHeight(3 * self.says.fontMetrics().lineSpacing() + 4)

    def set_run(self, about: dict[str, Any], material: Material) -> None:
        """Another run: its map, as it stands in the file now."""
        self.leave()
        self._about, self._material = about, material
        self.map = NO_MAP
        if material.map_path and material.rig is not None:
            try:
                self.map = disk.map_at(material.map_path, material.rig, material.score)
            except Faults as wrong:
                self._say(str(wrong))
        self._fill(-1)

    def _fill(self, row: int) -> None:
        self._filling = True
        self.list.clear()
        for bind in self.map.binds:
            self.list.addItem(said_of(bind, self._named))
        self.list.setCurrentRow(row)
        self._filling = False
        self._chosen(row)
        self._stand()

    def _named(self, fibers: tuple[int, ...]) -> str:
        """Fibers of a bind, as a group where they are one."""
        rig = self._material.rig
        assert rig is not None
        group = next((name for name, of in rig.groups.items() if tuple(sorted(of)) == tuple(sorted(fibers))), None)
        first = rig.fibers[fibers[0]].name
        return group or (first if len(fibers) == 1 else f"{first} and {len(fibers) - 1} more")

    def _stand(self) -> None:
        why = ""
        if self._about:
            why = "" if self._material.map_path else NO_MAP_GIVEN
            why = why or ("" if self._about.get("midi") else NO_MIDI)
        self.learn.setEnabled(bool(self._about) and not why)
        self.learn.setToolTip(why or "move a control, then click a group's meter or a fiber")
        if why or self.says.text() in (NO_MAP_GIVEN, NO_MIDI):
            self.says.setText(why)
        stroke = self._stroke()
        for each in (self.curve, self.low, self.high):
            each.setEnabled(stroke is not None)

    def _stroke(self) -> Stroke | None:
        row = self.list.currentRow()
        deed = self.map.binds[row].deed if 0 <= row < len(self.map.binds) else None
        return deed if isinstance(deed, Stroke) else None

    def _chosen(self, row: int) -> None:
        stroke = self._stroke()
        self.curve_view.show_stroke(stroke)
        self._filling = True
        if stroke is not None:
            self.curve.setCurrentText(stroke.curve)
            self.low.setValue(100.0 * stroke.low)
            self.high.setValue(100.0 * stroke.high)
        self._filling = False
        self._stand()

    def _change(self, key: str, value: str) -> None:
        row, rig = self.list.currentRow(), self._material.rig
        if self._filling or self._stroke() is None or rig is None:
            return
        path = self._material.map_path
        try:
            self.map = disk.change(path, row, {key: value}, rig, self._material.score)
        except Faults as wrong:
            self._say(str(wrong))
            self._chosen(row)
            return
        self.curve_view.show_stroke(self._stroke())
        self.list.item(row).setText(said_of(self.map.binds[row], self._named))
        self._saved(f"{key} = {value} in line {self.map.binds[row].line} and below")

    # ---- a control bound by moving it

    def _learn(self, on: bool) -> None:
        if not on:
            self.leave()
            self.says.setText("left as it was")
            return
        try:
            if self._ports is None:
                self._ports = MidiPorts(SteadyClock().now, tuple(self._about["midi"]))
        except (Faults, OSError) as wrong:
            self.learn.setChecked(False)
            self._say(str(wrong))
            return
        self._learner, self.control = Learner(), None
        self._poll.start()
        self.says.setText(MOVE)

    def _hear(self) -> None:
        if self._ports is None or self._learner is None or self.control is not None:
            return
        for heard in self._ports.poll()[0]:
            control = self._learner.hear(heard.message)
            if control is not None:
                self.heard(control)
                return

    def heard(self, control: Control) -> None:
        """This control is the one: now the group is to be clicked."""
        self.control = control
        self._poll.stop()
        text = f"{control_said(control)}: now click a group's meter, or a fiber in the picture"
        self.says.setText(text)
        self._window.parts.why.setText(text)
        self._window.show_panel(0)

    def group_clicked(self, name: str) -> None:
        """A group's meter was clicked: where a control waits for it, they are bound."""
        if self.control is not None:
            self._bind(self.control, name)

    def fiber_clicked(self, fiber: int) -> None:
        """The same with a fiber."""
        if self.control is not None and self._material.rig is not None:
            self._bind(self.control, self._material.rig.fibers[fiber].name)

    def _bind(self, control: Control, fibers: str) -> None:
        rig, path = self._material.rig, self._material.map_path
        assert rig is not None
        self.leave()
        self._window.show_panel(3)
        try:
            self.map, row = disk.bind(path, control, fibers, rig, self._material.score)
        except Faults as wrong:
            self._say(str(wrong))
            return
        self._fill(row)
        self._saved(f"{control_said(control)} moves {fibers}")

    def _saved(self, what: str) -> None:
        self._say(f"{self._material.map_path}: {what}, saved")
        self._window.read_map_anew()

    def _say(self, text: str) -> None:
        self.says.setText(text)
        self._window.tell((text,))

    def leave(self) -> None:
        """No control is waited for any more."""
        self._poll.stop()
        self._learner = self.control = None
        self.learn.setChecked(False)
        self.close_ports()

    def close_ports(self) -> None:
        """Let go of the ports."""
        ports, self._ports = self._ports, None
        if ports is not None:
            ports.close()


def control_said(control: Control) -> str:
    """A control in words."""
    said = control.kind if control.kind in ("bend", "pressure") else f"{control.kind} {control.number}"
    return said + (f", channel {control.channel}" if control.channel else "")


def said_of(bind: Bind, named) -> str:
    """A bind in a line: its control, and what it does; `named` says which fibers."""
    control = control_said(bind.control) if bind.control is not None else bind.osc
    deed = bind.deed
    if isinstance(deed, Stroke):
        how = "" if deed.how == "takes" else f" {deed.how},"
        return f"{control} → {named(deed.fibers)}:{how} {deed.curve}, {100 * deed.low:.0f} to {100 * deed.high:.0f} %"
    if isinstance(deed, Play):
        return f"{control} → {deed.phrase} on {named(deed.fibers)}"
    assert isinstance(deed, Does)
    return f"{control} → {deed.what.replace('_', ' ')}"
