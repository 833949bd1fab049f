"""The shared libraries that Qt needs from the system. Standard library only: the set-up script loads this file by its path.

Qt aborts the whole process when one is missing and always blames the same one, so they are looked for before Qt is imported.
"""

from __future__ import annotations

import ctypes
import os
import shutil
import sys

#: Shared library -> the Debian package that holds it.
DRAWING = {
    "libglib-2.0.so.0": "libglib2.0-0",
    "libEGL.so.1": "libegl1",
    "libGL.so.1": "libgl1",
    "libxkbcommon.so.0": "libxkbcommon0",
    "libdbus-1.so.3": "libdbus-1-3",
    "libfontconfig.so.1": "libfontconfig1",
}
X_DISPLAY = {
    "libxcb-cursor.so.0": "libxcb-cursor0",
    "libxkbcommon-x11.so.0": "libxkbcommon-x11-0",
    "libxcb-icccm.so.4": "libxcb-icccm4",
    "libxcb-keysyms.so.1": "libxcb-keysyms1",
    "libxcb-shape.so.0": "libxcb-shape0",
}


def missing_libraries() -> dict[str, str]:
    """Library -> Debian package, for each one that the loader cannot find. Empty on systems other than Linux."""
    if not sys.platform.startswith("linux"):
        return {}
    return {name: package for name, package in {**DRAWING, **X_DISPLAY}.items() if not _loads(name)}


def has_display() -> bool:
    """Whether a window can be shown: always on Windows and macOS, elsewhere when a display is named or Qt is told to draw offscreen."""
    if not sys.platform.startswith("linux"):
        return True
    return any(os.environ.get(name) for name in ("DISPLAY", "WAYLAND_DISPLAY", "QT_QPA_PLATFORM"))


def install_line(packages: list[str]) -> str:
    """The command that a person types to install these packages; empty where there is no apt."""
    if not shutil.which("apt-get"):
        return ""
    return "sudo apt-get update && sudo apt-get install -y --no-install-recommends " + " ".join(packages)


def _loads(name: str) -> bool:
    try:
        ctypes.CDLL(name)
    except OSError:
        return False
    return True
