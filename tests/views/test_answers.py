"""Answers as text and as JSON."""

from __future__ import annotations

import json
from dataclasses import replace

import pytest

from fake_mast import FakeHistory, FakeMast, modes_record, static_record
from results_files import write
from tautbar.records.fields import Record
from tautbar.store import open_results
from tautbar.views.answers import answer_text, as_json

MAST = FakeMast()
RECORD = Record(
    "service",
    "static",
    "complete",
    "2 loadings in balance\n  largest  12.0 mm   at C",
    acting=("dead", "dead + wind"),
    audit_lines=("force residual 1e-12", "stable: no negative pivot"),
    warnings=("stay-3 is nearly slack",),
)


def test_text_of_a_complete_analysis() -> None:
    assert answer_text(RECORD) == (
        "service (static)\n"
        "  2 loadings in balance\n"
        "    largest  12.0 mm   at C\n"
        "  acts:    dead\n"
        "           dead + wind\n"
        "  audit:   force residual 1e-12\n"
        "           stable: no negative pivot\n"
        "  warning: stay-3 is nearly slack"
    )


@pytest.mark.parametrize("status", ["failed", "interrupted", "not run"])
def test_what_is_not_complete_says_so_first(status) -> None:
    assert answer_text(replace(RECORD, status=status)).startswith(f"{status.upper()}: service (static)\n")


def test_nothing_is_said_about_nothing() -> None:
    assert answer_text(Record("a", "modes", "complete", "none")) == "a (modes)\n  none"


def test_long_lines_are_broken_and_long_lists_counted() -> None:
    record = replace(RECORD, outcome="word " * 60, acting=tuple(f"wind {k}" for k in range(30)))
    text = answer_text(record)
    assert max(map(len, text.splitlines())) <= 100
    assert text.count("word") == 60
    assert "wind 7\n           and 22 more\n" in text


def test_a_file_gives_the_same_text_as_the_record(tmp_path) -> None:
    with open_results(write(tmp_path / "a.h5", MAST, RECORD)) as results:
        assert answer_text(results["service"]) == answer_text(RECORD)


def test_json_has_the_answers_and_no_not_a_number(tmp_path) -> None:
    loose = FakeHistory(MAST, steps=15, duration=0.15)  # ends with guys still slack
    with open_results(
        write(tmp_path / "a.h5", MAST, static_record(MAST), modes_record(MAST), loose)
    ) as results:
        static, modes, history = [
            json.loads(json.dumps(as_json(r), allow_nan=False)) for r in results.values()
        ]
    assert static["axial_force_n"]["guy-6-1"]["least"] == 0.0
    assert (
        static["axial_force_n"]["guy-6-1"]["greatest"]
        == MAST.forces(-0.2)[list(MAST.members).index("guy-6-1")]
    )
    assert static["audit"]["force_residual"] == [1e-12] * 3
    assert (static["status"], static["settings"]) == ("complete", {"geometry": "large", "tolerance": 1e-9})
    assert modes["frequency_hz"] == [1.9, 4.7]
    assert "axial_force_n" not in modes
    row = history["slack"][0]
    assert set(row) == {"member", "start_s", "end_s", "snatch_force_n", "time_of_snatch_s"}
    assert row["member"].startswith("guy-")
