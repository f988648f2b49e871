"""What one fiber can do, as a widget."""

from pathlib import Path

import numpy as np
import pytest
from PySide6.QtGui import QImage

from composer.limits.abilities import abilities_of
from composer.load import load_rig
from composer.picture import palette
from composer.picture.plots.able_view import AbleView

DEMOS = Path(__file__).parents[4] / "scores_demo"


@pytest.fixture(scope="module")
def gannet():
    rig = load_rig(DEMOS / "gannet.rig.toml")
    return rig, abilities_of(rig)


@pytest.fixture
def view(qtbot):
    shown = AbleView()
    qtbot.addWidget(shown)
    shown.resize(900, 260)
    return shown


def pixels_of(widget):
    """A widget's picture as (height, width, 3)."""
    shot = widget.grab().toImage().convertToFormat(QImage.Format.Format_RGB32)
    return np.frombuffer(shot.constBits(), np.uint8).reshape(shot.height(), shot.width(), 4)[:, :, 2::-1].astype(int)


def share_of(view, colour):
    return (np.abs(pixels_of(view) - np.array(colour)).max(axis=2) < 12).mean()


@pytest.mark.parametrize("theme", [palette.DARK, palette.LIGHT])
def test_both_ways_are_drawn_in_the_colours_of_the_theme(view, gannet, theme):
    view.set_theme(theme)
    view.show_fiber(*gannet, 0)
    assert share_of(view, theme.duty) > 0.001
    assert share_of(view, theme.supply) > 0.001
    assert share_of(view, theme.ground) > 0.2


def test_what_it_draws_is_also_told_in_words(view, gannet):
    rig, abilities = gannet
    view.show_fiber(rig, abilities, 10)
    able = abilities.capabilities[abilities.which[10]]
    assert "tendril.left" in view.accessibleDescription()
    assert f"{100 * able.stroke:.1f} %" in view.accessibleDescription()


def test_with_no_fiber_it_says_so_and_draws_no_curve(view):
    assert share_of(view, palette.DARK.duty) == 0.0
