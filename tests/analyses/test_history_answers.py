"""Histories against closed forms: oscillators, bounces, decay, and what is kept of them."""

from __future__ import annotations

import numpy as np
import pytest

import structures
from structures import held, member
from tautbar import Model, find_modes, solve_history, solve_static
from tautbar.analyses.job import prepare
from tautbar.model.parts import Damping

G = 9.80665


def oscillator(k=4000.0, mass=10.0, kind="bar", event=None, **more):
    """A mass on a spring of k N/m along x, one metre long; without weight in x."""
    out = structures.words(
        {"A": (0, 0, 0), "B": (1, 0, 0)},
        [member("spring", "A", "B", kind=kind, section="k")],
        sections={"k": {"axial_stiffness": k, "mass_per_length": 0.0}},
        supports=[held("A"), {"joints": ["B"], "fixed": ["y", "z"]}],
        masses=[{"joints": ["B"], "mass": mass}],
        load_cases={"push": {"forces": [{"joints": ["B"], "force": [80.0, 0, 0]}]}},
    )
    if event:
        out["events"] = {
            "hit": {"kind": "pulse", "forces": [{"joints": ["B"], "force": [100.0, 0, 0]}], **event}
        }
    return out | more


OMEGA = 20.0


@pytest.mark.parametrize("method", ["newmark", "energy-conserving"])
def test_step_load_doubles_the_static_answer(method):
    """Put on at once: u = (P/k)(1 - cos wt); the error of either rule is (w dt)^2/12 of the phase."""
    model = structures.build(oscillator())
    h = solve_history(model, duration=1.0, time_step=1e-3, loads="push", method=method, geometry="small")
    exact = 80.0 / 4000 * (1 - np.cos(OMEGA * h["time"]))
    phase = (OMEGA * 1e-3) ** 2 / 12 * OMEGA * 1.0
    assert h.displacement("B")[:, 0] == pytest.approx(exact, abs=1.1 * phase * 0.02)
    assert h["peaks/displacement/max"][1, 0] == pytest.approx(0.04, rel=1e-4)
    assert any("put on at once" in w for w in h.record.warnings)
    assert h["audit/energy_left_over"] < 1e-9


def duhamel(shape, duration, t, start=0.0):
    """Displacement of the undamped oscillator under 100 N times a pulse, by the convolution integral."""
    x, weight = np.polynomial.legendre.leggauss(60)
    s, weight = (x + 1) * duration / 2, weight * duration / 2
    kernel = np.sin(OMEGA * np.maximum(t[:, None] - start - s[None, :], 0.0)) / (10.0 * OMEGA)
    return (100.0 * shape(s / duration) * kernel) @ weight


SHAPES = {
    "rectangle": np.ones_like,
    "half-sine": lambda x: np.sin(np.pi * x),
    "triangle": lambda x: np.minimum(2 * x, 2 - 2 * x),
    "sawtooth": lambda x: x,
}


