"""Numbers for scripts, against what was put into the file."""

from __future__ import annotations

import json
from dataclasses import replace

import numpy as np
import pytest

from fake_mast import FakeHistory, FakeMast
from fake_ropes import FakeBridge, buckling_record, hanging_record, path_record, pieces_record
from results_files import write
from tautbar.records.fields import Field, Record
from tautbar.store import open_results
from tautbar.views.answers import as_json


def tuned_record() -> Record:
    cut = ("cut",)
    fields = {
        "unstressed_length": Field(np.array([4.1, 5.2, 1.0, 3.0]), "m", "length", ("member",)),
        "target_name": Field(np.array(["M z"], dtype=object), "1", "wanted", ("target",)),
        "target_miss": Field(np.array([1e-12]), "1", "miss", ("target",)),
        "position_miss": Field(np.array([2e-12]), "m", "miss", ("target",)),
        "cut_list/name": Field(np.array(["main.1", "main.2"], dtype=object), "1", "name", cut),
        "cut_list/marked_length": Field(np.array([4.2, 5.3]), "m", "mark", cut),
        "setting_table/temperature": Field(np.array([283.0, 293.0]), "K", "temperature", ("warm",)),
        "setting_table/tension": Field(np.array([[9.0, 8.0], [7.0, 6.0]]), "N", "tension", ("cut", "warm")),
        "cut_list/share_of_breaking_force": Field(np.array([0.2, np.nan]), "1", "share", cut),
    }
    return Record("tuned", "tune", "complete", "met", fields=fields)


@pytest.fixture(scope="module")
def found(tmp_path_factory):
    path = tmp_path_factory.mktemp("numbers") / "bridge.h5"
    records = [hanging_record(), pieces_record(), path_record(), buckling_record(), tuned_record()]
    with open_results(write(path, FakeBridge(), *records)) as results:
        yield {n: json.loads(json.dumps(as_json(r), allow_nan=False)) for n, r in results.items()}


def test_each_loading_of_a_static_analysis(found) -> None:
    calm, storm = found["hanging"]["loadings"]
    assert (calm["name"], calm["converged"]) == ("night: calm", True)
    assert calm["greatest_displacement"] == {"joint": "Q", "direction": "z", "value_m": -0.06}
    assert calm["greatest_tension"] == {"member": "main.2", "value_n": 6e3}
    assert calm["greatest_compression"] is None  # the prop is not there yet
    assert calm["slack_members"] == []
    assert storm["greatest_compression"] == {"member": "prop", "value_n": 1e3}
    assert storm["slack_members"] == ["hanger"]
    assert storm["loose_length_m"] == {"hanger": 0.02}
    assert storm["slack_onset_load_factor"] == {"hanger": 0.7}
    assert storm["reaction_sum_n"] == [4.0, 4.0, 4.0]
    assert storm["greatest_turn_rad"] == 0.2
    assert found["hanging"]["audit"] == {"greatest_turn_rad": [0.1, 0.2]}
    assert found["hanging"]["axial_force_n"]["prop"] == {"least": -1e3, "greatest": -1e3}


def test_each_mode(found) -> None:
    assert found["modes"]["frequency_hz"] == [1.5, 2.5]
    assert found["modes"]["modes"][1] == {
        "mode": 2, "frequency_hz": 2.5, "effective_mass_kg": [1.0, 2.0, 3.0],
    }  # fmt: skip


def test_a_path(found) -> None:
    path = found["collapse"]
    assert path["steps"] == 10
    assert path["greatest_load_factor"] == 1.0
    assert path["end"]["greatest_displacement"] == {"joint": "M", "direction": "z", "value_m": -1.0}
    assert [(p["name"], p["type"]) for p in path["critical_points"]] == [
        ("limit point 1", "limit point"),
        ("bifurcation 1", "bifurcation"),
    ]
    assert path["critical_points"][0]["load_factor"] == 1.0
    assert path["critical_points"][0]["greatest_displacement"]["value_m"] == -0.5
    assert path["axial_force_n"]["hanger"]["least"] == -3.0


def test_buckling_factors(found) -> None:
    assert found["buckling"]["load_factor"] == [2.5, -4.0]


