"""The right side of the window: cloth, hanging fibers and rig as leaves of one book, and the transport below them."""

from PySide6.QtCore import Qt
from PySide6.QtWidgets import QLabel, QTabWidget, QVBoxLayout, QWidget

from composer.picture.cloth.cloth_view import ClothView
from composer.picture.palette import DARK, Theme
from composer.picture.preview.transport import Transport

CLOTH, HANG, RIG = "Cloth", "Hanging fibers", "Rig"
LEAVES = (CLOTH, HANG, RIG)


class Stage(QWidget):
    """Leaves for what is seen. The hang view and the rig page are put in when there is a rig, and not loaded before."""

    def __init__(self) -> None:
        super().__init__()
        self.setAccessibleName("pictures")
        self.cloth = ClothView()
        self.transport = Transport()
        self.leaves = QTabWidget()
        self.leaves.setDocumentMode(True)
        self.leaves.setAccessibleName("cloth, hanging fibers, rig")
        self.leaves.tabBar().setAccessibleName("which picture is shown")
        self._theme: Theme = DARK
        self._pages: dict[str, QWidget] = {}
        for name in LEAVES:
            page = QWidget()
            column = QVBoxLayout(page)
            column.setContentsMargins(0, 0, 0, 0)
            column.addWidget(self.cloth if name == CLOTH else _waiting())
            page.setAccessibleName(name)
            self.leaves.addTab(page, name)
            self._pages[name] = page
        column = QVBoxLayout(self)
        column.setContentsMargins(0, 0, 0, 0)
        column.setSpacing(0)
        column.addWidget(self.leaves, 1)
        column.addWidget(self.transport)

    @property
    def shown(self) -> str:
        """The leaf that is open."""
        return LEAVES[self.leaves.currentIndex()]

    def open(self, name: str) -> None:
        """Open a leaf, and put the keys there."""
        self.leaves.setCurrentIndex(LEAVES.index(name))
        widget = self.content(name)
        widget.setFocus()

    def content(self, name: str) -> QWidget:
        """What a leaf holds."""
        return self._pages[name].layout().itemAt(0).widget()

    def put(self, name: str, widget: QWidget) -> None:
        """Put something on a leaf, in place of what is there."""
        layout = self._pages[name].layout()
        old = layout.takeAt(0).widget()
        layout.addWidget(widget)
        old.hide()
        old.deleteLater()


def _waiting() -> QLabel:
    label = QLabel("There is no rig yet: the line `rig` names its file.")
    label.setAlignment(Qt.AlignmentFlag.AlignCenter)
    label.setAccessibleName(label.text())
    return label
