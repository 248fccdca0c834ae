"""What a history decides by itself, how it damps, and how it fails."""

from __future__ import annotations

import numpy as np
import pytest

import structures
from structures import held, member
from tautbar import AnalysisFailed, InputError, find_modes, solve_history, solve_static
from tautbar.analyses.job import prepare
from tautbar.model.parts import Damping
from tautbar.solvers.conserving import EnergyConserving
from tautbar.solvers.motion import StepNotConverged

G = 9.80665


# ---- damping ----


def two_masses():
    """Two masses in a line on bars: two modes of known frequencies, nothing that can go slack."""
    return structures.words(
        {"A": (0, 0, 0), "B": (1, 0, 0), "C": (2, 0, 0)},
        [member("ab", "A", "B", section="k"), member("bc", "B", "C", section="k")],
        sections={"k": {"axial_stiffness": 4000.0, "mass_per_length": 0.0}},
        supports=[held("A"), {"joints": ["B", "C"], "fixed": ["y", "z"]}],
        masses=[{"joints": ["B", "C"], "mass": 10.0}],
        load_cases={"first": {}, "second": {}},
    )


@pytest.mark.parametrize("method", ["newmark", "energy-conserving"])
@pytest.mark.parametrize("mode", [0, 1])
def test_free_vibration_decays_with_the_ratio_asked_for_at_both_frequencies(method, mode):
    """Started in one mode's shape by a state of rest whose load is then taken away.

    Logarithmic decrement 2 pi xi/sqrt(1 - xi^2), taken over ten periods of a hundred steps.
    """
    described = two_masses()
    f = find_modes(structures.build(described), count=2)
    shape = f["shape"][mode, 1:, 0]
    force = 50 * shape / np.abs(shape).max()  # masses are equal: a force in the mode's shape bends only it
    described["load_cases"] = {
        "first": {"forces": [{"joints": [j], "force": [p, 0, 0]} for j, p in zip("BC", force, strict=True)]},
        "rest": {"self_weight": 1e-12},
    }
    model = structures.build(described)
    ratios, hertz = (0.01, 0.03), tuple(f["frequency"])
    start = solve_static(model, "first", geometry="small")
    period = 1 / hertz[mode]
    h = solve_history(
        model, start, loads="rest", duration=10 * period, time_step=period / 100, geometry="small",
        damping=Damping(ratios, hertz), method=method,
    )  # fmt: skip
    u = h.displacement("C")[:, 0]
    xi = ratios[mode]
    decay = np.log(u[0] / u[-1]) / 10
    assert decay == pytest.approx(2 * np.pi * xi / np.sqrt(1 - xi**2), rel=2e-2)
    lost = h["energy/damped"]
    assert (np.diff(lost) >= -1e-15).all()
    assert lost[-1] == pytest.approx(
        h["energy/strain"][0] - h["energy/strain"][-1] - h["energy/kinetic"][-1], rel=1e-6
    )
    said = next(line for line in h.record.audit_lines if line.startswith("Rayleigh damping"))
    assert f"gives 1 % at {hertz[0]:.3g} Hz, 3 % at {hertz[1]:.3g} Hz: mass part" in said


def test_falls_are_not_braked():
    """Free fall beside damping asked for with a mass part: left out, since something can go slack."""
    model = structures.build(structures.bouncer())
    damping = Damping((0.05,), (0.5, 8.0))
    h = solve_history(model, loads="dead", duration=0.3, time_step=1e-3, damping=damping)
    t = h["time"]
    assert h.displacement("load")[:, 2] == pytest.approx(-G * t**2 / 2, abs=1e-9)
    assert "left out: something can go slack" in "\n".join(h.record.audit_lines)
    braked = solve_history(
        model,
        loads="dead",
        duration=0.3,
        time_step=1e-3,
        damping=Damping((0.05,), (0.5, 8.0), mass_part=True),
    )
    a0 = 0.05 * 2 * (2 * np.pi) * 0.5 * 8 / 8.5
    exact = -G / a0 * (t - (1 - np.exp(-a0 * t)) / a0)
    assert braked.displacement("load")[:, 2] == pytest.approx(exact, abs=1e-6)


def test_mass_part_is_left_out_of_free_flight_too():
    described = structures.words(
        {"A": (0, 0, 0), "B": (1, 0, 0)}, [member("m", "A", "B")], unsupported="allowed"
    )
    model = structures.build(described)
    h = solve_history(model, loads="dead", duration=0.5, time_step=1e-2, damping=Damping((0.05,), (5.0,)))
    assert h.displacement("A")[-1, 2] == pytest.approx(-G * 0.125, rel=1e-9)


