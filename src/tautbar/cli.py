"""The command ``tautbar``: arguments, messages and exit codes; the work is done by public functions.

Results go to standard output, everything else to standard error. Modules that need numpy are
imported by the commands that compute, so that help and messages come at once.
"""

from __future__ import annotations

import argparse
import json
import os
import shlex
import signal
import sys
from collections.abc import Callable, Iterable, Iterator, Sequence
from contextlib import contextmanager
from pathlib import Path
from types import FrameType
from typing import TYPE_CHECKING, Any, NoReturn, TextIO

from tautbar.errors import InputError, ModelError, TautbarError

if TYPE_CHECKING:
    from tautbar.records.fields import Record

DONE, WRONG_INPUT, FAILED, INTERRUPTED, TERMINATED = 0, 2, 3, 130, 143
NOT_YET = ("export", "report", "sweep")
CARE = """\
Care: these results need review by a competent and, where required, licensed engineer. Local codes and the
maker's data govern. Bending, eccentric joints, connections, fatigue, corrosion, soil and the effects seen
only in a wind tunnel are not modelled. Nobody stands under or near a structure because of these numbers."""


_lost: list[str] = []  # why standard output could not be written, once it failed


class Terminated(KeyboardInterrupt):
    """The signal SIGTERM; handled like Ctrl-C, so that what was finished is kept."""


class Parser(argparse.ArgumentParser):
    """Arguments whose mistakes are answered with the nearest known word, in one block."""

    def __init__(self, *args: Any, **keywords: Any) -> None:
        super().__init__(*args, **{**keywords, "allow_abbrev": False})

    def parse_known_args(self, args: Any = None, namespace: Any = None) -> tuple[Any, list[str]]:
        space, extra = super().parse_known_args(args, namespace)
        for word in extra:
            if word.startswith("-"):
                option = word.partition("=")[0]
                self.error(f"there is no option {option}{near(option, self._option_string_actions)}")
        if extra:
            self.error(f"'{extra[0]}' is one word too many")
        return space, extra

    def _check_value(self, action: argparse.Action, value: Any) -> None:
        if action.choices is None or value in action.choices:
            return
        what = (action.metavar or action.dest).lower() if isinstance(action.metavar, str) else action.dest
        if what == "command" and value in NOT_YET:
            self.error(f"'{value}' is not in this version")
        self.error(f"there is no {what} '{value}'{near(value, action.choices)}")

    def error(self, message: str) -> NoReturn:
        self.exit(WRONG_INPUT, f"{self.prog}: {message}\nSee: {self.prog} --help\n")


def near(word: str, known: Iterable[str]) -> str:
    """``; did you mean ...?`` with the known word nearest to ``word``, or nothing."""
    from difflib import get_close_matches

    nearest = get_close_matches(word, list(known), 1, 0.6)
    return f"; did you mean {nearest[0]}?" if nearest else ""


def main(arguments: Sequence[str] | None = None) -> int:
    """Do a command and return its exit code (docs/commands.md)."""
    if sys.stderr is None:  # closed: nobody reads it, but a file opened next must not take its place
        sys.stderr = open(os.devnull, "w", encoding="utf-8")  # noqa: SIM115
    if sys.stdout is None:
        tell(
            "tautbar: standard output is closed, no answer could be shown; send it to /dev/null to run unseen"
        )
        return WRONG_INPUT
    for stream in (sys.stdout, sys.stderr):
        if hasattr(stream, "reconfigure"):
            stream.reconfigure(errors="backslashreplace")  # names may hold what the terminal cannot show
    _lost.clear()
    try:
        options = parser().parse_args(arguments)
    except SystemExit as end:  # help, or arguments that cannot be used
        _write(sys.stdout, "")
        return _unless_lost(int(end.code or 0))
    with terminable():
        return _unless_lost(answer(options))


def _unless_lost(code: int) -> int:
    """The exit code of a command, if all it said could be written."""
    if not _lost:
        return code
    tell(f"tautbar: standard output cannot be written ({_lost[0]}); what was to stand there is lost")
    return code or FAILED


def answer(options: argparse.Namespace) -> int:
    """Do the command asked for; errors become one block of words unless ``--debug``."""
    try:
        code: int = options.does(options)
    except KeyboardInterrupt as signal_given:
        tell("; ".join(["tautbar: stopped", *getattr(signal_given, "__notes__", ())]))
        return TERMINATED if isinstance(signal_given, Terminated) else INTERRUPTED
    except Exception as error:
        if options.debug:
            raise
        tell(block(error))
        return error.exit_code if isinstance(error, TautbarError) else FAILED
    return code