@pytest.mark.parametrize("shape", SHAPES)
@pytest.mark.parametrize("method", ["newmark", "energy-conserving"])
@pytest.mark.parametrize(("start", "duration"), [(0.0, 0.0731), (0.0213, 0.0506), (0.0004, 0.0013)])
def test_pulses_that_do_not_fit_the_steps(shape, method, start, duration):
    """Corners between steps are landed on, so that jumps cost no accuracy: 3e-3 is (w dt)^2 and phase.

    The last pulse is shorter than one step and begins within the first: a curved one is crossed in ten
    steps of its own (average acceleration, which asks for forces at the ends of a step, would not meet it
    otherwise), where the mean of both ends falls short of a sine's impulse by pi^2/12/100 = 8.2e-3;
    another's impulse is put in as if spread evenly, so it comes up to T/6 too early (sawtooth), a phase
    of w T/6 = 4e-3.
    """
    event = {"shape": shape, "start": start, "duration": duration}
    model = structures.build(oscillator(event=event))
    h = solve_history(model, events=["hit"], duration=0.5, time_step=2e-3, method=method, geometry="small")
    exact = duhamel(SHAPES[shape], duration, h["time"], start)
    outside = (h["time"] <= start) | (h["time"] >= start + duration)
    found = h.displacement("B")[:, 0]
    limit = 5e-3 if duration < 2e-3 else 3e-3
    if (method, shape, duration) == ("newmark", "half-sine", 0.0013):
        limit = 8.5e-3
    assert found[outside] == pytest.approx(exact[outside], abs=limit * np.abs(exact).max())
    assert h["time"] == pytest.approx(2e-3 * np.arange(251), abs=1e-15)
    corners = {0.0, start, start + duration} | ({start + duration / 2} if shape == "triangle" else set())
    if shape == "half-sine" and duration < 10 * 2e-3:
        corners |= set(start + duration * np.arange(1, 10) / 10)
    between = [c for c in corners if abs(c / 2e-3 - round(c / 2e-3)) > 1e-6]
    assert h["audit/computed_steps"] == 250 + len(between)
    assert h["audit/energy_left_over"] < 1e-9
    assert any("hit lasts fewer than 10 steps" in w for w in h.record.warnings) == (duration < 0.02)


def stored(every, **settings):
    """A pushed oscillator's history with every so many steps kept: its frames, those kept, its record."""
    asked = {"name": "h", "kind": "history", "precision": "double", "store": {"every": every}}
    run = prepare(structures.build(oscillator(analyses=[asked | settings]))).run("h")
    frames = list(run.frames())
    return frames, [f for f in frames if f.values is not None], run.record()


def test_the_end_is_landed_on_exactly_and_kept():
    _, kept, _ = stored(4, duration=0.0207, time_step=1e-3, loads="push", geometry="small")
    times = [f.time for f in kept]
    assert times[-1] == 0.0207
    assert times[:-1] == pytest.approx([0.0, 0.004, 0.008, 0.012, 0.016, 0.02])
    exact = 0.02 * (1 - np.cos(OMEGA * 0.0207))
    assert kept[-1].values["displacement"][1, 0] == pytest.approx(exact, rel=1e-4)


def test_peaks_are_of_every_computed_step_whatever_is_stored():
    settings = {"duration": 0.5, "time_step": 1e-3, "loads": "push", "geometry": "small"}
    every = solve_history(structures.build(oscillator()), **settings)
    frames, kept, few = stored(50, **settings)
    assert len(kept) == 11
    for path, field in every.record.fields.items():
        if path.startswith("peaks/"):
            assert (few[path] == field.values).all(), path
    u = every.displacement("B")[:, 0]
    assert few["peaks/displacement/max"][1, 0] == u.max()
    assert few["peaks/displacement/time_of_max"][1, 0] == every["time"][u.argmax()]
    assert few["peaks/axial_force/min"][0] == every.axial_force("spring").min()
    assert max(f.values["displacement"][1, 0] for f in kept) < u.max()
    assert [f.energy[0] for f in frames] == list(every["energy/time"])


def test_only_what_is_asked_for_is_stored():
    described = structures.mixed()
    described["analyses"] = [
        {"name": "s", "kind": "static", "loads": "all"},
        {"name": "h", "kind": "history", "from": "s", "duration": 0.01, "time_step": 1e-3,
         "store": {"joints": ["E", "F"], "members": ["ae"]}},
    ]  # fmt: skip
    job = prepare(structures.build(described))
    job.run("s")
    run = job.run("h")
    frames = list(run.frames())
    assert run.streamed["displacement"].shape == (2, 3)
    assert frames[3].values["displacement"].shape == (2, 3)
    assert frames[3].values["axial_force"].shape == (1,)
    assert run.record()["peaks/displacement/max"].shape == (6, 3)


# ---- slack ----


def dropped(tau=None, **settings):
    """A mass dropped 0.5 m onto its tie, and the closed form of what follows."""
    more = {} if tau is None else {"retardation_time": tau}
    model = structures.build(structures.bouncer(**more))
    arguments = {"duration": 1.5, "time_step": 6e-4, "loads": "dead", "snap_loss": "none"} | settings
    return solve_history(model, **arguments)


