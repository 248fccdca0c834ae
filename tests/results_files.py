"""Results files of the made-up mast, written without a run."""

from __future__ import annotations

from pathlib import Path

from fake_mast import FakeHistory, FakeMast
from tautbar.records.fields import Record
from tautbar.store import JobDescription, ResultsWriter


def describe(mast: FakeMast) -> JobDescription:
    return JobDescription(
        title="Tide-gauge mast",
        text='title = "Tide-gauge mast"  # Orrin Quay, invented\n',
        tables={"tables/legs.csv": "name,start,end\n"},
        model_fields=mast.model_fields,
        settings={"only": ()},
        warnings=("a warning",),
        program="tautbar test",
    )


def write(path: Path, mast: FakeMast, *items: Record | FakeHistory, overwrite: bool = False) -> Path:
    """A file with these records and histories; its path."""
    writer = ResultsWriter(path, overwrite=overwrite)
    try:
        writer.start(describe(mast))
        for item in items:
            if isinstance(item, Record):
                writer.add(item)
            else:
                list(writer.stream(item))
                writer.finish(item.record())
        writer.publish()
    except BaseException:
        writer.discard()
        raise
    return path