def block(error: Exception) -> str:
    """What is told about an error."""
    if isinstance(error, ModelError):
        count = len(error.mistakes)
        return f"{error}\ntautbar: {count} mistake{'s' if count != 1 else ''}; nothing was computed"
    if isinstance(error, TautbarError):
        return f"tautbar: {error}"
    if isinstance(error, MemoryError):
        return "tautbar: there is not enough memory for this model; store less (store = { every = .. })"
    if isinstance(error, OSError):
        return f"tautbar: {error.filename or 'a file'} cannot be used: {error.strerror or error}"
    kind = type(error).__name__
    return f"tautbar: a fault of this program ({kind}: {error}); --debug shows where"


@contextmanager
def terminable() -> Iterator[None]:
    """Within it SIGTERM raises `Terminated`."""

    def stop(_number: int, _frame: FrameType | None) -> None:
        raise Terminated

    try:
        before = signal.signal(signal.SIGTERM, stop)
    except ValueError:  # not in the main thread: signals are not ours to take
        yield
        return
    try:
        yield
    finally:
        signal.signal(signal.SIGTERM, before)


def say(text: str) -> None:
    """Write a result."""
    _write(sys.stdout, text + "\n")


def tell(text: str) -> None:
    """Write what is not a result."""
    _write(sys.stderr, text + "\n")


def _write(stream: TextIO, text: str) -> None:
    """Write at once. Where that cannot be done the writing ends, not the command.

    A reader that has gone is no fault; a standard output that fails is remembered in `_lost`.
    """
    try:
        stream.write(text)
        stream.flush()
    except OSError as wrong:
        if stream is sys.stdout and not isinstance(wrong, BrokenPipeError):
            _lost.append(wrong.strerror or str(wrong))
        nowhere = os.open(os.devnull, os.O_WRONLY)
        os.dup2(nowhere, stream.fileno())
        os.close(nowhere)


# Commands ---------------------------------------------------------------------------------------


def check(options: argparse.Namespace) -> int:
    """Read and check a model."""
    from tautbar.model.reading import read_model

    model = read_model(options.model)
    from tautbar.summary import summarise  # only once the model is sound: it needs numpy

    say(summarise(model))
    return DONE


def run(options: argparse.Namespace) -> int:
    """Do the analyses of a model; when stopped, say what became of the results file."""
    path = options.output or Path(options.model).with_suffix(".h5")
    before = _version_of(path)
    try:
        return _run(options, path)
    except KeyboardInterrupt as stop:
        kept = _version_of(path) not in (None, before)
        stop.add_note(
            f"what was finished is in {path}" if kept else "nothing was finished, nothing was written"
        )
        raise


def _version_of(path: Path) -> tuple[int, int] | None:
    """What tells a file from one put in its place later."""
    try:
        status = path.stat()
    except OSError:
        return None
    return status.st_ino, status.st_mtime_ns


def _run(options: argparse.Namespace, path: Path) -> int:
    from tautbar.model.reading import read_model

    model = read_model(options.model)
    if not model.parts.analyses:
        raise InputError(f"{options.model}: there is nothing to run; the model has no [[analyses]]")
    from tautbar.progress import Progress, Silent
    from tautbar.run import run as run_model
    from tautbar.views.answers import answer_text

    statuses: list[str] = []

    def on_record(record: Record) -> None:
        statuses.append(record.status)
        say(answer_text(record) + "\n")

    progress = Silent() if options.quiet else Progress()
    for warning in model.warnings:
        tell(f"warning: {warning}")
    choices = {"only": options.only, "overwrite": options.overwrite}
    with run_model(model, path, **choices, progress=progress, on_record=on_record) as results:
        for warning in results.warnings[len(model.warnings) :]:  # those that only arrays show
            tell(f"warning: {warning}")
    tell(CARE)
    say(f"results: {path}")
    if not options.quiet:
        tell(f"plots:   tautbar plot {shlex.quote(str(path))}")
    return worst(statuses)


def show(options: argparse.Namespace) -> int:
    """Show the answers and audits of a results file again."""
    from tautbar.store import open_results
    from tautbar.views.answers import answer_text, as_json

    with open_results(options.result) as results:
        wanted = [options.name] if options.name else list(results)
        shown = [results[name] for name in wanted]
        if options.json:
            say(json.dumps([as_json(result) for result in shown], indent=2))
        else:
            say("\n\n".join(answer_text(result) for result in shown))
        return worst([result.status for result in shown])


def plot(options: argparse.Namespace) -> int:
    """List the plots a results file can give, or draw one."""
    from tautbar.store import open_results
    from tautbar.views.gallery import list_plots

    with open_results(options.result) as results:
        if options.what is None:
            say(list_plots(results))
            return DONE
        from tautbar.views.gallery import draw, save

        figure = draw(results[options.name], options.what, **plot_choices(options))
        path = options.output or plot_path(options)
        save(figure, path)
    say(str(path))
    return DONE


def new(options: argparse.Namespace) -> int:
    """Write a small commented model to start from."""
    from tautbar.starter import write_starter

    path = write_starter(options.file)
    say(str(path))
    tell(f"next: tautbar check {path}")
    return DONE


