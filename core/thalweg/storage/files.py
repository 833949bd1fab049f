"""Files written whole or not at all, and read with a limit on their size."""

from __future__ import annotations

import contextlib
import os
import secrets
from pathlib import Path

from thalweg.errors import StudyError

#: Larger files are refused before they are read.
MAX_READ_BYTES = 512 * 2**20


def write_atomically(path: Path, content: bytes) -> None:
    """Puts `content` at `path`; a reader sees the old file or the new one, never a part of either.

    A temporary file in the same folder is written, synced and renamed over the target. StudyError when the system refuses.
    """
    target = path.resolve()  # a link stays a link: the file that it points to is replaced
    temporary = target.with_name(f".{target.name[:200]}.{secrets.token_hex(6)}.part")
    try:
        _write_synced(temporary, content)
        if target.exists():
            temporary.chmod(target.stat().st_mode & 0o777)
        os.replace(temporary, target)
        _sync_folder(target.parent)
    except OSError as error:
        raise refused("write", path, error) from None
    finally:
        with contextlib.suppress(OSError):
            temporary.unlink(missing_ok=True)  # gone already when the rename went through


def ensure_writable(path: Path) -> None:
    """StudyError when `path` cannot be written, found out before the work whose result it shall hold."""
    target = path.resolve()
    if target.is_dir():
        raise StudyError(f"Cannot write {path}", "it is a folder", "Give a file name")
    if not target.parent.is_dir():
        raise StudyError(f"Cannot write {path}", f"there is no folder {target.parent}", "Make the folder or give another path")
    if not os.access(target.parent, os.W_OK):
        raise StudyError(f"Cannot write {path}", f"no permission to write in {target.parent}", "Give a path in a folder of your own")


def read_limited(path: Path) -> bytes:
    """The bytes of a regular file; StudyError when there is none, it may not be read, or it is over MAX_READ_BYTES."""
    try:
        if path.is_dir():
            raise StudyError(f"Cannot read {path}", "it is a folder", "Give a file name")
        size = path.stat().st_size
        if size > MAX_READ_BYTES:
            why = f"it has {size / 2**20:.0f} MiB and the limit is {MAX_READ_BYTES / 2**20:.0f} MiB"
            raise StudyError(f"Cannot read {path}", why, "Check that this is the file you mean")
        with path.open("rb") as stream:
            content = stream.read(MAX_READ_BYTES + 1)
    except OSError as error:
        raise refused("read", path, error) from None
    if len(content) > MAX_READ_BYTES:  # pipes and devices have no size
        raise StudyError(f"Cannot read {path}", "it has no end within the size limit", "Check that this is the file you mean")
    return content


def refused(verb: str, path: Path, error: OSError) -> StudyError:
    """What the operating system refused, as a sentence."""
    why = (error.strerror or str(error)).lower()
    return StudyError(f"Cannot {verb} {path}", why, "Check the name, the permissions and the free space, or give another path")


def _write_synced(path: Path, content: bytes) -> None:
    with path.open("xb") as stream:
        stream.write(content)
        stream.flush()
        os.fsync(stream.fileno())


def _sync_folder(folder: Path) -> None:
    """Makes the rename itself durable; systems without folder handles (Windows) do without."""
    try:
        handle = os.open(folder, os.O_RDONLY)
    except OSError:
        return
    with contextlib.suppress(OSError):  # some network file systems refuse; the file itself is synced
        os.fsync(handle)
    os.close(handle)
