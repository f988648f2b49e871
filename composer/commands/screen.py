"""Whether there is a screen for a window."""

import os
import subprocess
import sys

ASK = "import sys; from PySide6.QtGui import QGuiApplication; QGuiApplication(sys.argv)"


def has_screen() -> bool:
    """Whether a window can be shown: asked in a process of its own, as Qt ends one whose screen cannot be reached."""
    if sys.platform.startswith("linux") and not (os.environ.get("DISPLAY") or os.environ.get("WAYLAND_DISPLAY")):
        return False
    if os.environ.get("QT_QPA_PLATFORM", "").split(":")[0] in ("offscreen", "minimal", "vnc"):
        return False
    try:
        return subprocess.run([sys.executable, "-c", ASK], capture_output=True, timeout=20, check=False).returncode == 0
    except (OSError, subprocess.TimeoutExpired):
        return False
