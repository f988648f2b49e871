"""The parts of the rehearse window and where they stand."""

from dataclasses import dataclass

from PySide6.QtCore import Qt
from PySide6.QtWidgets import (
    QAbstractItemView,
    QComboBox,
    QHBoxLayout,
    QLabel,
    QListWidget,
    QPushButton,
    QSizePolicy,
    QStackedWidget,
    QVBoxLayout,
    QWidget,
)

from player.window.actions import ACTIONS
from player.window.hang_frame import HangFrame
from player.window.hold_button import HoldButton
from player.window.instruments import Instruments
from player.window.map_view import MapView
from player.window.meters_view import MetersView
from player.window.next_view import NextView
from player.window.preflight_view import PreflightView
from player.window.takes_view import TakesView

DEEDS = (
    "arm", "hold", "play", "pause", "go_on", "next_cue", "rest", "let_go", "record", "preflight", "command", "again", "jump",
)  # fmt: skip
"""Buttons of the row, from left to right; the place that `jump` goes to stands behind it."""

SELDOM = ("preflight", "command", "again")
"""Those of them that stand below, smaller: a worn rig's row has no room for them."""

TABS = ("panel_1", "panel_2", "panel_3", "panel_4")


@dataclass(slots=True)
class Parts:
    """All parts of the window."""

    title: QLabel
    state: QLabel
    more: QLabel
    place: QLabel
    vent: QPushButton
    banner: QLabel
    hang: HangFrame
    not_drawn: QLabel
    middle: QWidget
    column: QWidget
    next: NextView
    tabs: list[QPushButton]
    stack: QStackedWidget
    meters: MetersView
    preflight: PreflightView
    takes: TakesView
    map: MapView
    instruments: Instruments
    deeds: dict[str, QPushButton]
    arm: HoldButton
    start: QComboBox
    why: QLabel
    log: QListWidget
    status: QLabel


def build(window) -> Parts:
    """Make all parts and lay them out in a window, whose `do`, `hold` and `vent` they call."""
    label = _label
    vent = QPushButton("VENT  (Esc)")
    vent.setObjectName("vent")
    vent.setAccessibleName("VENT")
    vent.setAccessibleDescription(ACTIONS["vent"].says)
    vent.setToolTip(ACTIONS["vent"].says)
    vent.setFocusPolicy(Qt.FocusPolicy.TabFocus)
    # When it goes down, not when it comes up again.
    vent.pressed.connect(window.vent)
    deeds = {name: _deed(window, name) for name in DEEDS}
    tabs = [_tab(window, name) for name in TABS]
    start = QComboBox()
    start.setObjectName("from")
    start.setAccessibleName("where to play from")
    start.setFocusPolicy(Qt.FocusPolicy.TabFocus)
    start.setSizeAdjustPolicy(QComboBox.SizeAdjustPolicy.AdjustToMinimumContentsLengthWithIcon)
    start.setMinimumContentsLength(12)
    log = QListWidget()
    log.setObjectName("log")
    log.setAccessibleName("log")
    log.setSelectionMode(QAbstractItemView.SelectionMode.NoSelection)
    log.setFocusPolicy(Qt.FocusPolicy.TabFocus)
    log.setHorizontalScrollBarPolicy(Qt.ScrollBarPolicy.ScrollBarAlwaysOff)
    log.setTextElideMode(Qt.TextElideMode.ElideRight)
    arm = deeds["arm"]
    assert isinstance(arm, HoldButton)
    parts = Parts(
        title=label("title", "what is played"), state=label("state", "state"), more=label("more", "state, more of it"),
        place=label("place", "place"), vent=vent, banner=label("banner", "what is wrong"), hang=HangFrame(),
        not_drawn=label("more", "why the rig is not drawn"), middle=QWidget(), column=QWidget(), next=NextView(), tabs=tabs,
        stack=QStackedWidget(), meters=MetersView(), preflight=PreflightView(), takes=TakesView(window),
        map=MapView(window), instruments=Instruments(), deeds=deeds, arm=arm, start=start, why=label("why", "why"),
        log=log, status=label("status", "this window and the run"),
    )  # fmt: skip
    parts.banner.setParent(window)
    parts.banner.hide()
    parts.banner.setWordWrap(True)
    parts.banner.setSizePolicy(QSizePolicy.Policy.Ignored, QSizePolicy.Policy.Preferred)
    parts.title.setSizePolicy(QSizePolicy.Policy.Ignored, QSizePolicy.Policy.Preferred)
    parts.not_drawn.setWordWrap(True)
    parts.not_drawn.setAlignment(Qt.AlignmentFlag.AlignCenter)
    parts.not_drawn.setVisible(False)
    for panel in (parts.meters, parts.preflight, parts.takes, parts.map):
        parts.stack.addWidget(panel)
    parts.meters.group_clicked.connect(parts.map.group_clicked)
    parts.hang.fiber_clicked.connect(parts.map.fiber_clicked)
    _lay_out(window, parts)
    return parts