@pytest.fixture(scope="module")
def bounced():
    return dropped()


def test_slack_episodes_and_snatch_of_a_bouncing_mass(bounced):
    """Free fall, then an oscillator that starts at the slack point with the speed of the fall."""
    h = bounced
    m, k, drop = 80.0, 4e5 / 4.5, 0.5
    omega, v, sag = np.sqrt(k / m), np.sqrt(2 * G * drop), 80.0 * G / k
    fall = v / G
    # In contact x = sag (1 - cos wt) + v/w sin wt, from x = 0 down and back to x = 0.
    contact = 2 * (np.pi - np.arctan(v / (omega * sag))) / omega
    taut = [fall + i * (contact + 2 * fall) for i in range(2)]
    assert (h["slack/member"] == 0).all()
    # Linear interpolation of the looseness between steps: g dt^2/8 over the speed, far below 1e-6 s;
    # phase error of the contact (w dt)^2/12 of 0.1 s, summing up: 4e-6 s a bounce.
    assert h["slack/start"][:2] == pytest.approx([0.0, taut[0] + contact], abs=1e-5)
    assert h["slack/end"][:2] == pytest.approx(taut, abs=1e-5)
    snatch = k * (sag + np.sqrt(sag**2 + (v / omega) ** 2))
    assert h["slack/snatch_force"][:2] == pytest.approx([snatch, snatch], rel=3e-4)
    assert h["peaks/axial_force/max"][0] == pytest.approx(snatch, rel=3e-4)
    slack_time = np.nansum(np.where(np.isnan(h["slack/end"]), 1.5, h["slack/end"]) - h["slack/start"])
    assert h["slack_share"][0] == pytest.approx(slack_time / 1.5, rel=1e-9)
    assert any("snapped taut without viscosity" in w for w in h.record.warnings)
    assert "hardest snatch" in str(h)


def test_an_episode_that_lasts_has_no_end():
    h = dropped(duration=0.2)
    assert h["slack/start"] == pytest.approx([0.0])
    assert np.isnan(h["slack/end"]).all()
    assert h["slack_share"][0] == 1.0
    assert "from the start" in str(h)


@pytest.mark.parametrize(
    ("method", "step", "mass"),
    [
        ("energy-conserving", 5e-4, "lumped"),
        ("energy-conserving", 5e-4, "consistent"),
        ("newmark", 1e-4, "lumped"),
    ],
)
def test_reactions_and_loads_are_the_rate_of_momentum(method, step, mass):
    """At every step, from slack to snatch, masses at all joints included."""
    described = structures.mixed()
    hit = [4000.0, 1000.0, -500.0]
    described["events"] = {"hit": {"kind": "pulse", "shape": "half-sine", "duration": 0.05, "start": 0.01,
                                   "forces": [{"joints": ["E"], "force": hit}]}}  # fmt: skip
    model = structures.build(described)
    state = solve_static(model, "all")
    h = solve_history(model, state, events=["hit"], duration=0.07, time_step=step, method=method, mass=mass)
    acting = h.context.first_scene().acting(model.parts.loadings["all"][0])
    M = h.context.first_scene().system.joint_mass(acting, mass == "lumped").toarray()
    pulse = np.sin(np.pi * np.clip((h["time"] - 0.01) / 0.05, 0, 1))[:, None] * np.array(hit)
    rate = np.einsum("jk,tkc->tc", M, h["acceleration"])
    total = h["reaction"].sum(axis=1) + acting.force.sum(axis=1) + pulse
    # Newmark leaves up to 1e-9 of its forces unbalanced each step, and keeps it in its acceleration.
    assert total == pytest.approx(rate, abs=1e-6 * np.abs(h["reaction"]).max())
    assert np.abs(rate).max() > 1000


