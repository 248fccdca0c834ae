"""The command: arguments, messages, exit codes, and how it behaves when piped, stopped or mistaken."""

from __future__ import annotations

import contextlib
import io
import json
import os
import re
import shlex
import shutil
import signal
import subprocess
import sys
import time
from pathlib import Path

import pytest

from tautbar import cli, errors
from tautbar.starter import STARTER, write_starter

ONE_MISTAKE = "tautbar: 1 mistake; nothing was computed"
ANALYSES = ["in service", "modes in service", "boat knocks"]


def command(*arguments: str | Path, **settings: object) -> subprocess.CompletedProcess[str]:
    """The command in a process of its own."""
    return subprocess.run(
        [sys.executable, "-m", "tautbar", *map(str, arguments)],
        **{"capture_output": True, "text": True, "timeout": 120, **settings},
    )


@pytest.fixture
def starter(tmp_path: Path) -> Path:
    return write_starter(tmp_path / "bracket.toml")


@pytest.fixture
def wrong(starter: Path) -> Path:
    """The starter with two mistakes."""
    text = starter.read_text("utf-8").replace('"3.0 cm^2"', '"3.0 cm"').replace("pretension", "pretention")
    starter.write_text(text, "utf-8")
    return starter


@pytest.fixture(scope="module")
def done(tmp_path_factory: pytest.TempPathFactory) -> tuple[Path, str, str, int]:
    """The starter run once: (folder, stdout, stderr, exit code)."""
    folder = tmp_path_factory.mktemp("run")
    write_starter(folder / "bracket.toml")
    out, err = io.StringIO(), io.StringIO()
    with contextlib.redirect_stdout(out), contextlib.redirect_stderr(err):
        code = cli.main(["run", str(folder / "bracket.toml")])
    return folder, out.getvalue(), err.getvalue(), code


# Start-up -----------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("arguments", "code"),
    [
        (["--help"], 0),
        (["new", "model.toml"], 0),
        (["schema"], 0),
        (["check", "bracket.toml"], 2),
        (["chek"], 2),
    ],
    ids=lambda value: value[0] if isinstance(value, list) else "",
)
def test_what_does_not_compute_loads_no_numpy(arguments: list[str], code: int, wrong: Path) -> None:
    program = f"""
import sys
from tautbar.cli import main
code = main({arguments})
heavy = {{"numpy", "scipy", "h5py", "matplotlib"}} & set(sys.modules)
print(code, *heavy, file=sys.stderr)
"""
    ended = subprocess.run(
        [sys.executable, "-c", program], cwd=wrong.parent, capture_output=True, text=True, timeout=60
    )
    assert ended.stderr.splitlines()[-1] == str(code)


def test_help_comes_at_once() -> None:
    """Help reads no model and computes nothing, so of the program only the command itself is loaded."""
    program = """
import sys
from tautbar.cli import main
main(["--help"])
print(*sorted(name for name in sys.modules if name.partition(".")[0] == "tautbar"), file=sys.stderr)
"""
    done = subprocess.run([sys.executable, "-c", program], capture_output=True, text=True, timeout=60)
    assert done.stdout.startswith("usage: tautbar")
    assert done.stderr.split() == ["tautbar", "tautbar.cli", "tautbar.errors"]


# Arguments ----------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("arguments", "message"),
    [
        (["chek", "m.toml"], "tautbar: there is no command 'chek'; did you mean check?"),
        (["zzz"], "tautbar: there is no command 'zzz'"),
        (["report", "r.h5"], "tautbar: 'report' is not in this version"),
        (["sweep", "s.toml"], "tautbar: 'sweep' is not in this version"),
        (["export", "r.h5"], "tautbar: 'export' is not in this version"),
        (
            ["run", "m.toml", "--overwite"],
            "tautbar run: there is no option --overwite; did you mean --overwrite?",
        ),
        (["run", "m.toml", "--resume"], "tautbar run: there is no option --resume"),
        (["run", "m.toml", "--over"], "tautbar run: there is no option --over"),  # nothing is guessed
        (["run"], "tautbar run: the following arguments are required: MODEL"),
        (["check", "a.toml", "b.toml"], "tautbar check: 'b.toml' is one word too many"),
        (
            ["plot", "r.h5", "n", "mode", "--mode", "x"],
            "tautbar plot: argument --mode: invalid int value: 'x'",
        ),
    ],
)
def test_arguments_that_cannot_be_used(
    arguments: list[str], message: str, capsys: pytest.CaptureFixture[str]
) -> None:
    assert cli.main(arguments) == 2
    out, err = capsys.readouterr()
    assert out == ""
    first, see = err.splitlines()
    assert first.startswith(message)
    assert see.startswith("See: tautbar")


