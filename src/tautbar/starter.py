"""A small commented model to start from."""

from __future__ import annotations

from pathlib import Path

from tautbar.errors import InputError

STARTER = Path(__file__).with_name("starter.toml")


def write_starter(path: str | Path = "model.toml") -> Path:
    """Write a small commented model that can be checked and run as it is.

    Parameters
    ----------
    path
        The file to write; its folder must exist.

    Returns
    -------
    Path
        The file written.

    Raises
    ------
    InputError
        If the file exists already, or cannot be written.
    """
    path = Path(path)
    try:
        with path.open("x", encoding="utf-8", newline="\n") as file:
            file.write(STARTER.read_text(encoding="utf-8"))
    except FileExistsError:
        raise InputError(f"{path} exists already and is left as it is; give another name") from None
    except OSError as error:
        raise InputError(f"{path} cannot be written: {error.strerror}") from error
    return path
