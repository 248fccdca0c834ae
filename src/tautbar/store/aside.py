"""A file built aside, under the lock of one run, and put in place at once when it is whole."""

from __future__ import annotations

import errno
import io
import os
import signal
import sys
import threading
from collections.abc import Callable, Iterator
from contextlib import contextmanager, suppress
from pathlib import Path
from types import FrameType
from typing import Any

from tautbar.errors import InputError, ResultsError

if sys.platform != "win32":
    import fcntl

FULL = {errno.ENOSPC, errno.EDQUOT, errno.EFBIG}


class DiskFull(ResultsError):
    """No room for what comes next; what was written before is whole."""


@contextmanager
def undisturbed() -> Iterator[None]:
    """Hold back Ctrl-C and a request to end until the block is done, so that a write stays whole."""
    if threading.current_thread() is not threading.main_thread():
        yield  # signals are handled in the main thread alone
        return
    came: list[tuple[int, FrameType | None]] = []

    def note(number: int, frame: FrameType | None) -> None:
        came.append((number, frame))

    before: dict[int, Any] = {int(n): signal.getsignal(n) for n in (signal.SIGINT, signal.SIGTERM)}
    for number in before:
        signal.signal(number, note)
    try:
        yield
    finally:
        for number, handler in before.items():
            signal.signal(number, handler)
        for number, frame in came:
            _handle(before[number], number, frame)


def _handle(handler: Any, number: int, frame: FrameType | None) -> None:
    if callable(handler):
        handler(number, frame)
    elif handler == signal.SIG_DFL:
        os.kill(os.getpid(), number)


class AsideFile(io.RawIOBase):
    """The file under its passing name, as something HDF5 writes into.

    A write that fails is remembered in ``failure`` and taken as done, and so are all after it: HDF5
    cannot give up half-way, and would take the process down at its end. Whoever writes looks at
    ``failure`` and throws the file away.
    """

    def __init__(self, path: Path) -> None:
        self.path = path
        self.failure: OSError | None = None
        self._raw = _open_locked(path)
        self._at = 0
        self._end = 0  # what HDF5 takes for the end; room set aside lies beyond

    def reserve(self, size: int) -> None:
        """Set aside room [bytes] beyond the end. Raises DiskFull where there is none."""
        if not hasattr(os, "posix_fallocate"):
            return
        try:
            os.posix_fallocate(self._raw.fileno(), self._end, size)
        except OSError as wrong:
            if wrong.errno in FULL:
                raise DiskFull(f"{self.path.parent}: the disk is full") from None
            if wrong.errno not in (errno.EOPNOTSUPP, errno.EINVAL, errno.ENOSYS):
                raise

    def seek(self, offset: int, whence: int = io.SEEK_SET) -> int:
        """Move to a place; the end is that of what was written."""
        self._at = {io.SEEK_SET: 0, io.SEEK_CUR: self._at, io.SEEK_END: self._end}[whence] + offset
        return self._at

    def readinto(self, buffer: Any) -> int:
        """Read from the place moved to."""
        self._raw.seek(self._at)
        count = self._raw.readinto(buffer) or 0
        self._at += count
        return count

    def write(self, data: Any) -> int:
        """Write all of ``data`` at the place moved to."""
        view = memoryview(data).cast("B")
        self._try(lambda: self._write_all(view))
        self._at += len(view)
        self._end = max(self._end, self._at)
        return len(view)

    def _write_all(self, view: memoryview) -> None:
        self._raw.seek(self._at)
        done = 0
        while done < len(view):
            done += self._raw.write(view[done:]) or 0

    def truncate(self, size: int | None = None) -> int:
        """Cut or grow to ``size`` bytes."""
        self._end = self._at if size is None else size
        self._try(lambda: self._raw.truncate(self._end))
        return self._end

    def _try(self, action: Callable[[], object]) -> None:
        if self.failure is None:
            try:
                action()
            except OSError as wrong:
                self.failure = wrong

    def put_in_place(self, path: Path, keep_as: Path | None) -> None:
        """Make the file ``path``, whole or not at all; one that is there becomes ``keep_as``."""
        os.fsync(self._raw.fileno())
        if sys.platform == "win32":  # an open file cannot be renamed there
            self.close()
        if keep_as is not None:
            _keep(path, keep_as)
        os.replace(self.path, path)
        _sync_folder(path.parent)
        self.close()

    def discard(self) -> None:
        """Throw the file away."""
        with suppress(OSError):
            self.path.unlink()
        self.close()

    def close(self) -> None:
        """Give up the lock."""
        self._raw.close()


def _open_locked(path: Path) -> io.FileIO:
    """Open a file for one run alone, empty. One left over by a run that was killed is used again."""
    while True:
        raw = io.FileIO(_open(path), "r+b")
        if sys.platform == "win32":  # no such locks; an open file cannot be replaced there either
            break
        try:
            fcntl.flock(raw, fcntl.LOCK_EX | fcntl.LOCK_NB)
        except OSError:
            raw.close()
            raise InputError(f"{path}: another run is writing this file; wait for it to end") from None
        if _is_at(raw, path):  # else the other run put it in place between opening and locking
            break
        raw.close()
    raw.truncate(0)
    return raw


def _open(path: Path) -> int:
    try:
        return os.open(path, os.O_RDWR | os.O_CREAT | getattr(os, "O_BINARY", 0), 0o666)
    except OSError as wrong:
        raise InputError(f"{path.parent}: cannot write in this folder ({wrong.strerror})") from None


def _is_at(raw: io.FileIO, path: Path) -> bool:
    try:
        return os.path.samestat(os.fstat(raw.fileno()), os.stat(path))
    except FileNotFoundError:
        return False


def _keep(path: Path, keep_as: Path) -> None:
    """Give a file its second name, so that ``path`` is there at every instant where links exist."""
    with suppress(FileNotFoundError):
        keep_as.unlink()
    try:
        os.link(path, keep_as)
    except OSError:
        os.replace(path, keep_as)


def _sync_folder(folder: Path) -> None:
    if sys.platform == "win32":  # a folder cannot be opened there
        return
    handle = os.open(folder, os.O_RDONLY)
    try:
        os.fsync(handle)
    finally:
        os.close(handle)
