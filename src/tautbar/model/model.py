"""A whole model as users hold it: its parts, its words, and the places of both in its file."""

from __future__ import annotations

from collections.abc import Mapping
from os import PathLike, fspath
from types import MappingProxyType
from typing import Any

from tautbar.errors import Mistake
from tautbar.model.advice import warnings_of
from tautbar.model.building import Built, build
from tautbar.model.echo import echo_of
from tautbar.model.inlining import inlined
from tautbar.model.parts import Parts
from tautbar.model.prestress import drawn_lengths
from tautbar.model.source import Place, Source
from tautbar.model.writing import to_toml


class Model:
    """A checked model. Built from Python with the words of the model file, or by `read_model`.

    Parameters
    ----------
    **words
        The tables of the model file: ``Model(joints={"A": [0, 0, 0]}, members=[...], ...)``. Tuples
        and arrays may stand for lists, and None for what is not given.

    Attributes
    ----------
    parts : Parts
        Joints, members and everything else, in SI.
    warnings : tuple of str
        What is probably not meant; the run goes on.
    echo : tuple of str
        The largest force, length and mass as understood.

    Raises
    ------
    ModelError
        With every mistake in the words.
    """

    __slots__ = ("_source", "_text", "echo", "parts", "warnings")
    parts: Parts
    warnings: tuple[str, ...]
    echo: tuple[str, ...]
    _source: Source
    _text: str

    def __init__(self, **words: Any) -> None:
        self._fill(Source(_plain(words)))

    @classmethod
    def from_source(cls, source: Source) -> Model:
        """The model that a text and its tables say. Raises `ModelError`."""
        model = cls.__new__(cls)
        model._fill(source)
        return model

    def _fill(self, source: Source) -> None:
        built: Built = build(source)
        lengths = drawn_lengths(built.parts)
        for name, value in (
            ("_source", source),
            ("_text", source.text if source.text is not None else to_toml(source.words)),
            ("parts", built.parts),
            ("warnings", warnings_of(built.parts, lengths)),
            ("echo", echo_of(built.parts, lengths)),
        ):
            object.__setattr__(self, name, value)

    def __setattr__(self, name: str, value: object) -> None:
        raise AttributeError(f"a Model does not change ('{name}'): build another from its words")

    def __reduce__(self) -> tuple[Any, ...]:
        return _again, (self._source,)

    def __repr__(self) -> str:
        joints, members = len(self.parts.joints), len(self.parts.members)
        return f"<Model '{self.name}': {joints} joints, {members} members>"

    @property
    def words(self) -> Mapping[str, Any]:
        """The model in the words and units of its file."""
        return MappingProxyType(dict(self._source.words))

    @property
    def text(self) -> str:
        """TOML text: the file's own, or written from the words."""
        return self._text

    @property
    def files(self) -> Mapping[str, str]:
        """Texts of the CSV tables by the names the model gives them."""
        return MappingProxyType(self._source.files)

    @property
    def name(self) -> str:
        """Stem of the file's name, or "model"."""
        return self._source.name

    @property
    def folder(self) -> str:
        """Folder of the file; "" where there is none."""
        return self._source.folder

    def place(self, *path: str | int) -> Place:
        """Where something stands: ``place("analyses", "in service", "geometry")``.

        Entries of lists are given by name or by position from 0; members and joints by name.
        """
        return self._source.place(path)

    def mistake(self, path: tuple[str | int, ...], what: str, hint: str = "") -> Mistake:
        """A mistake at a path, with its file, line and column."""
        return self.place(*path).mistake(what, hint)

    def to_toml(self) -> str:
        """The model as one TOML text, CSV tables written into it."""
        return to_toml(inlined(self._source))


def _again(source: Source) -> Model:
    return Model.from_source(source)


def _plain(value: Any) -> Any:
    """Python data as TOML has it: lists for tuples and arrays, text for paths, no None in tables."""
    if isinstance(value, Mapping):
        return {str(key): _plain(item) for key, item in value.items() if item is not None}
    if hasattr(value, "tolist"):  # an array, or a number out of one
        return _plain(value.tolist())
    if isinstance(value, PathLike):
        return fspath(value)
    if isinstance(value, list | tuple | range):
        return [_plain(item) for item in value]
    return value
