"""A text that is no TOML: where it stops being so, and a hint for the usual slips."""

from __future__ import annotations

import re
import tomllib

from tautbar.errors import Mistake
from tautbar.model.twice import twice

_NUMBER = r"[-+]?[\d.]+(?:[eE][-+]?\d+)?"
_BEFORE = r"(?:[=,\[{]\s*)"  # a value begins
_SLIPS = (
    (r"=\s*\(|[“”‘’]", 'a list has square brackets, [9, 1], and text has straight quotes, "A"'),
    (r"^\s*\[[^\]]*$|^\s*\[\[[^\]]*\]\s*$", "close the brackets: [table], or [[table]] for one of a list"),
    (rf"\[[^\]]*{_NUMBER}\s*;", "separate the values of a list with commas"),
    (r",\s*}", "leave out the comma before the closing brace"),
    (rf"=\s*{_NUMBER}\s*,\s*\d", "write decimals with a point, and lists in square brackets"),
    (rf"{_BEFORE}[-+]?\.\d", "write a digit before the point, 0.5"),
    (rf"{_BEFORE}[-+]?\d+\.\s*(?:$|[#,\]}}])", "write a digit after the point, 5.0"),
    (rf"{_BEFORE}{_NUMBER}\s*[A-Za-zµ%°]", 'put a quantity with a unit in quotes, "12 mm"'),
    (rf"{_BEFORE}(?:True|False|TRUE|FALSE)\b", "write true or false in lower case"),
    (r"\"[^\"]*\\", "in a path write / or use single quotes"),
    (rf"{_BEFORE}[A-Za-z]", "put text in quotes"),
    (r"^\s*[\w.\"-]+\s*:", "write = between key and value"),
    (r"^\s*[\w-]+\s+[\w-]+.*=", "put a key that has spaces in quotes"),
)


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
    again = twice(what, lines, line)
    if again is not None:
        return Mistake("", again.what, again.hint, file, again.line, again.column, lines[again.line - 1])
    shown = lines[line - 1]
    if what.startswith("Illegal character '\\n'"):
        what = "the text in quotes does not end in this line"
    double = re.match(r"Duplicate inline table key ('.*')", what)
    if double:
        what = f"{double[1]} is there twice in these braces"
        return Mistake("", what, "leave one out", file, line, column, shown)
    return Mistake("", what, _hint(shown), file, line, column, shown)


def _hint(line: str) -> str:
    bare = line.split("#", 1)[0].rstrip() if '"' not in line else line
    for pattern, advice in _SLIPS:
        if re.search(pattern, bare):
            return advice
    return ""