def _lay_out(window, parts: Parts) -> None:
    words = QVBoxLayout()
    words.setSpacing(0)
    first = QHBoxLayout()
    first.setSpacing(28)
    first.addWidget(parts.state)
    first.addWidget(parts.place)
    first.addStretch(1)
    second = QHBoxLayout()
    second.setSpacing(20)
    second.addWidget(parts.more)
    second.addWidget(parts.title, 1)
    words.addLayout(first)
    words.addLayout(second)
    head = QHBoxLayout()
    head.setContentsMargins(16, 8, 16, 4)
    head.addLayout(words, 1)
    head.addWidget(parts.vent)
    tabs = QHBoxLayout()
    tabs.setSpacing(4)
    for button in parts.tabs:
        tabs.addWidget(button, 1)
    column = QVBoxLayout(parts.column)
    column.setContentsMargins(0, 0, 8, 0)
    column.setSpacing(4)
    column.addWidget(parts.next)
    column.addLayout(tabs)
    column.addWidget(parts.stack, 1)
    column.addWidget(parts.instruments)
    middle = QHBoxLayout(parts.middle)
    middle.setContentsMargins(0, 0, 0, 0)
    middle.setSpacing(8)
    middle.addWidget(parts.hang, 1)
    middle.addWidget(parts.not_drawn, 1)
    middle.addWidget(parts.column)
    row = QHBoxLayout()
    row.setContentsMargins(12, 0, 12, 0)
    row.setSpacing(6)
    for name in DEEDS:
        if name in SELDOM:
            continue
        if name == "jump":
            row.addStretch(1)
        row.addWidget(parts.deeds[name])
    row.addWidget(parts.start)
    foot = QHBoxLayout()
    foot.setContentsMargins(14, 0, 14, 4)
    foot.addWidget(parts.status, 1)
    whole = QVBoxLayout(window)
    whole.setContentsMargins(0, 0, 0, 0)
    whole.setSpacing(4)
    whole.addLayout(head)
    whole.addWidget(parts.middle, 1)
    whole.addLayout(row)
    beneath = QHBoxLayout()
    beneath.setContentsMargins(14, 0, 14, 0)
    beneath.addWidget(parts.why, 1)
    for name in SELDOM:
        parts.deeds[name].setObjectName("tab")
        beneath.addWidget(parts.deeds[name])
    for name in ("view", "dim", "keys"):
        beneath.addWidget(_small(window, name))
    whole.addLayout(beneath)
    logged = QHBoxLayout()
    logged.setContentsMargins(12, 0, 12, 0)
    logged.addWidget(parts.log)
    whole.addLayout(logged)
    whole.addLayout(foot)


def _label(name: str, said: str) -> QLabel:
    label = QLabel()
    label.setObjectName(name)
    label.setTextFormat(Qt.TextFormat.PlainText)
    label.setAccessibleName(said)
    return label


def _deed(window, name: str) -> QPushButton:
    action = ACTIONS[name]
    if name == "arm":
        button = HoldButton(action.word)
        button.done.connect(lambda: window.do("arm"))
    else:
        button = QPushButton(action.word)
        if name == "hold":
            button.pressed.connect(lambda: window.hold(True))
            button.released.connect(lambda: window.hold(False))
        else:
            button.clicked.connect(lambda: window.do(name))
    button.setObjectName("deed")
    button.setAccessibleName(action.word)
    button.setFocusPolicy(Qt.FocusPolicy.TabFocus)
    return button


def _tab(window, name: str) -> QPushButton:
    button = _small(window, name)
    button.setCheckable(True)
    return button


def _small(window, name: str) -> QPushButton:
    action = ACTIONS[name]
    button = QPushButton(f"{action.keys[0]}  {action.word}")
    button.setObjectName("tab")
    button.setAccessibleName(action.word)
    button.setToolTip(f"{action.says} ({' or '.join(action.keys)})")
    button.setFocusPolicy(Qt.FocusPolicy.TabFocus)
    button.clicked.connect(lambda: window.do(name))
    return button
