"""Reading a model file and its tables."""

from __future__ import annotations

import tomllib
from collections.abc import Mapping
from os import PathLike
from pathlib import Path

from tautbar.errors import InputError, ModelError
from tautbar.model.model import Model
from tautbar.model.slips import syntax_mistake
from tautbar.model.source import Source


def read_model(path: str | PathLike[str]) -> Model:
    """Read and check a model file.

    Parameters
    ----------
    path
        A TOML file in UTF-8; its CSV tables are looked for beside it.

    Raises
    ------
    InputError
        The file is absent, cannot be read, or is not UTF-8.
    ModelError
        The model is wrong; ``mistakes`` holds every mistake.
    """
    file = Path(path)
    try:
        raw = file.read_bytes()
    except OSError as error:
        raise InputError(f"{path}: cannot be read: {error.strerror}") from error
    try:
        text = raw.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        line = raw.count(b"\n", 0, error.start) + 1
        what = f"is not in UTF-8: the byte 0x{raw[error.start]:02x} does not belong (save it as UTF-8)"
        raise InputError(f"{path}:{line}: {what}") from error
    return model_from_text(text, file=str(path))


def model_from_text(text: str, files: Mapping[str, str] | None = None, file: str = "") -> Model:
    """The model that a TOML text says.

    Parameters
    ----------
    text
        The text of a model file.
    files
        Texts of its CSV tables by the names the model gives them; others are read from beside
        ``file``.
    file
        Path of the text, for messages, for the model's name and for the folder of its tables.

    Raises
    ------
    ModelError
        The model is wrong; ``mistakes`` holds every mistake.
    """
    try:
        words = tomllib.loads(text)
    except tomllib.TOMLDecodeError as error:
        raise ModelError([syntax_mistake(text, file, error)]) from error
    where = Path(file)
    return Model.from_source(
        Source(words, where.stem or "model", file, str(where.parent), text, dict(files or {}))
    )
