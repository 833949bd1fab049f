"""Where compiled loops are kept, and who is told while they are compiled.

The folder is the person's, so that a read-only installation can keep them too. Its name holds the program's version and a digest of the
kernels: numba notices a changed source file, but not that a function it has inlined from another file has changed.
"""

from __future__ import annotations

import atexit
import contextlib
import hashlib
import os
import shutil
import tempfile
import threading
from collections.abc import Callable, Iterator
from pathlib import Path

import thalweg
from thalweg import __version__
from thalweg_app.user_folders import cache_folder

#: Said while it happens: seconds on the first start, and never again for this version.
COMPILING = "Compiling numerical kernels once for this machine"
#: The variable that numba reads when it is imported. Set and empty: beside the source, as numba does by itself.
VARIABLE = "NUMBA_CACHE_DIR"
#: Folders kept: this version's and those used last.
KEPT = 3
#: Seconds without compiling after which it counts as done; kernels come one after the other.
REST = 0.5


def keep_compiled() -> None:
    """Call before numba is imported. What the person has set stays, and processes started later inherit the folder."""
    if VARIABLE not in os.environ:
        os.environ[VARIABLE] = str(compiled_folder())


def compiled_folder() -> Path:
    """The folder of this version, made when missing; a temporary one, gone at exit, where none can be kept."""
    place = cache_folder()
    if place is None:
        # Of a fresh name and for this person alone: numba runs what it finds in its folder.
        temporary = tempfile.mkdtemp(prefix="thalweg-")
        atexit.register(shutil.rmtree, temporary, ignore_errors=True)
        return Path(temporary)
    folder = place / "compiled" / f"{__version__}-{kernel_digest()}"
    folder.mkdir(parents=True, exist_ok=True)
    with contextlib.suppress(OSError):
        os.utime(folder)
        _drop_old(folder)
    return folder


def kernel_digest() -> str:
    """Twelve characters that change with any kernel."""
    digest = hashlib.sha256()
    for path in sorted((Path(str(thalweg.__file__)).parent / "kernels").glob("*.py")):
        digest.update(path.name.encode() + path.read_bytes())
    return digest.hexdigest()[:12]


def _drop_old(folder: Path) -> None:
    others = sorted((f for f in folder.parent.iterdir() if f.is_dir() and f != folder), key=lambda f: f.stat().st_mtime, reverse=True)
    for old in others[KEPT - 1 :]:
        shutil.rmtree(old, ignore_errors=True)


class Announcer:
    """Tells True when compiling begins and False once it has rested. `begin` and `end` may nest and come from any thread."""

    def __init__(self, tell: Callable[[bool], None]) -> None:
        self._tell = tell
        self._depth, self._told = 0, False
        self._lock = threading.Lock()
        self._timer: threading.Timer | None = None

    def begin(self) -> None:
        with self._lock:
            self._depth += 1
            self._cancel()
            if not self._told:
                self._told = True
                self._tell(True)

    def end(self) -> None:
        with self._lock:
            self._depth -= 1
            if self._depth == 0:
                self._timer = threading.Timer(REST, self.rest)
                self._timer.daemon = True
                self._timer.start()

    def rest(self) -> None:
        """Counts as done from now on."""
        with self._lock:
            self._cancel()
            if self._told and self._depth == 0:
                self._told = False
                self._tell(False)

    def _cancel(self) -> None:
        if self._timer is not None:
            self._timer.cancel()
            self._timer = None


@contextlib.contextmanager
def announced(tell: Callable[[bool], None]) -> Iterator[None]:
    """Inside, `tell` hears when kernels are compiled, from the thread that compiles or from another. Loading kept ones is not told."""
    from numba.core import event

    announcer = Announcer(tell)

    class Listener(event.Listener):
        def on_start(self, _: object) -> None:
            announcer.begin()

        def on_end(self, _: object) -> None:
            announcer.end()

    listener = Listener()
    event.register("numba:compile", listener)
    try:
        yield
    finally:
        event.unregister("numba:compile", listener)
        announcer.rest()