def test_the_commands_are_those_of_this_version(capsys: pytest.CaptureFixture[str]) -> None:
    assert cli.main(["--help"]) == 0
    commands = re.findall(r"^    ([a-z]+) ", capsys.readouterr().out, re.M)
    assert commands == ["check", "run", "show", "plot", "new", "schema"]


def test_every_command_takes_debug() -> None:
    for name in ("check", "run", "show", "plot", "new", "schema"):
        assert "--debug" in command(name, "--help").stdout


# new, schema, check ---------------------------------------------------------------------------------


def test_new_writes_a_model_and_never_over_a_file(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    path = tmp_path / "bay.toml"
    assert cli.main(["new", str(path)]) == 0
    assert capsys.readouterr().out == f"{path}\n"
    assert path.read_text("utf-8").startswith("#:schema tautbar-schema.json\n")
    path.write_text("mine")
    assert cli.main(["new", str(path)]) == 2
    assert (
        capsys.readouterr().err == f"tautbar: {path} exists already and is left as it is; give another name\n"
    )
    assert path.read_text() == "mine"


def test_new_into_a_folder_that_is_not_there(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert cli.main(["new", str(tmp_path / "no" / "m.toml")]) == 2
    assert "cannot be written: No such file or directory" in capsys.readouterr().err


def test_the_model_to_start_from_is_plain_ascii_of_readable_width() -> None:
    text = STARTER.read_text("utf-8")
    assert text.isascii()
    assert max(map(len, text.splitlines())) <= 100


def test_schema_is_json_on_standard_output(capsys: pytest.CaptureFixture[str]) -> None:
    assert cli.main(["schema"]) == 0
    assert "draft-07" in json.loads(capsys.readouterr().out)["$schema"]


def test_check_tells_what_is_understood(starter: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """The weight by hand: 3 cm2 x 7850 kg/m3 of tube, 0.32 kg/m of rope, over their drawn lengths."""
    assert cli.main(["check", str(starter)]) == 0
    out, err = capsys.readouterr()
    assert err == ""
    tubes = 2 * 2.0 + 1.2 + (2.0**2 + 1.2**2) ** 0.5
    rope = (2.0**2 + 1.4**2) ** 0.5 / (1 + 1.5e3 / 4.5e6)
    kilograms = 3e-4 * 7850 * tubes + 0.32 * rope
    told = re.search(r"mass +([\d.]+) kg", out)
    assert told is not None
    assert float(told[1]) == pytest.approx(kilograms, rel=1e-4)  # printed to five figures
    weight = re.search(r"self-weight ([\d.]+) N, acting against z", out)
    assert weight is not None
    assert float(weight[1]) == pytest.approx(9.80665 * kilograms, rel=1e-4)
    for line in (
        "  joints      5",
        "  members     5: 4 bar, 1 tension-only",
        "  supports    W0, W1, W2: fixed in x, z (wall)",
        "              service = 1 dead + 1 lantern",
        "  analyses    in service (static)",
        "              modes in service (modes, from in service)",
        "No mistakes found.",
    ):
        assert line in out.splitlines()
    assert out.isascii()


def test_check_tells_every_mistake_with_its_place(wrong: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert cli.main(["check", str(wrong)]) == 2
    out, err = capsys.readouterr()
    assert out == ""
    assert re.search(r"bracket\.toml:\d+:\d+: .*area", err)
    assert re.search(r"did you mean .*pretension", err)
    assert err.splitlines()[-1] == "tautbar: 2 mistakes; nothing was computed"
    assert "Traceback" not in err


def test_a_model_with_mistakes_writes_nothing(wrong: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert cli.main(["run", str(wrong)]) == 2
    assert [file.name for file in wrong.parent.iterdir()] == ["bracket.toml"]


@pytest.mark.parametrize("name", ["check", "run", "show", "plot"])
def test_a_file_that_is_not_there(name: str, tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert cli.main([name, str(tmp_path / "none.toml")]) == 2
    out, err = capsys.readouterr()
    assert out == ""
    assert "none.toml" in err
    assert len(err.splitlines()) <= 2


# run, show, plot ------------------------------------------------------------------------------------


def test_run_prints_each_answer_and_the_place_of_the_results(done: tuple[Path, str, str, int]) -> None:
    folder, out, _, code = done
    assert code == 0
    places = [out.index(name) for name in ANALYSES]
    assert places == sorted(places)
    assert out.splitlines()[-1] == f"results: {folder / 'bracket.h5'}"
    assert out.isascii()
    assert sorted(file.name for file in folder.iterdir()) == ["bracket.h5", "bracket.toml"]


def test_run_tells_progress_cautions_and_the_next_command_aside(done: tuple[Path, str, str, int]) -> None:
    folder, _, err, _ = done
    assert err.count("Care: these results need review by a competent and, where required, licensed") == 1
    assert err.splitlines()[-1] == f"plots:   tautbar plot {folder / 'bracket.h5'}"
    for name in ANALYSES:
        assert re.search(rf"^{name}: done in [\d.]+ s$", err, re.M)


def test_quiet_leaves_out_progress_but_no_caution(starter: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert cli.main(["run", str(starter), "--quiet", "--only", "in service"]) == 0
    out, err = capsys.readouterr()
    assert "in service" in out
    assert err == cli.CARE + "\n"


def test_only_brings_what_an_analysis_starts_from(starter: Path, capsys: pytest.CaptureFixture[str]) -> None:
    result = starter.with_name("modes.h5")
    assert cli.main(["run", str(starter), "-o", str(result), "--only", "modes in service"]) == 0
    capsys.readouterr()
    assert cli.main(["show", str(result), "--json"]) == 0
    assert [answer["name"] for answer in json.loads(capsys.readouterr().out)] == ANALYSES[:2]


def test_only_with_a_name_that_is_not_there(starter: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert cli.main(["run", str(starter), "--only", "in servis"]) == 2
    assert 'did you mean "in service"' in capsys.readouterr().err
    assert not starter.with_suffix(".h5").exists()


def test_a_model_without_analyses_has_nothing_to_run(
    starter: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    text = starter.read_text("utf-8")
    starter.write_text(text[: text.index("[events.bump]")], "utf-8")
    assert cli.main(["check", str(starter)]) == 0
    assert cli.main(["run", str(starter)]) == 2
    assert "there is nothing to run; the model has no [[analyses]]" in capsys.readouterr().err
    assert not starter.with_suffix(".h5").exists()


def test_show_repeats_the_answers_of_the_run(
    done: tuple[Path, str, str, int], capsys: pytest.CaptureFixture[str]
) -> None:
    folder, ran, _, _ = done
    assert cli.main(["show", str(folder / "bracket.h5")]) == 0
    assert ran.startswith(capsys.readouterr().out)
    assert cli.main(["show", str(folder / "bracket.h5"), "boat knocks"]) == 0
    assert capsys.readouterr().out.strip() in ran
    assert cli.main(["show", str(folder / "bracket.h5"), "boat nocks"]) == 2
    assert 'did you mean "boat knocks"?' in capsys.readouterr().err


def test_every_dataset_is_in_the_document(done: tuple[Path, str, str, int]) -> None:
    """Names of scales that only label axes apart, which the file explains itself."""
    import h5py

    names: set[str] = set()
    with h5py.File(done[0] / "bracket.h5") as file:
        file.visititems(
            lambda path, thing: (
                names.add(path.rpartition("/")[2])
                if isinstance(thing, h5py.Dataset) and not thing.is_scale
                else None
            )
        )
    text = (Path(__file__).parents[1] / "docs/results-file.md").read_text("utf-8")
    assert {name for name in names if not re.search(rf"\b{name}\b", text)} == set()


def test_show_as_json(done: tuple[Path, str, str, int], capsys: pytest.CaptureFixture[str]) -> None:
    assert cli.main(["show", str(done[0] / "bracket.h5"), "--json"]) == 0
    answers = json.loads(capsys.readouterr().out)
    assert [(answer["name"], answer["status"]) for answer in answers] == [
        (name, "complete") for name in ANALYSES
    ]
    static, modes, history = answers
    assert static["loadings"][0]["name"] == "service"
    assert static["loadings"][0]["greatest_tension"]["member"] == "stay"
    assert len(modes["modes"]) == 4
    assert history["peaks"]["displacement"]["greatest"]["time_s"] > 0.0


def test_plot_lists_what_can_be_drawn(
    done: tuple[Path, str, str, int], capsys: pytest.CaptureFixture[str]
) -> None:
    assert cli.main(["plot", str(done[0] / "bracket.h5")]) == 0
    out = capsys.readouterr().out
    for words in (*ANALYSES, "structure", "displaced", "mode", "history", "energy", "slack"):
        assert words in out


@pytest.mark.parametrize("ending", [".png", ".svg", ".pdf"])
def test_plot_draws_by_the_ending(
    ending: str, done: tuple[Path, str, str, int], tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    target = tmp_path / f"mode{ending}"
    arguments = [
        "plot",
        str(done[0] / "bracket.h5"),
        "modes in service",
        "mode",
        "--mode",
        "2",
        "-o",
        str(target),
    ]
    assert cli.main(arguments) == 0
    assert capsys.readouterr().out == f"{target}\n"
    assert target.stat().st_size > 1000


def test_a_plot_without_a_name_goes_beside_the_results(
    done: tuple[Path, str, str, int], tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    result = Path(shutil.copy(done[0] / "bracket.h5", tmp_path))
    assert cli.main(["plot", str(result), "boat knocks", "energy"]) == 0
    assert (tmp_path / "bracket-boat-knocks-energy.png").exists()


@pytest.mark.parametrize(
    ("words", "message"),
    [
        (["boat knocks", "enrgy"], "energy"),
        (["boat nocks", "energy"], "boat knocks"),
        (["boat knocks", "history", "--joint", "Bb"], "B"),
        (["boat knocks", "energy", "-o", "a.bmp"], "bmp"),
    ],
)
def test_a_plot_that_cannot_be_drawn(
    words: list[str],
    message: str,
    done: tuple[Path, str, str, int],
    tmp_path: Path,
    monkeypatch: pytest.MonkeyPatch,
    capsys: pytest.CaptureFixture[str],
) -> None:
    monkeypatch.chdir(tmp_path)
    assert cli.main(["plot", str(done[0] / "bracket.h5"), *words]) == 2
    out, err = capsys.readouterr()
    assert out == ""
    assert message in err
    assert not list(tmp_path.iterdir())


def test_an_analysis_that_fails_its_audit_ends_with_3(
    starter: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    """With a rope for its diagonal that would have to push, the bay hangs down like a gate: it folds."""
    text = starter.read_text("utf-8").replace(', ["W1", "B"]', "").replace('from = "W2"', 'from = "W0"')
    text = text.replace(', "W2"]', "]").replace('W2 = [0, "2.6 m"]\n', "")
    starter.write_text(text, "utf-8")
    assert cli.main(["run", str(starter)]) == 3
    out, err = capsys.readouterr()
    assert "in service" in out
    assert "not run" in out  # what starts from it
    assert "Traceback" not in err
    assert cli.main(["show", str(starter.with_suffix(".h5"))]) == 3


# Errors, signals, pipes -----------------------------------------------------------------------------


@pytest.fixture
def raising(monkeypatch: pytest.MonkeyPatch) -> object:
    """Makes ``tautbar schema`` end with an error of choice."""

    def set_error(error: BaseException) -> None:
        def fail() -> None:
            raise error

        monkeypatch.setattr("tautbar.model.schema.schema", fail)

    return set_error


@pytest.mark.parametrize(
    ("error", "code", "words"),
    [
        (errors.InputError("no"), 2, "tautbar: no"),
        (errors.NotConverged("no balance"), 3, "tautbar: no balance"),
        (errors.ResultsError("the disk is full"), 3, "tautbar: the disk is full"),
        (errors.ModelError([errors.Mistake("a", "wrong")]), 2, "a: wrong\n" + ONE_MISTAKE),
        (PermissionError(13, "Not permitted", "x.h5"), 3, "tautbar: x.h5 cannot be used: Not permitted"),
        (KeyboardInterrupt(), 130, "tautbar: stopped"),
        (cli.Terminated(), 143, "tautbar: stopped"),
        (ValueError("0"), 3, "tautbar: a fault of this program (ValueError: 0); --debug shows where"),
    ],
    ids=lambda value: type(value).__name__,
)  # fmt: skip
def test_an_error_is_one_block_with_its_exit_code(
    error: BaseException, code: int, words: str, raising: object, capsys: pytest.CaptureFixture[str]
) -> None:
    raising(error)
    assert cli.main(["schema"]) == code
    assert capsys.readouterr() == ("", words + "\n")


def test_not_enough_memory_is_told_plainly(raising: object, capsys: pytest.CaptureFixture[str]) -> None:
    raising(MemoryError())
    assert cli.main(["schema"]) == 3
    assert capsys.readouterr().err.startswith("tautbar: there is not enough memory")


def test_debug_shows_where(raising: object) -> None:
    raising(errors.InputError("no"))
    with pytest.raises(errors.InputError):
        cli.main(["schema", "--debug"])


def test_the_handling_of_sigterm_is_given_back() -> None:
    before = signal.getsignal(signal.SIGTERM)
    with cli.terminable():
        assert signal.getsignal(signal.SIGTERM) is not before
        with pytest.raises(cli.Terminated):
            signal.raise_signal(signal.SIGTERM)
    assert signal.getsignal(signal.SIGTERM) is before


@pytest.mark.parametrize(("given", "code"), [(signal.SIGTERM, 143), (signal.SIGINT, 130)])
def test_a_run_that_is_stopped_keeps_what_was_finished(
    given: signal.Signals, code: int, starter: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    text = starter.read_text("utf-8").replace('"0.3 s"', '"4000 s"')
    starter.write_text(text.replace('"0.25 ms"', '"2 ms"'), "utf-8")
    result = starter.with_suffix(".h5")
    process = subprocess.Popen(
        [sys.executable, "-m", "tautbar", "run", str(starter)], stdout=subprocess.PIPE, stderr=subprocess.PIPE
    )
    assert process.stderr is not None
    for line in process.stderr:
        if line.startswith(b"boat knocks ..."):
            break
    time.sleep(0.5)
    process.send_signal(given)
    err = process.communicate(timeout=60)[1]
    assert process.returncode == code, err
    assert b"Traceback" not in err
    assert err.endswith(f"tautbar: stopped; what was finished is in {result}\n".encode())
    assert cli.main(["show", str(result), "--json"]) == 3
    answers = json.loads(capsys.readouterr().out)
    assert [answer["status"] for answer in answers] == ["complete", "complete", "interrupted"]


@pytest.mark.parametrize("earlier", [False, True])
def test_a_run_that_is_stopped_before_it_wrote_anything_says_so(
    earlier: bool, starter: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    def stop(path: Path) -> None:
        raise cli.Terminated

    if earlier:
        starter.with_suffix(".h5").write_bytes(b"earlier results")
    monkeypatch.setattr("tautbar.model.reading.read_model", stop)
    assert cli.main(["run", str(starter)]) == 143
    told = capsys.readouterr().err
    assert told == "tautbar: stopped; nothing was finished, nothing was written\n"


def shell(line: str, starter: Path) -> subprocess.CompletedProcess[str]:
    """The command with its streams as a shell can set them."""
    line = f"{shlex.quote(sys.executable)} -m tautbar {line.format(model=shlex.quote(str(starter)))}"
    return subprocess.run(["sh", "-c", line], capture_output=True, text=True, timeout=120)


def test_a_closed_standard_output_is_refused_before_any_work(starter: Path) -> None:
    ended = shell("run {model} >&-", starter)
    assert ended.returncode == 2
    assert ended.stderr == (
        "tautbar: standard output is closed, no answer could be shown; send it to /dev/null to run unseen\n"
    )
    assert not starter.with_suffix(".h5").exists()


@pytest.mark.skipif(not Path("/dev/full").exists(), reason="no device that is always full")
@pytest.mark.parametrize("line", ["run {model} --quiet > /dev/full", "--help > /dev/full"])
def test_a_standard_output_that_cannot_be_written_is_told_in_a_sentence(line: str, starter: Path) -> None:
    ended = shell(line, starter)
    assert ended.returncode == 3
    assert ended.stderr.removeprefix(cli.CARE + "\n") == (
        "tautbar: standard output cannot be written (No space left on device); "
        "what was to stand there is lost\n"
    )
    assert starter.with_suffix(".h5").exists() == line.startswith("run")  # the run itself went on


def test_a_closed_standard_error_is_no_fault(starter: Path) -> None:
    ended = shell("check {model} 2>&-", starter)
    assert ended.returncode == 0
    assert ended.stdout.endswith("No mistakes found.\n")


def test_a_reader_that_goes_away_is_no_error(starter: Path) -> None:
    process = subprocess.Popen(
        [sys.executable, "-m", "tautbar", "run", str(starter)], stdout=subprocess.PIPE, stderr=subprocess.PIPE
    )
    assert process.stdout is not None
    process.stdout.close()
    _, err = process.communicate(timeout=120)
    assert process.returncode == 0
    assert b"Broken" not in err
    assert b"Traceback" not in err
    assert starter.with_suffix(".h5").exists()  # the run itself went on


def test_names_that_the_terminal_cannot_show_are_escaped(starter: Path) -> None:
    text = starter.read_text("utf-8").replace("Bracket", "Ger\u00fcst")
    starter.write_text(text, "utf-8")
    ended = command("check", starter, env={**os.environ, "PYTHONIOENCODING": "ascii"})
    assert ended.returncode == 0, ended.stderr
    assert "Ger\\xfcst with a stay" in ended.stdout


def test_python_m_and_the_installed_command_are_the_same() -> None:
    installed = Path(sys.executable).with_name("tautbar")
    told = subprocess.run([installed, "--version"], capture_output=True, text=True, timeout=60, check=True)
    assert told.stdout == command("--version").stdout
    assert re.fullmatch(r"tautbar \d+\.\d+\.\d+\n", told.stdout)
