"""A run from end to end with made-up analyses: order, failures, interruptions, a full disk."""

from __future__ import annotations

import os
import signal
import subprocess
import sys
import tracemalloc
from dataclasses import dataclass, field, replace
from pathlib import Path
from types import SimpleNamespace

import h5py
import numpy as np
import pytest

import tautbar.analyses.job
from fake_mast import FakeHistory, FakeMast, modes_record, static_record
from tautbar.errors import AnalysisFailed, InputError, NotConverged, ResultsError
from tautbar.run import choose, run
from tautbar.store import DiskFull, ResultsWriter, open_results
from tautbar.store.layout import UnknownName

MAST = FakeMast()
HERE = Path(__file__).parent


@dataclass
class FakeJob:
    """Gives each analysis what the test says: a record, a history, or an exception."""

    answers: dict
    asked: list = field(default_factory=list)
    model_fields = MAST.model_fields
    warnings = ()

    def run(self, name):
        self.asked.append(name)
        answer = self.answers[name]
        if isinstance(answer, BaseException):
            raise answer
        return answer


@dataclass
class Shown:
    """Notes what a progress display is told."""

    told: list = field(default_factory=list)

    def start(self, what, total=None, unit=""):
        self.told.append(("start", what, total))

    def to(self, n, note=""):
        self.last = n

    def finish(self, word="done"):
        self.told.append(("finish", word))


def analysis(name, kind="static", start=None, **more):
    from_ = None if start is None else SimpleNamespace(analysis=start, as_drawn=False)
    return SimpleNamespace(name=name, kind=kind, start=from_, **more)


STANDING = analysis("standing")
RINGING = analysis("ringing", "modes", "standing")
DROPPED = analysis("lantern dropped", "history", "standing", duration=4.0)


def fake_model(*analyses, folder="."):
    parts = SimpleNamespace(analyses=analyses, title="Tide-gauge mast")
    text = 'title = "Tide-gauge mast"\n'
    return SimpleNamespace(parts=parts, name="mast", text=text, files={}, warnings=("w",), folder=folder)


@pytest.fixture
def job(monkeypatch):
    job = FakeJob(
        {"standing": static_record(MAST), "ringing": modes_record(MAST), "lantern dropped": FakeHistory(MAST)}
    )
    monkeypatch.setattr(tautbar.analyses.job, "prepare", lambda model: job)
    return job


MODEL = fake_model(STANDING, RINGING, DROPPED)


def test_a_run_writes_all_analyses_in_order_and_tells_of_each(job, tmp_path) -> None:
    told, shown = [], Shown()
    with run(MODEL, tmp_path / "mast.h5", progress=shown, on_record=told.append) as results:
        assert list(results) == ["standing", "ringing", "lantern dropped"]
        assert [result.status for result in results.values()] == ["complete"] * 3
        assert results.title == "Tide-gauge mast"
        assert results["lantern dropped"].wall_time > 0.0
    assert [record.name for record in told] == ["standing", "ringing", "lantern dropped"]
    assert shown.told == [
        ("start", "standing", None),
        ("finish", "done"),
        ("start", "ringing", None),
        ("finish", "done"),
        ("start", "lantern dropped", 4.0),
        ("finish", "done"),
    ]
    assert shown.last == 4.0
    assert os.listdir(tmp_path) == ["mast.h5"]


def test_the_default_file_is_beside_the_model(job, tmp_path) -> None:
    with run(fake_model(STANDING, folder=tmp_path)) as results:
        assert results.path == tmp_path / "mast.h5"


def test_only_brings_what_it_starts_from(job, tmp_path) -> None:
    run(MODEL, tmp_path / "a.h5", only=["ringing"]).close()
    assert job.asked == ["standing", "ringing"]


def test_only_knows_the_analyses() -> None:
    with pytest.raises(UnknownName, match=r'no analysis "rining" \(did you mean "ringing" or "standing"\?\)'):
        choose(MODEL.parts.analyses, ["rining"])


def test_modes_about_the_drawing_need_nothing() -> None:
    drawn = replace_start(RINGING, SimpleNamespace(analysis="", as_drawn=True))
    assert choose([STANDING, drawn], ["ringing"]) == [drawn]


def replace_start(given, start):
    return SimpleNamespace(**{**vars(given), "start": start})


def test_what_starts_from_a_failed_analysis_is_not_run_and_the_rest_is(job, tmp_path) -> None:
    other = analysis("other")
    job.answers["other"] = static_record(MAST, "other")
    job.answers["standing"] = replace(static_record(MAST), status="failed", outcome="force residual 3e-2")
    with run(fake_model(STANDING, RINGING, other), tmp_path / "a.h5") as results:
        assert {name: r.status for name, r in results.items()} == {
            "standing": "failed",
            "ringing": "not run",
            "other": "complete",
        }
        assert results["ringing"].outcome == 'not run: it starts from "standing", which is not complete'
        assert results["standing"]["axial_force"].shape == (3, 60)  # kept, marked as failed