def test_reactions_balance_with_damping_while_members_snap():
    described = structures.guyed_mast(slack=0.02)
    described["events"] = {"hit": {"kind": "pulse", "shape": "half-sine", "duration": 0.2,
                                   "forces": [{"joints": ["top"], "force": [6000.0, 2500, 0]}]}}  # fmt: skip
    model = structures.build(described)
    state = solve_static(model, "dead")
    h = solve_history(
        model, state, events=["hit"], duration=1.0, time_step=2e-3, damping=Damping((0.05,), (5.0,)),
    )  # fmt: skip
    assert h["slack/member"].size > 3
    M = h.context.first_scene().system.joint_mass(h.context.drawn().acting, True).toarray()
    load = h.context.first_scene().acting(model.parts.loadings["dead"][0]).force.sum(axis=1)
    pulse = np.where(h["time"] < 0.2, np.sin(np.pi * h["time"] / 0.2), 0.0)[:, None] * np.array(
        [6000.0, 2500, 0]
    )
    rate = np.einsum("jk,tkc->tc", M, h["acceleration"])
    total = h["reaction"].sum(axis=1) + load + pulse
    assert total == pytest.approx(rate, abs=1e-6 * np.abs(h["reaction"]).max())


def test_a_state_of_rest_stays_at_rest():
    """No event: nothing moves, nothing goes slack, to the balance the state was found with."""
    for described, loads in ((structures.mixed(), "all"), (structures.guyed_mast(slack=0.05), "dead")):
        model = structures.build(described)
        state = solve_static(model, loads)
        h = solve_history(model, state, duration=0.2, time_step=1e-3)
        moved = np.abs(h["displacement"] - state["displacement"]).max()
        assert moved < 1e-8
        assert h["axial_force"] == pytest.approx(np.repeat(state["axial_force"], len(h["time"]), 0), abs=0.02)
        assert h["reaction"][-1] == pytest.approx(state["reaction"][0], abs=0.02)
        slack = {h.context.member_names[m] for m in h["slack/member"]}
        assert slack == {n for n, t in zip(h.context.member_names, state["taut"][0], strict=True) if not t}
        assert h["audit/iterations"] <= 200


def test_support_springs_vibrate():
    """A mass on a ground spring beside a bar: both stiffnesses count, and the spring's energy."""
    described = oscillator(supports=[held("A"), {"joints": ["B"], "fixed": ["y", "z"]},
                                     {"joints": ["B"], "springs": {"x": 5000.0}}])  # fmt: skip
    model = structures.build(described)
    h = solve_history(model, duration=0.6, time_step=5e-4, loads="push", geometry="small")
    omega = np.sqrt(9000 / 10)
    exact = 80 / 9000 * (1 - np.cos(omega * h["time"]))
    assert h.displacement("B")[:, 0] == pytest.approx(exact, abs=1e-3 * 80 / 9000)
    assert h.joint("reaction", "B")[:, 0] == pytest.approx(-5000 * exact, abs=1e-3 * 50)
    assert h["energy/strain"].max() == pytest.approx(0.5 * 9000 * (160 / 9000) ** 2, rel=1e-4)
    assert h["audit/energy_left_over"] < 1e-9


def test_energies_by_hand(bounced):
    h = bounced
    x = h.displacement("load")[:, 2]
    v = h.joint("velocity", "load")[:, 2]
    N = h.axial_force("tie")
    assert h["energy/kinetic"] == pytest.approx(40 * v**2, rel=1e-12)
    assert h["energy/strain"] == pytest.approx(N**2 / (2 * 4e5 / 4.5), rel=1e-10)
    assert h["energy/load_potential"] == pytest.approx(80 * G * x, rel=1e-12)
    total = h["energy/kinetic"] + h["energy/strain"] + h["energy/load_potential"]
    assert h["energy/unaccounted"] == pytest.approx(total - total[0], abs=1e-9)
    assert np.abs(h["energy/unaccounted"]).max() < 1e-8 * h["energy/kinetic"].max()


