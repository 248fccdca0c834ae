"""Progress on standard error: a live line on a terminal, sparse plain lines elsewhere, or nothing."""

from __future__ import annotations

import os
import sys
import time
from typing import Protocol, TextIO

LIVE_EVERY = 0.1  # s between redraws of the live line
LINE_EVERY = 10.0  # s between plain lines, so that a log of an hour stays readable
BAR = 20  # characters
SURE = 0.02  # share of the work after which a time left is worth showing


class Shows(Protocol):
    """What a job tells about how far it is: `Progress` and its silent twin `Silent`."""

    def start(self, what: str, total: float | None = None, unit: str = "") -> None:
        """Begin a piece of work of ``total`` units (None: not known)."""

    def to(self, n: float, note: str = "") -> None:
        """Say that ``n`` of the total is done; cheap to call often."""

    def finish(self, word: str = "done") -> None:
        """End the piece of work: ``word`` says how ("done", "failed", "interrupted")."""


class Silent:
    """Shows nothing, with the methods of `Progress`."""

    def start(self, what: str, total: float | None = None, unit: str = "") -> None:
        """Nothing."""

    def to(self, n: float, note: str = "") -> None:
        """Nothing."""

    def finish(self, word: str = "done") -> None:
        """Nothing."""


class Progress:
    """Shows how far a job is, one piece of work after another.

    On a terminal one line is redrawn; elsewhere (a file, a pipe, a terminal that cannot go back)
    a plain line is written at the start, every ten seconds and at the end. ASCII and no colour
    in both. A stream that can no longer be written to ends the showing, never the job.

    Parameters
    ----------
    stream
        Where to write; standard error by default.
    """

    def __init__(self, stream: TextIO | None = None) -> None:
        self._stream = sys.stderr if stream is None else stream
        self._live = self._stream.isatty() and os.environ.get("TERM") != "dumb"
        self._every = LIVE_EVERY if self._live else LINE_EVERY
        self._what = ""

    def start(self, what: str, total: float | None = None, unit: str = "") -> None:
        """Begin a piece of work of ``total`` units (None: not known)."""
        self._what, self._total, self._unit = what, total, unit
        self._began = self._shown = time.monotonic()
        if self._live:
            self._redraw(f"{what} ...")
        else:
            self._write(f"{what} ...\n")

    def to(self, n: float, note: str = "") -> None:
        """Say that ``n`` of the total is done; cheap to call often."""
        now = time.monotonic()
        if not self._what or now - self._shown < self._every:
            return
        self._shown = now
        text = self._text(n, now - self._began, note)
        if self._live:
            self._redraw(text)
        else:
            self._write(text + "\n")

    def finish(self, word: str = "done") -> None:
        """End the piece of work: ``word`` says how ("done", "failed", "interrupted")."""
        if not self._what:
            return
        if self._live:
            self._write("\r" + " " * self._width() + "\r")
        self._write(f"{self._what}: {word} in {clock(time.monotonic() - self._began)}\n")
        self._what = ""

    def _text(self, n: float, gone: float, note: str) -> str:
        parts = [self._what]
        if self._total:
            share = min(max(n / self._total, 0.0), 1.0)
            parts.append(f"[{'#' * int(BAR * share):.<{BAR}}] {100 * share:3.0f} %")
            if share > SURE:
                parts.append(f"{clock(gone * (1 / share - 1))} left")
        if self._unit:
            at = "at " if self._unit == "s" else ""  # an instant, not to be taken for a time left
            parts.append(f"{at}{n:.4g} {self._unit}")
        return "  ".join([*parts, note] if note else parts)

    def _redraw(self, text: str) -> None:
        width = self._width()
        self._write("\r" + text[:width].ljust(width))

    def _width(self) -> int:
        """Columns to use: one fewer than there are, as the last one makes some terminals wrap."""
        try:
            columns = os.get_terminal_size(self._stream.fileno()).columns or 80
        except (OSError, ValueError):  # nothing behind the stream, or no terminal
            columns = 80
        return max(columns - 1, 1)

    def _write(self, text: str) -> None:
        try:
            self._stream.write(text.encode("ascii", "replace").decode("ascii"))
            self._stream.flush()
        except (OSError, ValueError):  # the reader has gone, or the stream is closed
            self._what = ""


def clock(seconds: float) -> str:
    """A length of time in words: ``4.2 s``, ``3 min 05 s``, ``2 h 10 min``."""
    if seconds < 59.95:
        return f"{seconds:.1f} s"
    whole = round(seconds)
    if whole < 3600:
        return f"{whole // 60} min {whole % 60:02d} s"
    return f"{whole // 3600} h {whole % 3600 // 60:02d} min"