@pytest.mark.parametrize(
    ("wrong", "outcome"),
    [
        (NotConverged("no balance within 40 steps"), "no balance within 40 steps"),
        (
            AnalysisFailed(
                "told elsewhere", replace(static_record(MAST), status="failed", outcome="its own")
            ),
            "its own",
        ),
    ],
)
def test_an_analysis_that_raises_is_written_as_failed(job, tmp_path, wrong, outcome) -> None:
    job.answers["standing"] = wrong
    with run(fake_model(STANDING), tmp_path / "a.h5") as results:
        assert (results["standing"].status, results["standing"].outcome) == ("failed", outcome)


def test_a_fault_of_the_program_is_raised_and_what_was_finished_is_kept(job, tmp_path) -> None:
    job.answers["ringing"] = ZeroDivisionError("by zero")
    with pytest.raises(ZeroDivisionError):
        run(MODEL, tmp_path / "a.h5")
    with open_results(tmp_path / "a.h5") as results:
        assert [r.status for r in results.values()] == ["complete", "failed", "not run"]
        assert "fault in this program (ZeroDivisionError: by zero)" in results["ringing"].outcome


def raises_at(step, wrong):
    def at_step(now):
        if now == step:
            raise wrong

    return at_step


@pytest.mark.parametrize("step", [0, 1, 64, 130])
def test_an_interrupted_history_keeps_every_step_before(job, tmp_path, step) -> None:
    job.answers["lantern dropped"] = FakeHistory(MAST, at_step=raises_at(step, KeyboardInterrupt()))
    later = analysis("later")
    with pytest.raises(KeyboardInterrupt):
        run(fake_model(STANDING, DROPPED, later), tmp_path / "a.h5")
    with open_results(tmp_path / "a.h5") as results:
        result = results["lantern dropped"]
        assert result.status == "interrupted"
        assert len(result.time) == len(result["energy/kinetic"]) == step
        assert result["displacement"].shape == (step, 24, 3)
        expected = [MAST.forces(FakeHistory(MAST).amount(t)) for t in result.time]
        # single precision is what was asked for
        np.testing.assert_array_equal(result.values("axial_force"), np.float32(expected).reshape(-1, 60))
        assert results["later"].status == "not run"
    assert os.listdir(tmp_path) == ["a.h5"]


def test_a_history_without_balance_is_failed_and_the_rest_still_runs(job, tmp_path) -> None:
    job.answers["lantern dropped"] = FakeHistory(
        MAST, at_step=raises_at(70, NotConverged("step 70 has no balance"))
    )
    job.answers["later"] = static_record(MAST, "later")
    with run(fake_model(STANDING, DROPPED, analysis("later")), tmp_path / "a.h5") as results:
        result = results["lantern dropped"]
        assert result.status == "failed"
        assert result.outcome.startswith("step 70 has no balance; ")
        assert len(result.time) == 70
        assert results["later"].status == "complete"


def test_an_interruption_while_telling_keeps_the_analysis(job, tmp_path) -> None:
    def stop(record):
        raise KeyboardInterrupt

    with pytest.raises(KeyboardInterrupt):
        run(MODEL, tmp_path / "a.h5", on_record=stop)
    with open_results(tmp_path / "a.h5") as results:
        assert [r.status for r in results.values()] == ["complete", "not run", "not run"]


def test_nothing_is_left_behind_where_nothing_can_be_written(job, tmp_path) -> None:
    with pytest.raises(InputError, match="there is no folder"):
        run(MODEL, tmp_path / "absent" / "a.h5")
    with pytest.raises(InputError, match="this is a folder"):
        run(MODEL, tmp_path)
    assert os.listdir(tmp_path) == []
    assert job.asked == []


def test_two_runs_differ_only_in_run_id_and_times(job, tmp_path) -> None:
    dumps = []
    for name in ("a.h5", "b.h5"):
        run(MODEL, tmp_path / name).close()
        with h5py.File(tmp_path / name) as file:
            dumps.append(dump(file))
    different = {key for key in dumps[0] | dumps[1] if not same(dumps[0].get(key), dumps[1].get(key))}
    assert {key.rpartition("@")[2] for key in different} <= {"run_id", "created", "wall_time"}
    assert "/@run_id" in different


def dump(file: h5py.File) -> dict:
    found = {f"/@{key}": value for key, value in file.attrs.items()}

    def visit(path, thing):
        found.update({f"{path}@{k}": v for k, v in thing.attrs.items() if "LIST" not in k})
        if isinstance(thing, h5py.Dataset):
            found[path] = thing[()]

    file.visititems(visit)
    return found