@pytest.mark.parametrize("method", ["newmark", "energy-conserving"])
def test_damping_vanishes_in_slack_members(method):
    """A mass flung off a damped tie flies on at constant speed: the tie's damper has let go."""
    described = structures.bouncer(drop=0.0001, EA=4e5) | {"gravity": 0.0}
    described["events"] = {"fling": {"kind": "pulse", "shape": "rectangle", "duration": 0.02,
                                     "forces": [{"joints": ["load"], "force": [0, 0, -8000.0]}]}}  # fmt: skip
    model = structures.build(described)
    asked = {"events": ["fling"], "duration": 0.3, "time_step": 2e-4, "damping": Damping((0.2,), (5.0,))}
    if method == "newmark":  # whose ledger does not close over the snap; its flight is straight all the same
        with pytest.raises(AnalysisFailed, match="ledger") as caught:
            solve_history(model, method=method, **asked)
        h = caught.value.record
    else:
        h = solve_history(model, method=method, **asked).record
    slack = (h["axial_force"][:, 0] == 0) & (h["time"] > 0.12)
    v = h["velocity"][slack, 1, 2]
    assert slack.sum() > 500
    assert v[0] > 0.1
    # The step in which the tie lets go may still hold it; after that nothing acts at all.
    assert v[2:] == pytest.approx(np.full(v.size - 2, v[2]), rel=1e-9)
    assert h["energy/damped"][-1] == h["energy/damped"][np.flatnonzero(slack)[2]]
    assert h["energy/damped"][-1] > 1.0


def test_viscous_tie_by_its_differential_equation():
    """Kelvin-Voigt: m x'' + c x' + k x = P with c = k tau, underdamped closed form, tie taut all along."""
    described = structures.bouncer(drop=0.0, retardation_time=4e-3)
    described["members"][0] = member("tie", "hook", "load", kind="tension-only", section="tie")
    model = structures.build(described)
    k, m = 1e5, 80.0
    omega, xi = np.sqrt(k / m), 4e-3 * np.sqrt(k / m) / 2
    wd = omega * np.sqrt(1 - xi**2)
    for method in ("energy-conserving", "newmark"):
        h = solve_history(model, loads="dead", duration=0.4, time_step=2e-4, method=method, geometry="small")
        t = h["time"]
        decay = np.exp(-xi * omega * t)
        exact = -m * G / k * (1 - decay * (np.cos(wd * t) + xi * omega / wd * np.sin(wd * t)))
        assert h.displacement("load")[:, 2] == pytest.approx(exact, abs=2e-3 * np.abs(exact).max())
        x, v = h.displacement("load")[:, 2], h.joint("velocity", "load")[:, 2]
        assert h.axial_force("tie")[5:] == pytest.approx((-k * x - k * 4e-3 * v)[5:], rel=1e-9)
        # All that damping took went out of the energy of the first static overshoot.
        assert h["energy/dissipated_by_method"][-1] == pytest.approx(0.0, abs=1e-6)
        assert h["energy/damped"][-1] > 0.5 * (m * G) ** 2 / (2 * k)


# ---- defaults ----


def defaults_of(described, **more):
    asked = {"name": "h", "kind": "history", "loads": "dead", "duration": 0.01, "time_step": 1e-3, **more}
    return prepare(structures.build(described | {"analyses": [asked]})).run("h").settings


def bars_only():
    described = structures.guyed_mast(pretension=100.0)
    for m in described["members"]:
        m["kind"] = "bar"
    return described


def test_method_and_mass_by_whether_anything_can_go_slack():
    taut = defaults_of(bars_only())
    assert (taut["method"], taut["mass"]) == ("newmark", "consistent")
    loose = defaults_of(structures.guyed_mast(pretension=100.0))
    assert (loose["method"], loose["mass"], loose["snap_loss"]) == ("energy-conserving", "lumped", "capture")
    strut = bars_only()
    strut["members"][0]["kind"] = "compression-only"
    del strut["members"][0]["section"]
    strut["members"][0]["section"] = "mast"
    assert defaults_of(strut)["method"] == "energy-conserving"
    asked = defaults_of(structures.guyed_mast(pretension=100.0), method="newmark", mass="consistent")
    assert (asked["method"], asked["mass"], asked["beta"], asked["gamma"]) == (
        "newmark",
        "consistent",
        0.25,
        0.5,
    )


def test_mass_part_by_whether_anything_can_fall():
    damping = {"ratio": 0.02, "at": [1.0, 10.0]}
    assert defaults_of(bars_only(), damping=damping)["rayleigh_mass_part"] > 0
    assert defaults_of(structures.guyed_mast(pretension=100.0), damping=damping)["rayleigh_mass_part"] == 0
    insisted = damping | {"mass_part": True}
    found = defaults_of(structures.guyed_mast(pretension=100.0), damping=insisted)
    assert found["rayleigh_mass_part"] == pytest.approx(2 * 0.02 * 2 * np.pi * 10 / 11, rel=1e-12)


def test_masses_of_the_loading_count_in_the_motion_once():
    """Half the weight of a lamp acts, the whole of its mass moves: a = g m/2/(m) in its first instant."""
    described = structures.bouncer(mass=20.0)
    described["load_cases"]["lamp"] = {"masses": [{"joints": ["load"], "mass": 60.0}]}
    h = solve_history(structures.build(described), loads={"lamp": 0.5}, duration=0.01, time_step=1e-3)
    assert h["acceleration"][0, 1, 2] == pytest.approx(-G * 30 / 80, rel=1e-12)


