"""What a results file says of the whole job."""

from __future__ import annotations

import datetime
import hashlib
import platform
import uuid
from collections.abc import Iterable, Mapping
from importlib.metadata import version

import h5py
import numpy as np

from tautbar.records.fields import Field
from tautbar.store.arrays import as_json, put, put_scale, room_for, text_list, write_fields
from tautbar.store.layout import CONVENTIONS, DIRECTIONS, ENDS, FORMAT, FORMAT_VERSION, stored_name


class JobDescription:
    """What a results file says of the whole job: the model, where it came from, what ran it.

    Parameters
    ----------
    title, text, tables
        Title of the model, its TOML text, and its CSV tables by the name the model gives them.
    model_fields
        Fields of the group ``model``; ``joints/name`` and ``members/name`` name the shared axes.
    settings, warnings
        Of the job.
    program
        Name and version of this program.
    """

    def __init__(
        self,
        *,
        title: str,
        text: str,
        tables: Mapping[str, str],
        model_fields: Mapping[str, Field],
        settings: Mapping[str, object],
        warnings: Iterable[str],
        program: str,
    ) -> None:
        self._root = {
            "format": FORMAT,
            "format_version": FORMAT_VERSION,
            "title": title,
            "created": datetime.datetime.now(datetime.UTC).isoformat(timespec="seconds"),
            "program": program,
            "versions": as_json(_versions()),
            "run_id": uuid.uuid4().hex,
            "Conventions": CONVENTIONS,
        }
        self._text, self._tables = text, dict(tables)
        self._fields = dict(model_fields)
        self._settings, self._warnings = settings, tuple(warnings)

    @property
    def size(self) -> int:
        """Bytes it takes, about."""
        texts = len(self._text) + sum(len(t) for t in self._tables.values())
        return 4 * texts + room_for(self._fields.values())

    def write(self, file: h5py.File) -> None:
        """Write the root attributes, the shared scales, the provenance and the model."""
        for key, value in self._root.items():
            file.attrs[key] = value
        put_scale(file, "direction", np.array(DIRECTIONS), "1", "direction")
        put_scale(file, "end", np.array(ENDS), "1", "end of a member")
        for axis, path in (("joint", "joints/name"), ("member", "members/name")):
            put_scale(file, axis, self._fields[path].values, "1", f"names of the {axis}s")
        self._write_provenance(file.create_group("provenance"))
        write_fields(file.create_group("model"), self._fields)
        file.create_group("analyses", track_order=True)  # in the order in which they were done

    def _write_provenance(self, group: h5py.Group) -> None:
        group.attrs["settings"] = as_json(self._settings)
        group.attrs["platform"] = f"{platform.platform()}, Python {platform.python_version()}"
        group.attrs["warnings"] = text_list(self._warnings)
        _put_text(group, "model", self._text, "text of the model")
        for name, text in self._tables.items():
            _put_text(group, f"tables/{stored_name(name)}", text, f"table {name} of the model")


def _put_text(group: h5py.Group, path: str, text: str, long_name: str) -> None:
    dataset = put(group, path, text, "1", long_name)
    dataset.attrs["sha256"] = hashlib.sha256(text.encode()).hexdigest()


def _versions() -> dict[str, str]:
    packages = {name: version(name) for name in ("numpy", "scipy", "h5py")}
    return {"python": platform.python_version(), **packages, "hdf5": h5py.version.hdf5_version}
