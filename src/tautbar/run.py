"""One job from end to end: the only place where analyses, results file and progress meet."""

from __future__ import annotations

import time
from collections.abc import Callable, Iterable, Sequence
from dataclasses import replace
from importlib.metadata import version
from pathlib import Path
from typing import TYPE_CHECKING, Protocol

from tautbar.errors import AnalysisFailed, ResultsError, TautbarError
from tautbar.progress import Shows, Silent
from tautbar.records.fields import Record

if TYPE_CHECKING:
    from tautbar.model import Model
    from tautbar.model.parts import Analysis
    from tautbar.records.frames import Marching
    from tautbar.store import Results, ResultsWriter


class Job(Protocol):
    """The part of a prepared job that is needed here."""

    def run(self, name: str) -> Record | Marching: ...


def run(
    model: Model,
    path: Path | str | None = None,
    *,
    only: Iterable[str] = (),
    overwrite: bool = False,
    progress: Shows | None = None,
    on_record: Callable[[Record], object] | None = None,
) -> Results:
    """Do the analyses of a model in order and write the results file.

    An analysis that fails is written as failed, and those that do not start from it still run. When
    the run is interrupted or the disk is full, what was finished is in the file all the same.

    Parameters
    ----------
    model
        A checked model.
    path
        The results file; by default the model's name with ``.h5``, beside the model. A file that is
        there is kept as ``NAME.previous.h5``.
    only
        Names of the analyses to do; those they start from come along. All by default.
    overwrite
        Whether a results file that is there may be replaced.
    progress
        Shows how far the job is; nothing by default.
    on_record
        Called with the record of each analysis when it is done.

    Returns
    -------
    Results
        The results file, open for reading.

    Raises
    ------
    ModelError
        If the model cannot be analysed at all, such as a mechanism under small geometry.
    InputError
        If an analysis is not in the model, or no file can be written at ``path``.
    ResultsError
        If the disk is full or fails.
    """
    from tautbar.analyses.job import prepare
    from tautbar.store import JobDescription, ResultsWriter, open_results

    only = tuple(only)
    analyses = choose(model.parts.analyses, only)
    job = prepare(model)
    description = JobDescription(
        title=model.parts.title or model.name,
        text=model.text,
        tables=model.files,
        model_fields=job.model_fields,
        settings={"only": only},
        warnings=(*model.warnings, *job.warnings),
        program=f"tautbar {version('tautbar')}",
    )
    place = Path(model.folder or ".") / f"{model.name}.h5" if path is None else path
    writer = ResultsWriter(place, overwrite=overwrite)
    try:
        writer.start(description)
        stop = _Run(job, writer, progress or Silent(), on_record).all(analyses)
        writer.publish()
    except BaseException:
        writer.discard()
        raise
    if stop is not None:
        raise _told(stop, writer.path)
    return open_results(writer.path)


def choose(analyses: Sequence[Analysis], only: Sequence[str]) -> list[Analysis]:
    """The analyses named and all they start from, in the order of the model."""
    from tautbar.store.layout import UnknownName

    by_name = {analysis.name: analysis for analysis in analyses}
    wanted: set[str] = set()
    waiting = list(only or by_name)
    while waiting:
        name = waiting.pop()
        if name not in by_name:
            raise UnknownName("analysis", name, by_name)
        if name not in wanted:
            waiting += _needed(by_name[name])
        wanted.add(name)
    return [analysis for analysis in analyses if analysis.name in wanted]


def _needed(analysis: Analysis) -> list[str]:
    """Names of the analyses whose state one starts from: one or none."""
    start = analysis.start
    return [] if start is None or start.as_drawn else [start.analysis]


