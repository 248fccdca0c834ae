"""The results file as it is written: aside, piece by piece, and put in place when whole."""

from __future__ import annotations

import os
from collections.abc import Iterator, Mapping
from contextlib import contextmanager, suppress
from pathlib import Path

import h5py

from tautbar.errors import InputError, ResultsError
from tautbar.records.fields import Field, Record
from tautbar.records.frames import Frame, Marching
from tautbar.store.arrays import as_json, room_for, text_list, write_fields
from tautbar.store.aside import FULL, AsideFile, DiskFull, undisturbed
from tautbar.store.description import JobDescription
from tautbar.store.layout import FORMAT, LIBRARY_VERSIONS, stored_name
from tautbar.store.streams import HistoryStream

MARGIN = 4 << 20  # bytes kept free for what HDF5 writes about the data and for the closing
NOT_RESULTS = {".toml", ".csv"}


class ResultsWriter:
    """Builds one results file under a passing name beside ``path``.

    Parameters
    ----------
    path
        Where the whole file is put. One that is there is kept as ``NAME.previous.h5``, unless
        ``overwrite`` and it is a results file; what is not one is always kept.

    Raises
    ------
    InputError
        If nothing can be written there.
    ResultsError
        From any method, if the disk fails; DiskFull if it is full.
    """

    def __init__(self, path: Path | str, *, overwrite: bool = False) -> None:
        self.path = _destination(Path(path))
        self._overwrite = overwrite
        self._aside = AsideFile(self.path.with_name(self.path.name + ".tmp"))
        try:
            self._aside.reserve(MARGIN)
            # no cache of chunks: they come whole, and what waits in a cache has no room on the disk yet
            self._file = h5py.File(self._aside, "w", libver=LIBRARY_VERSIONS, rdcc_nbytes=0)
        except BaseException:
            self._aside.discard()
            raise

    def start(self, job: JobDescription) -> None:
        """Write what is known before the first analysis."""
        self._reserve(job.size)
        with self._writing():
            job.write(self._file)

    def add(self, record: Record) -> None:
        """Write a whole record. Where there is no room for its fields it is not begun."""
        if record.fields:
            self._reserve(room_for(record.fields.values()))
        with self._writing():
            _write_record(self._group(record.name), record)

    def stream(self, marching: Marching) -> Iterator[Frame]:
        """Hand the frames on, writing them block by block; `finish` ends it, however it went."""
        with self._writing():
            group = self._group(marching.name)
            group.attrs["status"] = "running"
            self._stream = HistoryStream(group, marching)
        self._reserve(2 * self._stream.block_size)  # the peaks at the end included
        for frame in marching.frames():
            if self._stream.add(frame):
                with self._writing():
                    self._stream.write()
                self._reserve(2 * self._stream.block_size)  # the peaks at the end included
            yield frame

    def finish(self, record: Record) -> None:
        """Write the last steps of the history at hand and the rest of its record."""
        with self._writing():
            _write_record(self._group(record.name), record)  # may name the axes of the steps
            self._stream.finish()

    def publish(self) -> None:
        """Close the file and put it in place."""
        with self._writing():
            self._file.close()
        with self._writing():
            self._aside.put_in_place(self.path, self._keep_as())

    def discard(self) -> None:
        """Throw away what was written."""
        with suppress(Exception):
            self._file.close()
        self._aside.discard()

    def _group(self, name: str) -> h5py.Group:
        return self._file.require_group(f"analyses/{stored_name(name)}")

    def _reserve(self, size: int) -> None:
        self._aside.reserve(size + MARGIN)

    @contextmanager
    def _writing(self) -> Iterator[None]:
        with undisturbed():
            try:
                yield
            except OSError as wrong:
                raise _trouble(self.path, self._aside.failure or wrong) from wrong
            if self._aside.failure is not None:
                raise _trouble(self.path, self._aside.failure)

    def _keep_as(self) -> Path | None:
        if not self.path.exists() or (self._overwrite and is_results_file(self.path)):
            return None
        return _previous(self.path)


def is_results_file(path: Path) -> bool:
    """Whether a file is one that this program wrote."""
    try:
        with h5py.File(path, "r") as file:
            return bool(file.attrs.get("format") == FORMAT)
    except OSError:
        return False


def _destination(path: Path) -> Path:
    """The file itself, links followed. Raises InputError where no results file can be."""
    real = Path(os.path.realpath(path))
    if real.suffix.lower() in NOT_RESULTS:
        raise InputError(f"{path}: a results file is HDF5; give it a name that ends in .h5")
    if real.is_dir():
        raise InputError(f"{path}: this is a folder; give the name of a results file")
    if not real.parent.is_dir():
        raise InputError(f"{path}: there is no folder {path.parent}")
    return real


def _previous(path: Path) -> Path:
    """Where to keep the file that is there: never over something that is no results file."""
    number = 1
    while True:
        mark = ".previous" if number == 1 else f".previous-{number}"
        kept = path.with_name(path.stem + mark + path.suffix)
        if not kept.exists() or (is_results_file(kept) and is_results_file(path)):
            return kept
        number += 1


def _trouble(path: Path, wrong: OSError) -> ResultsError:
    if wrong.errno in FULL:
        return DiskFull(f"{path.parent}: the disk is full; {path.name} was not written")
    return ResultsError(f"{path}: cannot be written ({wrong.strerror or wrong})")


def _write_record(group: h5py.Group, record: Record) -> None:
    for key in ("kind", "status", "outcome", "measured_from", "wall_time"):
        group.attrs[key] = getattr(record, key)
    for key in ("acting", "audit_lines", "warnings", "sources"):
        group.attrs[key] = text_list(getattr(record, key))
    group.attrs["settings"] = as_json(record.settings)
    write_fields(group, _with_loading_names(record.fields))


def _with_loading_names(fields: Mapping[str, Field]) -> Mapping[str, Field]:
    """The names of the loadings label the axis "loading"."""
    if "loads" not in fields or "loading" in fields:
        return fields
    return {"loading": fields["loads"], **fields}
