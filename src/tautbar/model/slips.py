"""A text that is no TOML: where it stops being so, and a hint for the usual slips."""

from __future__ import annotations

import re
import tomllib

from tautbar.errors import Mistake

_NUMBER = r"[-+]?[\d.]+(?:[eE][-+]?\d+)?"
_BEFORE = r"(?:[=,\[{]\s*)"  # a value begins
_SLIPS = (
    (rf"=\s*{_NUMBER}\s*,\s*\d", "write decimals with a point"),
    (rf"{_BEFORE}[-+]?\.\d", "write a digit before the point, 0.5"),
    (rf"{_BEFORE}[-+]?\d+\.\s*(?:$|[#,\]}}])", "write a digit after the point, 5.0"),
    (rf"{_BEFORE}{_NUMBER}\s*[A-Za-zµ%°]", 'put a quantity with a unit in quotes, "12 mm"'),
    (rf"{_BEFORE}(?:True|False|TRUE|FALSE)\b", "write true or false in lower case"),
    (r"\"[^\"]*\\", "in a path write / or use single quotes"),
    (rf"{_BEFORE}[A-Za-z]", "put text in quotes"),
    (r"^\s*[\w.\"-]+\s*:", "write = between key and value"),
    (r"^\s*[\w-]+\s+[\w-]+.*=", "put a key that has spaces in quotes"),
)
_TWICE = re.compile(r"Cannot (?:overwrite|declare|redefine|mutate)", re.I)


def syntax_mistake(text: str, file: str, error: tomllib.TOMLDecodeError) -> Mistake:
    """The mistake that made `tomllib` stop, with its line and a hint."""
    message = str(error)
    place = re.search(r"\(at line (\d+), column (\d+)\)", message)
    what = re.sub(r" *\(at .*\)$", "", message)
    lines = text.replace("\r\n", "\n").split("\n")
    if place:
        line, column = int(place[1]), int(place[2])
    else:  # at the end of the document
        line = max((i for i, shown in enumerate(lines, 1) if shown.strip()), default=1)
        column = len(lines[line - 1]) + 1
    shown = lines[line - 1]
    if _TWICE.match(what):
        what = f"a name is used twice: {what[0].lower()}{what[1:]}"
    return Mistake("", what, _hint(shown, what), file, line, column, shown)


def _hint(line: str, what: str) -> str:
    if "twice" in what:
        return "each key and each [table] may stand once; a list of tables has [[double brackets]]"
    bare = line.split("#", 1)[0].rstrip() if '"' not in line else line
    for pattern, advice in _SLIPS:
        if re.search(pattern, bare):
            return advice
    return ""
