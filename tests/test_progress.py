"""The progress display: what is written, where, and that it never disturbs the job."""

from __future__ import annotations

import io
import os

import pytest

from tautbar import progress
from tautbar.progress import Progress, Silent, clock


class Terminal(io.StringIO):
    """A stream that says it is a terminal."""

    def isatty(self) -> bool:
        return True


class Gone(io.StringIO):
    """A stream whose reader has gone."""

    def write(self, text: str) -> int:
        raise BrokenPipeError


@pytest.fixture
def time(monkeypatch: pytest.MonkeyPatch) -> list[float]:
    """A clock that stands still unless the test moves ``time[0]``."""
    now = [100.0]
    monkeypatch.setattr(progress.time, "monotonic", lambda: now[0])
    return now


@pytest.fixture
def wide(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.delenv("TERM", raising=False)
    monkeypatch.setattr(Progress, "_width", lambda self: 100)


def test_elsewhere_than_on_a_terminal_plain_lines_are_sparse(time: list[float]) -> None:
    out = io.StringIO()
    shown = Progress(out)
    shown.start("lantern dropped", total=3.0, unit="s")
    for step in range(1, 301):  # 30 s of work: a line each 10 s
        time[0] = 100 + 0.1 * step
        shown.to(0.01 * step)
    shown.finish()
    lines = out.getvalue().splitlines()
    assert lines[0] == "lantern dropped ..."
    assert lines[-1] == "lantern dropped: done in 30.0 s"
    assert 2 <= len(lines) - 2 <= 3
    assert "\r" not in out.getvalue()


def test_a_plain_line_tells_share_time_left_amount_and_note(time: list[float]) -> None:
    out = io.StringIO()
    shown = Progress(out)
    shown.start("march", total=4.0, unit="s")
    time[0] += 20.0
    shown.to(1.0, "3 slack")
    told = out.getvalue().splitlines()[1]
    assert told == "march  [#####...............]  25 %  1 min 00 s left  at 1 s  3 slack"


def test_without_a_total_there_is_no_bar(time: list[float]) -> None:
    out = io.StringIO()
    shown = Progress(out)
    shown.start("static", unit="iterations")
    time[0] += 11.0
    shown.to(12)
    assert out.getvalue().splitlines()[1] == "static  12 iterations"


@pytest.mark.usefixtures("wide")
def test_a_terminal_line_is_redrawn_and_leaves_only_the_end(time: list[float]) -> None:
    out = Terminal()
    shown = Progress(out)
    shown.start("march", total=10)
    time[0] += 0.2
    shown.to(5)
    shown.finish("interrupted")
    start, half, blank, end = out.getvalue().split("\r")[1:]
    assert start.rstrip() == "march ..."
    assert half.startswith("march  [##########..........]  50 %")
    assert len(half) == 100
    assert blank == " " * 100
    assert end == "march: interrupted in 0.2 s\n"


@pytest.mark.usefixtures("wide")
def test_a_terminal_is_redrawn_at_most_ten_times_a_second(time: list[float]) -> None:
    out = Terminal()
    shown = Progress(out)
    shown.start("march", total=1000)
    for step in range(1000):  # one second of work
        time[0] = 100 + 0.001 * step
        shown.to(step)
    assert out.getvalue().count("\r") <= 1 + 10


def test_a_narrow_window_is_never_wrapped(time: list[float], monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.delenv("TERM", raising=False)
    monkeypatch.setattr(progress.os, "get_terminal_size", lambda _: os.terminal_size((20, 5)))
    monkeypatch.setattr(Terminal, "fileno", lambda self: 2)
    out = Terminal()
    shown = Progress(out)
    shown.start("a very long name of an analysis", total=10)
    time[0] += 1
    shown.to(5)
    assert {len(text) for text in out.getvalue().split("\r")[1:]} == {19}


def test_a_window_of_no_width_behaves(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.delenv("TERM", raising=False)
    monkeypatch.setattr(progress.os, "get_terminal_size", lambda _: os.terminal_size((0, 0)))
    monkeypatch.setattr(Terminal, "fileno", lambda self: 2)
    out = Terminal()
    Progress(out).start("x")
    assert len(out.getvalue()) == 1 + 79


def test_a_terminal_that_cannot_go_back_gets_plain_lines(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv("TERM", "dumb")
    out = Terminal()
    Progress(out).start("x")
    assert out.getvalue() == "x ...\n"


@pytest.mark.parametrize("setting", ["1", ""])
def test_no_colour_is_ever_written(setting: str, time: list[float], monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.delenv("TERM", raising=False)
    monkeypatch.setenv("NO_COLOR", setting)
    out = Terminal()
    shown = Progress(out)
    shown.start("x", total=2)
    time[0] += 1
    shown.to(1)
    shown.finish()
    assert "\x1b" not in out.getvalue()


def test_only_ascii_is_written(time: list[float]) -> None:
    out = io.StringIO()
    shown = Progress(out)
    shown.start("Gerüst")
    shown.finish()
    assert out.getvalue().isascii()
    assert "Ger?st" in out.getvalue()


def test_a_reader_that_has_gone_does_not_stop_the_job() -> None:
    shown = Progress(Gone())
    shown.start("x", total=2)
    shown.to(1)
    shown.finish()


def test_a_share_beyond_the_total_is_shown_as_all(time: list[float]) -> None:
    out = io.StringIO()
    shown = Progress(out)
    shown.start("x", total=2)
    time[0] += 11
    shown.to(3)
    assert "[####################] 100 %  0.0 s left" in out.getvalue()


def test_nothing_is_shown_between_pieces_of_work() -> None:
    out = io.StringIO()
    shown = Progress(out)
    shown.to(1)
    shown.finish()
    assert out.getvalue() == ""


def test_silent_has_the_methods_of_progress_and_writes_nothing(capsys: pytest.CaptureFixture[str]) -> None:
    public = {name for name in vars(Progress) if not name.startswith("_")}
    assert public == {name for name in vars(Silent) if not name.startswith("_")}
    shown = Silent()
    shown.start("x", total=1, unit="s")
    shown.to(1, "note")
    shown.finish("done")
    assert capsys.readouterr() == ("", "")


@pytest.mark.parametrize(
    ("seconds", "words"),
    [
        (0.04, "0.0 s"),
        (59.94, "59.9 s"),
        (59.96, "1 min 00 s"),  # never "60.0 s"
        (185.2, "3 min 05 s"),
        (3599.7, "1 h 00 min"),  # never "60 min"
        (7800.0, "2 h 10 min"),
    ],
)
def test_a_length_of_time_in_words(seconds: float, words: str) -> None:
    assert clock(seconds) == words