def same(one, other) -> bool:
    return np.array_equal(
        np.asarray(one, dtype=object).astype(str), np.asarray(other, dtype=object).astype(str)
    )


CHILD = """
import resource, signal, sys, time
sys.path.insert(0, {here!r})
import test_run
from test_run import *
history = FakeHistory(MAST, steps={steps}, precision="float64", at_step={at_step})
job = FakeJob({{"standing": static_record(MAST), "lantern dropped": history}})
tautbar.analyses.job.prepare = lambda model: job
{before}
run(fake_model(STANDING, DROPPED), {path!r})
"""


@pytest.fixture
def child():
    """Starts a run in a process of its own, and ends it after the test."""
    started = []

    def start(path, **words) -> subprocess.Popen:
        code = CHILD.format(here=str(HERE), path=str(path), **words)
        started.append(subprocess.Popen([sys.executable, "-c", code], stderr=subprocess.PIPE, text=True))
        return started[-1]

    yield start
    for process in started:
        process.kill()
        process.communicate()


@pytest.mark.skipif(not hasattr(os, "posix_fallocate"), reason="room cannot be set aside on this system")
def test_a_full_disk_keeps_the_finished_steps(child, tmp_path) -> None:
    limit = "resource.setrlimit(resource.RLIMIT_FSIZE, (6 << 20, 6 << 20))"  # stands for the end of the disk
    process = child(tmp_path / "a.h5", steps=20000, at_step="lambda step: None", before=limit)
    _, told = process.communicate(timeout=60)
    assert process.returncode == 1, told
    assert f"the disk is full; what was finished is in {tmp_path / 'a.h5'}" in told
    with open_results(tmp_path / "a.h5") as results:
        result = results["lantern dropped"]
        assert result.status == "interrupted"
        assert 300 < len(result.time) < 20000
        assert np.isfinite(result.values("displacement")).all()
    assert os.listdir(tmp_path) == ["a.h5"]


def test_a_disk_that_fails_in_a_write_is_told_in_a_sentence(child, tmp_path) -> None:
    limit = "import os; del os.posix_fallocate; resource.setrlimit(resource.RLIMIT_FSIZE, (2 << 20, 2 << 20))"
    process = child(tmp_path / "a.h5", steps=20000, at_step="lambda step: None", before=limit)
    _, told = process.communicate(timeout=60)
    assert process.returncode == 1, told  # not a crash at the end
    assert "the disk is full" in told
    assert os.listdir(tmp_path) == []


def test_ctrl_c_at_any_instant_leaves_a_whole_file(child, tmp_path) -> None:
    slow = "lambda step: time.sleep(0.0005)"
    process = child(tmp_path / "a.h5", steps=100000, at_step=slow, before="sys.stderr.write('begun\\n')")
    process.stderr.readline()
    with pytest.raises(subprocess.TimeoutExpired):
        process.wait(timeout=0.6)
    process.send_signal(signal.SIGINT)
    _, told = process.communicate(timeout=60)
    assert "KeyboardInterrupt" in told
    with open_results(tmp_path / "a.h5") as results:
        result = results["lantern dropped"]
        assert result.status == "interrupted"
        assert len(result.time) == len(result["axial_force"]) == len(result["energy/strain"]) > 0
    assert os.listdir(tmp_path) == ["a.h5"]


def test_a_run_that_is_killed_leaves_the_old_file_alone(child, tmp_path) -> None:
    path = tmp_path / "a.h5"
    path.write_bytes(b"old")
    process = child(path, steps=10**6, at_step="lambda step: None", before="sys.stderr.write('begun\\n')")
    process.stderr.readline()
    with pytest.raises(subprocess.TimeoutExpired):
        process.wait(timeout=0.3)
    with pytest.raises(InputError, match="another run is writing this file"):
        ResultsWriter(path)
    process.kill()
    process.wait()
    assert path.read_bytes() == b"old"
    ResultsWriter(path).discard()  # what the killed run left is used again
    assert os.listdir(tmp_path) == ["a.h5"]


def test_memory_stays_flat_in_a_long_history(job, tmp_path) -> None:
    peaks = []
    for steps in (300, 1300):
        job.answers["lantern dropped"] = FakeHistory(MAST, steps=steps)
        tracemalloc.start()
        run(fake_model(STANDING, DROPPED), tmp_path / f"{steps}.h5").close()
        peaks.append(tracemalloc.get_traced_memory()[1])
        tracemalloc.stop()
    # 1000 more steps hold 1.1 MB as stored; buffers are the same, so a tenth of that is room for noise
    assert peaks[1] - peaks[0] < 110_000


def test_the_disk_errors_are_results_errors() -> None:
    assert issubclass(DiskFull, ResultsError)
    assert DiskFull.exit_code == 3