class _Run:
    """The loop over the analyses."""

    def __init__(
        self, job: Job, writer: ResultsWriter, shows: Shows, on_record: Callable[[Record], object] | None
    ) -> None:
        self._job, self._writer, self._shows = job, writer, shows
        self._on_record = on_record or (lambda record: None)
        self._statuses: dict[str, str] = {}

    def all(self, analyses: Sequence[Analysis]) -> BaseException | None:
        """Do each in turn; what stopped it before the end, if anything did."""
        for k, analysis in enumerate(analyses):
            stop = self._guarded(analysis)
            if stop is not None:
                for later in analyses[k + 1 :]:
                    self._writer.add(_not_run(later, "the run ended before it"))
                return stop
        return None

    def _guarded(self, analysis: Analysis) -> BaseException | None:
        try:
            return self._one(analysis)
        except BaseException as wrong:  # Ctrl-C between two pieces of work, or a fault in showing
            if analysis.name not in self._statuses:
                self._writer.add(_record_of(analysis, wrong))
            return wrong

    def _one(self, analysis: Analysis) -> BaseException | None:
        """Do one analysis; what ends the whole run, if anything does."""
        for needed in _needed(analysis):
            if self._statuses[needed] != "complete":
                record = _not_run(analysis, f'it starts from "{needed}", which is not complete')
                self._writer.add(record)
                self._done(record)
                return None
        self._shows.start(analysis.name, getattr(analysis, "duration", None), "s")
        record, stop = self._compute(analysis)
        self._shows.finish("done" if record.status == "complete" else record.status)
        self._done(record)
        return stop if _ends_the_run(stop) else None

    def _compute(self, analysis: Analysis) -> tuple[Record, BaseException | None]:
        """Run and write one analysis; its record, and what cut it short, if anything did."""
        begun = time.monotonic()
        stop: BaseException | None = None
        try:
            found = self._job.run(analysis.name)
            if isinstance(found, Record):
                found = replace(found, wall_time=time.monotonic() - begun)
                self._writer.add(found)
        except BaseException as wrong:
            stop, found = wrong, replace(_record_of(analysis, wrong), wall_time=time.monotonic() - begun)
            self._writer.add(found)
        if isinstance(found, Record):
            return found, stop
        return self._march(analysis, found, begun)

    def _march(
        self, analysis: Analysis, marching: Marching, begun: float
    ) -> tuple[Record, BaseException | None]:
        from tautbar.store import undisturbed

        stop: BaseException | None = None
        try:
            for frame in self._writer.stream(marching):
                self._shows.to(frame.time)
        except BaseException as wrong:
            stop = wrong
        with undisturbed():  # a second Ctrl-C waits until what was found is written
            try:
                record = _with_reason(marching.record(None if stop is None else _status(stop)), stop)
            except Exception as wrong:
                stop, record = wrong, _record_of(analysis, wrong)
            record = replace(record, wall_time=time.monotonic() - begun)
            self._writer.finish(record)
        return record, stop

    def _done(self, record: Record) -> None:
        self._statuses[record.name] = record.status
        self._on_record(record)


def _status(stop: BaseException) -> str:
    from tautbar.store import DiskFull

    return "interrupted" if isinstance(stop, KeyboardInterrupt | SystemExit | DiskFull) else "failed"


def _ends_the_run(stop: BaseException | None) -> bool:
    """Whether the later analyses are in vain: not after one that merely failed."""
    return stop is not None and (not isinstance(stop, TautbarError) or isinstance(stop, ResultsError))


def _reason(stop: BaseException) -> str:
    if isinstance(stop, KeyboardInterrupt | SystemExit):
        return "interrupted"
    if isinstance(stop, TautbarError):
        return str(stop)
    return f"stopped by a fault in this program ({type(stop).__name__}: {stop})"


def _record_of(analysis: Analysis, stop: BaseException) -> Record:
    """The record of an analysis that gave none of its own."""
    if isinstance(stop, AnalysisFailed) and isinstance(stop.record, Record):
        return stop.record
    return Record(analysis.name, analysis.kind, _status(stop), _reason(stop))


def _with_reason(record: Record, stop: BaseException | None) -> Record:
    """The record of a history with what cut it short said first."""
    if stop is None or _reason(stop) in record.outcome:
        return record
    return replace(record, outcome=f"{_reason(stop)}; {record.outcome}")


def _not_run(analysis: Analysis, why: str) -> Record:
    return Record(analysis.name, analysis.kind, "not run", f"not run: {why}")


def _told(stop: BaseException, path: Path) -> BaseException:
    """What stopped the run, saying where to find what was finished."""
    if isinstance(stop, ResultsError):
        return ResultsError(f"{stop}; what was finished is in {path}")
    return stop
