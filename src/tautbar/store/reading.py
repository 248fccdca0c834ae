"""Opening a results file; nothing is read before it is asked for."""

from __future__ import annotations

import errno
import os
import tomllib
from collections.abc import Iterator, Mapping
from functools import cached_property
from pathlib import Path
from types import MappingProxyType, TracebackType
from typing import Any

import h5py
import numpy as np
from numpy.typing import NDArray

from tautbar.errors import InputError, ResultsError
from tautbar.store.layout import DIRECTIONS, FORMAT, FORMAT_VERSION, UnknownName, given_name, stored_name
from tautbar.store.result import Result, texts

CACHE = 32 << 20  # bytes of chunks kept in memory for each dataset


class Results(Mapping[str, Result]):
    """An open results file: its analyses by name, and the model they are of.

    Use it in a ``with`` statement, or call `close`. Positions are [m] in the directions x, y, z;
    ``ends`` counts joints from 0.
    """

    def __init__(self, file: h5py.File, path: Path) -> None:
        self.file = file
        self.path = path
        self.title = str(file.attrs["title"])
        self.run_id = str(file.attrs["run_id"])
        self.created = str(file.attrs["created"])
        self.program = str(file.attrs["program"])

    def __getitem__(self, name: str) -> Result:
        group = self.file["analyses"].get(stored_name(name))
        if group is None:
            raise UnknownName("analysis", name, self)
        return Result(group, self)

    def __iter__(self) -> Iterator[str]:
        """Names in the order in which the analyses were done."""
        return map(given_name, self.file["analyses"])

    def __len__(self) -> int:
        return len(self.file["analyses"])

    def __enter__(self) -> Results:
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        self.close()

    def __repr__(self) -> str:
        state = "open" if self.file else "closed"
        return f"<Results {self.path.name} ({state}): {self.title}>"

    def close(self) -> None:
        """Close the file; what was read stays."""
        self.file.close()

    @cached_property
    def joints(self) -> tuple[str, ...]:
        """Names of the joints."""
        return texts(self.file["joint"])

    @cached_property
    def members(self) -> tuple[str, ...]:
        """Names of the members."""
        return texts(self.file["member"])

    @cached_property
    def groups(self) -> Mapping[str, tuple[str, ...]]:
        """Names of the members of each group; a member in none stands in the file under its own name."""
        groups: dict[str, list[str]] = {}
        for member, group in zip(self.members, texts(self.file["model/members/group"]), strict=True):
            if group not in ("", member):
                groups.setdefault(group, []).append(member)
        return MappingProxyType({group: tuple(members) for group, members in groups.items()})

    @cached_property
    def ropes(self) -> Mapping[str, tuple[str, ...]]:
        """Names of the pieces of each rope that the model has in pieces: ties that hang on each other."""
        place = {name: k for k, name in enumerate(self.members)}
        ties = np.asarray(self.model("members/kind")) == "tension-only"
        ropes = {}
        for name, members in self.groups.items():
            pieces = [place[member] for member in members]
            chained = (self.ends[pieces[:-1], 1] == self.ends[pieces[1:], 0]).all() and len(pieces) > 1
            numbered = members == tuple(f"{name}.{k}" for k in range(1, len(members) + 1))
            if numbered and chained and ties[pieces].all():
                ropes[name] = members
        return MappingProxyType(ropes)

    @cached_property
    def up(self) -> int:
        """The direction that is up: 0, 1 or 2 for x, y, z."""
        words = tomllib.loads(self.model_text)
        plane = str(words.get("plane", "xyz"))
        return DIRECTIONS.index(str(words.get("up", plane[-1])))

    @cached_property
    def positions(self) -> NDArray[np.float64]:
        """Where the model puts the joints, (J, 3) [m]."""
        return np.asarray(self.file["model/joints/position"][:], dtype=float)

    @cached_property
    def ends(self) -> NDArray[np.int64]:
        """Joints at the start and end of each member, (N, 2)."""
        return np.asarray(self.file["model/members/ends"][:], dtype=np.int64)

    @property
    def model_text(self) -> str:
        """The model as it was read."""
        return str(self.file["provenance/model"].asstr()[()])

    @property
    def tables(self) -> Mapping[str, str]:
        """The CSV tables of the model by the name it gives them."""
        tables = self.file["provenance"].get("tables", {})
        return {given_name(name): str(table.asstr()[()]) for name, table in tables.items()}

    @property
    def warnings(self) -> tuple[str, ...]:
        """What the engineer should know about the model."""
        return texts(self.file["provenance"].attrs["warnings"])

    def model(self, path: str) -> Any:
        """Values of a dataset of the model, e.g. ``"members/unstressed_length"``; text as strings."""
        dataset = self.file.get(f"model/{path}")
        if not isinstance(dataset, h5py.Dataset):
            raise UnknownName("dataset of the model", path, _paths(self.file["model"]))
        return np.array(texts(dataset)) if h5py.check_string_dtype(dataset.dtype) else dataset[()]


def open_results(path: Path | str) -> Results:
    """Open a results file for reading.

    Raises
    ------
    InputError
        If there is no such file, it is no results file, or it is of a newer format.
    ResultsError
        If it is damaged.
    """
    path = Path(path)
    file = _open(path)
    try:
        _check(file, path)
        return Results(file, path)
    except BaseException:
        file.close()
        raise


def _open(path: Path) -> h5py.File:
    if not path.exists():
        raise InputError(f"{path}: there is no such file")
    if path.is_dir():
        raise InputError(f"{path}: this is a folder; give the name of a results file")
    if not os.access(path, os.R_OK):
        raise InputError(f"{path}: may not be read ({os.strerror(errno.EACCES)})")
    if not h5py.is_hdf5(path):
        raise InputError(f"{path}: this is no results file (not HDF5)")
    try:
        return h5py.File(path, "r", rdcc_nbytes=CACHE)
    except (OSError, RuntimeError) as wrong:
        raise ResultsError(f"{path}: the file is damaged or cut short ({_short(wrong)})") from None


def _check(file: h5py.File, path: Path) -> None:
    try:
        kind, version = file.attrs.get("format"), int(file.attrs.get("format_version", 0))
        whole = kind != FORMAT or all(name in file for name in ("analyses", "joint", "member", "provenance"))
    except (OSError, RuntimeError, KeyError) as wrong:
        raise ResultsError(f"{path}: the file is damaged ({_short(wrong)})") from None
    if kind != FORMAT:
        raise InputError(f"{path}: this is HDF5, but no results file of this program")
    if version > FORMAT_VERSION:
        raise InputError(
            f"{path}: written in format {version} by {file.attrs.get('program', 'a newer version')}; "
            f"this version reads up to format {FORMAT_VERSION}"
        )
    if not whole:
        raise ResultsError(f"{path}: the file is damaged (parts of it are missing)")


def _short(wrong: Exception) -> str:
    """The last words of what HDF5 says."""
    return str(wrong).partition("(")[2].rstrip(")") or str(wrong)


def _paths(group: h5py.Group) -> list[str]:
    paths: list[str] = []
    group.visititems(lambda path, thing: paths.append(path) if isinstance(thing, h5py.Dataset) else None)
    return paths