def test_unknown_events_are_refused():
    with pytest.raises(InputError, match="no event is called 'bang'"):
        solve_history(structures.build(structures.bouncer()), events=["bang"], duration=1.0, time_step=0.1)


# ---- halving and failing ----


def test_halved_steps_reach_the_same_end(monkeypatch):
    """A stretch where long steps are refused: finer there, whole again after, everything counted."""
    plain_step = EnergyConserving.step

    def balky(self, motion, now, t):
        if 0.1 <= now.t < 0.12 and t - now.t > 6e-4:
            raise StepNotConverged
        return plain_step(self, motion, now, t)

    model = structures.build(structures.bouncer())
    settings = {"loads": "dead", "duration": 0.5, "time_step": 2e-3}
    smooth = solve_history(model, **settings)
    monkeypatch.setattr(EnergyConserving, "step", balky)
    h = solve_history(model, **settings)
    assert h["time"] == pytest.approx(smooth["time"], abs=1e-15)
    assert h["audit/greatest_halving"] == 2
    assert 250 < h["audit/computed_steps"] < 300
    assert h.displacement("load")[-1, 2] == pytest.approx(smooth.displacement("load")[-1, 2], abs=1e-3)
    assert "halved up to 2 times" in "\n".join(h.record.audit_lines)
    assert h["audit/energy_left_over"] < 1e-9


def test_a_history_that_cannot_go_on_is_failed_with_its_finished_steps_kept(monkeypatch):
    plain_step = EnergyConserving.step

    def stuck(self, motion, now, t):
        if now.t >= 0.2:
            raise StepNotConverged
        return plain_step(self, motion, now, t)

    monkeypatch.setattr(EnergyConserving, "step", stuck)
    with pytest.raises(AnalysisFailed, match=r"NOT A RESULT: the step from 0\.2 s") as caught:
        solve_history(structures.build(structures.bouncer()), loads="dead", duration=0.5, time_step=2e-3)
    record = caught.value.record
    assert record.status == "failed"
    assert record["time"] == pytest.approx(2e-3 * np.arange(101))
    assert record["displacement"].shape == (101, 2, 3)
    assert record["displacement"][-1, 1, 2] == pytest.approx(-G * 0.02, rel=1e-9)
    assert record["peaks/velocity/min"][1, 2] == pytest.approx(-G * 0.2, rel=1e-9)


def test_a_newmark_snatch_fails_its_ledger_in_words():
    """The average-acceleration rule through a snap: energy appears, and the run is no result."""
    model = structures.build(structures.bouncer(EA=4e7))
    with pytest.raises(AnalysisFailed) as caught:
        solve_history(model, loads="dead", duration=1.0, time_step=4e-3, method="newmark")
    text = str(caught.value)
    assert text.startswith("NOT A RESULT: the energy ledger does not close: ")
    assert 'method = "energy-conserving"' in text
    record = caught.value.record
    assert record["audit/energy_left_over"] > 1e-6
    assert abs(record["energy/unaccounted"]).max() == pytest.approx(
        record["audit/energy_left_over"] * record["audit/energy_turned_over"], rel=1e-9
    )
    ok = solve_history(model, loads="dead", duration=1.0, time_step=4e-3)
    assert ok["audit/energy_left_over"] < 1e-6


def test_an_interrupted_history_says_how_far_it_got():
    described = structures.bouncer()
    described["analyses"] = [
        {"name": "h", "kind": "history", "loads": "dead", "duration": 1.0, "time_step": 0.01}
    ]
    run = prepare(structures.build(described)).run("h")
    frames = run.frames()
    for _ in range(21):
        next(frames)
    record = run.record(status_if_cut="interrupted")
    assert record.status == "interrupted"
    assert "interrupted at 0.2 s of 1 s" in record.outcome


def test_capture_loss_is_booked_and_shown():
    model = structures.build(structures.bouncer())
    kept = solve_history(model, loads="dead", duration=1.5, time_step=4e-3, snap_loss="none")
    caught = solve_history(model, loads="dead", duration=1.5, time_step=4e-3)
    assert np.abs(kept["energy/dissipated_by_method"]).max() < 1e-9
    lost = caught["energy/dissipated_by_method"]
    assert lost[-1] > 0
    assert (np.diff(lost) >= -1e-12).all()
    assert np.abs(caught["energy/unaccounted"]).max() < 1e-8 * 400


def test_static_start_is_under_its_own_loads_unless_others_are_named():
    """From a state under load, with another loading named: only that acts, and it moves at once."""
    described = structures.guyed_mast(pretension=3000.0)
    described["load_cases"]["wind"] = {"forces": [{"joints": ["top"], "force": [900.0, 0, 0]}]}
    model = structures.build(described)
    state = solve_static(model, {"dead": 1.0, "wind": 1.0})
    let_go = solve_history(model, state, loads="dead", duration=0.02, time_step=1e-3)
    # The wind of 900 N is gone: what it held back accelerates the top's mass the other way.
    mass = 300.0 + 20.0 * 10 / 2 + 3 * 0.5 * np.sqrt(164) / 2
    assert let_go["acceleration"][0, 1, 0] == pytest.approx(-900.0 / mass, rel=2e-3)
