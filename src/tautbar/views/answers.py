"""Answers in words, for the terminal and for scripts."""

from __future__ import annotations

import textwrap
from collections.abc import Sequence
from typing import Any, Protocol

from tautbar.store import Result
from tautbar.views.numbers import audit_numbers, numbers, plain

WIDTH = 100  # columns
MOST_ACTING = 8  # loadings named; the rest are counted


class Answer(Protocol):
    """What a record and a result of a file have in common."""

    @property
    def name(self) -> str: ...
    @property
    def kind(self) -> str: ...
    @property
    def status(self) -> str: ...
    @property
    def outcome(self) -> str: ...
    @property
    def acting(self) -> tuple[str, ...]: ...
    @property
    def audit_lines(self) -> tuple[str, ...]: ...
    @property
    def warnings(self) -> tuple[str, ...]: ...


def answer_text(item: Answer) -> str:
    """One analysis as a block of plain text: how it ended, what acts, the answer, audit, warnings.

    What is not complete says so first. Our words are ASCII; names stand as the model has them.
    """
    head = f"{item.name} ({item.kind})"
    if item.status != "complete":
        head = f"{item.status.upper()}: {head}"
    parts: list[tuple[str, Sequence[str]]] = [
        ("", item.outcome.splitlines()),
        ("acts", _some(item.acting)),
        ("audit", item.audit_lines),
        ("warning", item.warnings),
    ]
    return "\n".join([head, *(line for label, lines in parts for line in _block(label, lines))])


def _some(acting: Sequence[str]) -> list[str]:
    shown = list(acting[:MOST_ACTING])
    return [*shown, f"and {len(acting) - len(shown)} more"] if len(acting) > len(shown) else shown


def _block(label: str, lines: Sequence[str]) -> list[str]:
    if not label:
        return [wrapped for line in lines for wrapped in _wrap(line, "  ", "  ")]
    heads = [f"  {label}: ".ljust(11)] + [" " * 11] * (len(lines) - 1)
    return [
        wrapped for head, line in zip(heads, lines, strict=False) for wrapped in _wrap(line, head, " " * 11)
    ]


def _wrap(line: str, first: str, then: str) -> list[str]:
    """A line broken at blanks; one that fits keeps its own spacing, as tables need."""
    if len(first) + len(line) <= WIDTH:
        return [(first + line).rstrip()]
    return textwrap.wrap(
        line,
        WIDTH,
        initial_indent=first,
        subsequent_indent=then,
        break_long_words=False,
        break_on_hyphens=False,
    )


def as_json(result: Result) -> dict[str, Any]:
    """One analysis as plain data for scripts, SI units named in the keys; what is not a number is None."""
    return {
        "name": result.name,
        "kind": result.kind,
        "status": result.status,
        "outcome": result.outcome,
        "acting": list(result.acting),
        "settings": plain(result.settings),
        "audit": audit_numbers(result),
        "audit_lines": list(result.audit_lines),
        "warnings": list(result.warnings),
        "sources": list(result.sources),
        "measured_from": result.measured_from,
        "wall_time_s": result.wall_time,
        **numbers(result),
    }
