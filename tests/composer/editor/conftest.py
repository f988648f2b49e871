"""A home of its own for whatever the compose window keeps."""

import os

import pytest

os.environ.setdefault("QT_QPA_PLATFORM", "offscreen")


@pytest.fixture(autouse=True)
def state(tmp_path, monkeypatch):
    """The folder that stands in for the user's own."""
    folder = tmp_path / "state"
    monkeypatch.setenv("DRAWCORD_STATE", str(folder))
    return folder