def test_work_of_an_event_is_force_times_way():
    model = structures.build(oscillator(event={"shape": "rectangle", "duration": 0.09}))
    h = solve_history(model, events=["hit"], duration=0.2, time_step=1e-3, geometry="small")
    at_end = np.interp(0.09, h["time"], h.displacement("B")[:, 0])
    assert h["energy/event_work"][-1] == pytest.approx(100.0 * at_end, rel=1e-6)
    assert (h["energy/event_work"][91:] == h["energy/event_work"][91]).all()


def test_history_agrees_with_its_modes():
    """Plucked in one mode's shape by a short step load, a truss rings at the modes' frequency."""
    model = structures.build(oscillator())
    f = find_modes(model, count=1)["frequency"][0]
    h = solve_history(model, duration=8 / f, time_step=1 / (200 * f), loads="push", geometry="small")
    u = h.displacement("B")[:, 0] - 0.02
    crossings = np.flatnonzero((u[:-1] < 0) & (u[1:] >= 0))
    t = h["time"][crossings] + (h["time"][1] - h["time"][0]) * u[crossings] / (
        u[crossings] - u[crossings + 1]
    )
    assert 1 / np.diff(t).mean() == pytest.approx(f, rel=2e-4)


def test_a_small_geometry_tie_still_never_pushes():
    """geometry = "small" linearises geometry only; the mass flies back free of the tie and leaves."""
    model = structures.build(oscillator(kind="tension-only", event={"shape": "half-sine", "duration": 0.02}))
    h = solve_history(model, events=["hit"], duration=0.4, time_step=1e-3, geometry="small", snap_loss="none")
    assert h["peaks/axial_force/min"][0] == 0.0
    assert h.displacement("B")[-1, 0] < -0.02
    v = h.joint("velocity", "B")[-100:, 0]
    assert v == pytest.approx(np.full(100, v[0]), rel=1e-9)


def test_model_file_words_reach_the_march():
    """The same history asked for in the file and in memory."""
    described = structures.mixed()
    described["events"] = {"hit": {"kind": "pulse", "shape": "triangle", "duration": 0.03,
                                   "forces": [{"joints": ["E"], "force": [2000.0, 0, 0]}]}}  # fmt: skip
    described["analyses"] = [
        {"name": "s", "kind": "static", "loads": "all"},
        {"name": "h", "kind": "history", "from": "s", "events": ["hit"], "duration": 0.05, "time_step": 1e-3,
         "precision": "double", "snap_loss": "none", "mass": "consistent"},
    ]  # fmt: skip
    model = Model(**described)
    job = prepare(model)
    job.run("s")
    run = job.run("h")
    last = list(run.frames())[-1]
    h = solve_history(
        model, solve_static(model, "all"), events=["hit"], duration=0.05, time_step=1e-3, snap_loss="none",
        mass="consistent",
    )  # fmt: skip
    assert last.values["displacement"] == pytest.approx(h["displacement"][-1], abs=1e-12)
    assert run.settings["from"] == "s"
    assert run.acting == (
        "all: 1.2 dead + 0.8 lamps + 1 line + 0.7 cold + 0.9 tight + 1.1 moved; events: hit",
    )


def test_a_model_without_any_free_direction_marches_and_has_no_modes():
    described = structures.words(
        {"A": (0, 0, 0), "B": (2, 0, 0)}, [member("m", "A", "B", pretension=700.0)], supports=[held("A", "B")]
    )
    described["events"] = {"hit": {"kind": "pulse", "shape": "rectangle", "duration": 0.01,
                                   "forces": [{"joints": ["B"], "force": [5.0, 0, 0]}]}}  # fmt: skip
    model = structures.build(described)
    state = solve_static(model, "dead")
    h = solve_history(model, state, events=["hit"], duration=0.02, time_step=1e-3)
    assert (h.axial_force("m") == h.axial_force("m")[0]).all()
    reaction = h.joint("reaction", "B")[:, 0]
    assert reaction[[5, 15]] == pytest.approx([700.0 - 5.0, 700.0], rel=1e-12)
    modes = find_modes(model, state)
    assert modes["frequency"].size == 0
    assert "there are no modes" in str(modes)
