"""A living cloth on the screen."""

import pytest
from PySide6.QtWidgets import QApplication

from composer.picture.cloth.cloth_view import ClothView

from .gestures import lined


@pytest.fixture
def cloth(qtbot, make_weave):
    view = ClothView()
    qtbot.addWidget(view)
    view.resize(1280, 800)
    view.set_weave(lined(make_weave(until_s=2.1)))
    view.show()
    QApplication.processEvents()
    return view


@pytest.fixture
def said(cloth):
    """All signals of the cloth, as they come."""
    heard = []
    for name in ("thread_clicked", "hit_dragged", "hit_dropped", "head_moved", "snag_chosen", "stretch_changed"):
        getattr(cloth, name).connect(lambda *what, name=name: heard.append((name, *what)))
    return heard