def test_lengths_targets_and_the_cut_list(found) -> None:
    tuned = found["tuned"]
    assert tuned["unstressed_length_m"]["main.2"] == 5.2
    assert tuned["targets"] == [{"name": "M z", "target_miss": 1e-12, "position_miss_m": 2e-12}]
    assert tuned["setting_table"] == {
        "temperature_k": [283.0, 293.0],
        "tension_n": {"main.1": [9.0, 8.0], "main.2": [7.0, 6.0]},
    }
    assert tuned["cut_list"] == [
        {"name": "main.1", "marked_length_m": 4.2, "share_of_breaking_force": 0.2},
        {"name": "main.2", "marked_length_m": 5.3, "share_of_breaking_force": None},
    ]


def test_peaks_slack_and_energy_of_a_history(tmp_path) -> None:
    mast, history = FakeMast(), FakeHistory(FakeMast(), steps=200)
    with open_results(write(tmp_path / "a.h5", mast, history)) as results:
        data = json.loads(json.dumps(as_json(results["lantern dropped"]), allow_nan=False))
    moved = np.array([mast.sway(history.amount(4.0 * k / 200)) for k in range(201)])
    peak = data["peaks"]["displacement"]["greatest"]
    assert peak["value_m"] == moved.max()
    step, joint, axis = np.unravel_index(moved.argmax(), moved.shape)
    assert peak["time_s"] == pytest.approx(4.0 * step / 200)
    assert (peak["joint"], peak["direction"]) == (list(mast.joints)[joint], "xyz"[axis])
    assert data["peaks"]["axial_force"]["least"]["value_n"] < 0.0
    assert data["energy"]["event_work_j"] == history.energy(4.0)[4]
    assert data["energy"]["greatest_left_over_j"] == pytest.approx(4e-9)
    assert set(data["slack_share_of_time"]) == {row["member"] for row in data["slack"]}


def test_a_loading_without_a_balance_has_no_numbers(tmp_path) -> None:
    record = hanging_record()
    lost = {k: Field(np.full(f.values.shape, np.nan), f.unit, f.long_name, f.axes)
            for k, f in record.fields.items() if f.unit in "mN" and "rope" not in k}  # fmt: skip
    fields = {**record.fields, **lost, "converged": Field(np.zeros(2), "1", "holds", ("loading",))}
    failed = Record("storm", "static", "failed", "none", fields=fields)
    with open_results(write(tmp_path / "a.h5", FakeBridge(), failed)) as results:
        data = as_json(results["storm"])
    json.dumps(data, allow_nan=False)
    first = data["loadings"][0]
    assert first["converged"] is False
    assert first["greatest_displacement"] is first["greatest_tension"] is None
    assert first["reaction_sum_n"] == [None] * 3


KINDS = (
    "static", "modes", "history", "equilibrium-path", "buckling", "tune", "form-finding",
)  # fmt: skip


@pytest.mark.parametrize("status", ["failed", "interrupted", "not run"])
@pytest.mark.parametrize("kind", KINDS)
def test_what_gave_no_numbers_still_has_its_status_and_outcome(tmp_path, kind, status) -> None:
    record = Record("lost", kind, status, "NOT A RESULT: nothing holds")
    with open_results(write(tmp_path / "a.h5", FakeBridge(), record)) as results:
        data = json.loads(json.dumps(as_json(results["lost"]), allow_nan=False))
    assert (data["kind"], data["status"]) == (kind, status)
    assert data["outcome"] == "NOT A RESULT: nothing holds"


RECORDS = {
    "static": hanging_record, "modes": pieces_record, "equilibrium-path": path_record,
    "buckling": buckling_record, "tune": tuned_record,
}  # fmt: skip


@pytest.mark.parametrize("kind", RECORDS)
def test_a_failure_before_the_first_loading_mode_or_step_gives_empty_numbers(tmp_path, kind) -> None:
    record = emptied(RECORDS[kind]())
    with open_results(write(tmp_path / "a.h5", FakeBridge(), record)) as results:
        data = json.loads(json.dumps(as_json(results[record.name]), allow_nan=False))
    assert (data["kind"], data["status"]) == (kind, "failed")
    assert not data.get("loadings")
    assert not data.get("frequency_hz")
    assert not data.get("load_factor")


def emptied(record: Record) -> Record:
    """The same without any loading, mode, step or critical point."""
    many = {"loading", "mode", "step", "critical_point"}
    fields = {
        path: replace(f, values=f.values[:0] if set(f.axes[:1]) & many else f.values)
        for path, f in record.fields.items()
    }
    return replace(record, status="failed", fields=fields)
