"""Names and constants of the results file, format 1."""

from __future__ import annotations

import difflib
from collections.abc import Iterable

from tautbar.errors import InputError

FORMAT = "tautbar results"
FORMAT_VERSION = 1
LIBRARY_VERSIONS = ("v110", "v110")  # newer layouts are not read by some other programs
CONVENTIONS = "CF-1.8"
DIVISION_SLASH = "\u2215"  # stands for "/" in a name, which would open a group in HDF5
BLOCK = 64  # stored steps written at once, and in a chunk
CHUNK_VALUES = 1024  # values of a step in a chunk, at most
DIRECTIONS = ("x", "y", "z")
ENDS = ("start", "end")


def stored_name(name: str) -> str:
    """A name as it stands in the file."""
    return name.replace("/", DIVISION_SLASH)


def given_name(name: str) -> str:
    """A name of the file as the engineer gave it."""
    return name.replace(DIVISION_SLASH, "/")


class UnknownName(InputError, KeyError):
    """A name that is not there; the message gives those that are near or all of them."""

    def __init__(self, thing: str, name: object, known: Iterable[str]) -> None:
        names = list(known)
        near = difflib.get_close_matches(str(name), names, n=3, cutoff=0.5)
        if near:
            hint = "did you mean " + " or ".join(f'"{n}"' for n in near) + "?"
        elif len(names) <= 12:
            hint = "there is " + (", ".join(f'"{n}"' for n in names) or "none")
        else:
            hint = f"there are {len(names)}, such as " + ", ".join(f'"{n}"' for n in names[:3])
        self.message = f'no {thing} "{name}" ({hint})'
        super().__init__(self.message)

    def __str__(self) -> str:
        return self.message
