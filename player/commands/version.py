"""What `drawcord --version` tells: what a report of a fault should say of the machine. Nothing is imported for it."""

import locale
import platform
import sys
from importlib.metadata import PackageNotFoundError, version

LIBRARIES = {
    "numpy": "numpy",
    "scipy": "scipy",
    "highspy": "HiGHS",
    "PySide6-Essentials": "Qt",
    "click": "click",
    "pyserial": "pyserial",
    "mido": "mido",
    "python-rtmidi": "rtmidi",
}
"""Distributions whose version matters, and what they are called here."""


def lines() -> list[str]:
    """The version first, in a line of its own; then Python, libraries, system."""
    bits = 64 if sys.maxsize > 2**32 else 32
    libraries = ", ".join(f"{name} {_version(package)}" for package, name in LIBRARIES.items())
    return [
        f"drawcord {version('drawcord')}",
        f"{platform.python_implementation()} {platform.python_version()}, {bits} bit, {locale.getpreferredencoding(False)}",
        libraries,
        platform.platform(),
    ]


def _version(package: str) -> str:
    try:
        return version(package)
    except PackageNotFoundError:
        return "missing"
