"""Histories written block by block, so that memory stays flat however long they are."""

from __future__ import annotations

import math
from typing import Any

import h5py
import numpy as np

from tautbar.records.frames import ENERGY, ENERGY_NAMES, Frame, Marching, StreamedField
from tautbar.store.arrays import attach, describe
from tautbar.store.layout import BLOCK, CHUNK_VALUES

LEDGER_BLOCK = 1024  # steps of the energy ledger written at once, and in a chunk


class _Column:
    """One dataset that grows along its first axis, by blocks that fill its chunks."""

    def __init__(self, group: h5py.Group, path: str, field: StreamedField, block: int = BLOCK) -> None:
        self._rows = np.empty((block, *field.shape), dtype=field.dtype)
        self._axes = field.axes
        self.dataset = group.create_dataset(
            path,
            shape=(0, *field.shape),
            maxshape=(None, *field.shape),
            dtype=field.dtype,
            chunks=(block, *_chunk(field.shape)),
            fletcher32=True,
        )
        describe(self.dataset, field.unit, field.long_name)

    @property
    def block_size(self) -> int:
        """Bytes of a block, the unused part of the last chunk included."""
        spread = math.prod(
            -(-length // chunk) * chunk
            for length, chunk in zip(self.dataset.shape[1:], self.dataset.chunks[1:], strict=True)
        )
        return int(len(self._rows) * spread * self._rows.itemsize)

    def set(self, row: int, values: Any) -> None:
        self._rows[row] = values

    def write(self, count: int) -> None:
        start = self.dataset.shape[0]
        self.dataset.resize(start + count, axis=0)
        self.dataset[start:] = self._rows[:count]

    def attach(self) -> None:
        attach(self.dataset, self._axes)


def _chunk(shape: tuple[int, ...]) -> tuple[int, ...]:
    """Shape of a chunk of one step: whole along the last axes, at most `CHUNK_VALUES` values."""
    room, chunk = CHUNK_VALUES, []
    for length in reversed(shape):
        chunk.append(max(1, min(length, room)))
        room = max(1, room // chunk[-1])
    return tuple(reversed(chunk))


class _Table:
    """Columns that grow together; a row counts once all of it is there."""

    def __init__(self, columns: list[_Column], block: int) -> None:
        self.columns = columns
        self.waiting = 0
        self._block = block

    @property
    def full(self) -> bool:
        return self.waiting == self._block

    def append(self, values: list[Any]) -> None:
        for column, value in zip(self.columns, values, strict=True):
            column.set(self.waiting, value)
        self.waiting += 1

    def write(self) -> None:
        for column in self.columns:
            column.write(self.waiting)
        self.waiting = 0


class HistoryStream:
    """The stored steps and the energy ledger of one history, on their way into the file."""

    def __init__(self, group: h5py.Group, marching: Marching) -> None:
        self._paths = list(marching.streamed)
        time = StreamedField("s", "time of each stored step", ("time",), (), "float64")
        columns = [_Column(group, "time", time)]
        columns += [_Column(group, path, field) for path, field in marching.streamed.items()]
        ledger = [
            StreamedField("s" if name == "time" else "J", ENERGY_NAMES[name], ("time",), (), "float64")
            for name in ENERGY
        ]
        energies = [
            _Column(group, f"energy/{name}", field, LEDGER_BLOCK)
            for name, field in zip(ENERGY, ledger, strict=True)
        ]
        self._steps = _Table(columns, BLOCK)
        self._ledger = _Table(energies, LEDGER_BLOCK)
        self.block_size = sum(column.block_size for column in [*columns, *energies])

    def add(self, frame: Frame) -> bool:
        """Take in a step; whether a block is full and has to be written before the next."""
        if frame.values is not None:
            self._steps.append([frame.time, *(frame.values[path] for path in self._paths)])
        self._ledger.append(list(frame.energy))
        return self._steps.full or self._ledger.full

    def write(self) -> None:
        """Write the blocks that are full."""
        for table in (self._steps, self._ledger):
            if table.full:
                table.write()

    def finish(self) -> None:
        """Write what is left and name the axes."""
        for table in (self._steps, self._ledger):
            table.write()
        for table in (self._steps, self._ledger):
            table.columns[0].dataset.make_scale("time")
        for column in [*self._steps.columns, *self._ledger.columns]:
            column.attach()