def schema(options: argparse.Namespace) -> int:
    """Print the JSON Schema of the model file."""
    from tautbar.model.schema import schema as model_schema

    say(json.dumps(model_schema(), indent=2))
    return DONE


# Arguments --------------------------------------------------------------------------------------


def parser() -> Parser:
    """Every command with its options."""
    top = Parser(prog="tautbar", description="Structures whose members carry axial force only.")
    top.add_argument("--version", action="version", version=f"tautbar {_version()}")
    commands = top.add_subparsers(dest="command", metavar="COMMAND", required=True, parser_class=Parser)

    command = add(commands, "check", check, "read and check a model; its summary or every mistake")
    command.add_argument("model", metavar="MODEL", help="model file (TOML)")

    command = add(commands, "run", run, "do the analyses of a model and write the results file")
    command.add_argument("model", metavar="MODEL", help="model file (TOML)")
    output(command, "results file (default: beside the model, ending .h5)")
    command.add_argument(
        "--only", nargs="+", action="extend", default=[], metavar="NAME",
        help="do these analyses, and what they start from (write it after MODEL)",
    )  # fmt: skip
    command.add_argument("--overwrite", action="store_true", help="keep no copy of earlier results")
    command.add_argument("--quiet", action="store_true", help="show no progress")

    command = add(commands, "show", show, "the answers and audits again, from the results file")
    command.add_argument("result", metavar="RESULT", help="results file")
    command.add_argument("name", metavar="NAME", nargs="?", help="one analysis (default: all)")
    command.add_argument("--json", action="store_true", help="as JSON, for scripts")

    add_plot(commands)

    command = add(commands, "new", new, "write a small commented model to start from")
    command.add_argument("file", metavar="FILE", nargs="?", default="model.toml", help="default: model.toml")

    add(commands, "schema", schema, "print the JSON Schema of the model file, for editors")
    return top


def add(commands: Any, name: str, does: Callable[[argparse.Namespace], int], text: str) -> Parser:
    """Add a command."""
    command: Parser = commands.add_parser(name, help=text, description=text[0].upper() + text[1:] + ".")
    command.set_defaults(does=does)
    command.add_argument("--debug", action="store_true", help="show where in the program an error arose")
    return command


def add_plot(commands: Any) -> None:
    """Add the command ``plot``; without NAME and WHAT it lists what can be drawn."""
    command = add(commands, "plot", plot, "draw one plot from the results file, or list those it can give")
    command.add_argument("result", metavar="RESULT", help="results file")
    command.add_argument("name", metavar="NAME", nargs="?", help="analysis")
    command.add_argument("what", metavar="WHAT", nargs="?", help="plot; without it: the list of plots")
    output(command, "PNG, SVG or PDF file, by its ending (default: RESULT-NAME-WHAT.png)")
    command.add_argument("--joint", metavar="NAME", help="joint to draw")
    command.add_argument("--direction", metavar="AXIS", help="x, y or z: component of a displacement")
    command.add_argument("--member", metavar="NAME", help="member, group or rope to draw")
    command.add_argument("--quantity", metavar="NAME", help="quantity to draw, e.g. displacement")
    command.add_argument("--mode", metavar="NUMBER", type=int, help="mode, counted from 1")
    command.add_argument("--loading", metavar="NAME", help="loading of a static analysis")
    command.add_argument("--time", metavar="SECONDS", type=float, help="instant of a history")
    command.add_argument("--at", metavar="POINT", help="point of a path: end, or limit point 1 and the like")
    command.add_argument("--scale", metavar="NUMBER", type=float, help="magnification of displacements")
    command.add_argument(
        "--view", metavar="VIEW", help='front, side, top, or azimuth and elevation in degrees: "30 20"'
    )


def output(command: Parser, text: str) -> None:
    """Add the option that names the file to write."""
    command.add_argument("-o", "--output", metavar="FILE", type=Path, help=text)


PLOT_CHOICES = (
    "joint", "direction", "member", "quantity", "mode", "loading", "time", "at", "scale", "view",
)  # fmt: skip


def plot_choices(options: argparse.Namespace) -> dict[str, Any]:
    """The choices given for a plot."""
    return {name: value for name in PLOT_CHOICES if (value := getattr(options, name)) is not None}


def plot_path(options: argparse.Namespace) -> Path:
    """Default file of a plot, beside the results file."""
    result = Path(options.result)
    words = "-".join((result.stem, options.name, options.what))
    plain = "".join(letter if letter.isalnum() or letter in "-_." else "-" for letter in words)
    return result.with_name(plain + ".png")


def worst(statuses: Sequence[str]) -> int:
    """The exit code for analyses that ended so."""
    return DONE if all(status == "complete" for status in statuses) else FAILED


def _version() -> str:
    from tautbar import __version__

    return __version__
