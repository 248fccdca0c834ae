"""What is computed and holds, and should still be known: strength passed, folding, pulses cut, viscosity."""

from __future__ import annotations

import numpy as np
import pytest

import structures
from structures import held, member
from tautbar import InputError, find_modes, solve_history, solve_static

G = 9.80665


def pulled(P, kind="bar", **section):
    """One member 2 m long between a hook and a joint that slides along it, pulled by P."""
    out = structures.words(
        {"A": (0, 0, 0), "B": (2, 0, 0)},
        [member("m", "A", "B", kind=kind)],
        sections={"s": {"axial_stiffness": 4e6, "mass_per_length": 0.0} | section},
        supports=[held("A"), {"joints": ["B"], "fixed": ["y", "z"]}],
        masses=[{"joints": ["B"], "mass": 10.0}],
        load_cases={"P": {"forces": [{"joints": ["B"], "force": [P, 0, 0]}]}},
    )
    if "material" in section:
        out["materials"] = {"steel": {"modulus": 2e11, "yield_strength": 2.5e8}}
        del out["sections"]["s"]["axial_stiffness"]
    return structures.build(out)


STEEL = {"material": "steel", "area": 2e-5}  # 5 kN at yield
EULER = np.pi**2 * 4e6 * (0.02 / 2) ** 2  # N of a strut with 20 mm of radius of gyration


@pytest.mark.parametrize(
    ("limit", "sign", "section", "kind", "said"),
    [
        (5000.0, 1, STEEL, "bar", "is above the yield strength of its section (5 kN)"),
        (5000.0, -1, STEEL, "bar", "is above the yield strength of its section (5 kN)"),
        (8100.0, 1, {"breaking_force": 9000.0, "end_factor": 0.9}, "tension-only",
         "is above the breaking force at its end (8.1 kN)"),
        (EULER, -1, {"radius_of_gyration": 0.02}, "compression-only",
         "is above the Euler load of a strut hinged at both ends (3.95 kN)"),
    ],
)  # fmt: skip
def test_strength_passed_is_a_warning_and_not_below(limit, sign, section, kind, said):
    for share in (0.99, 1.01):
        a = solve_static(pulled(sign * share * limit, kind, **section), "P")
        warned = [w for w in a.record.warnings if said in w]
        assert bool(warned) == (share > 1)
        assert a.record.status == "complete", "no limit is a limit unasked"
        if warned:
            assert "in m is above" in warned[0]
            assert warned[0].endswith(": P")


def test_tension_is_not_held_against_the_euler_load_nor_compression_against_breaking():
    model = pulled(3 * EULER, radius_of_gyration=0.02)
    assert solve_static(model, "P").record.warnings == ()
    model = pulled(-9000.0, breaking_force=9000.0, end_factor=0.9)
    assert solve_static(model, "P").record.warnings == ()


def test_the_worst_is_named_and_the_others_counted():
    described = structures.words(
        {"A": (0, 0, 0), "B": (2, 0, 0), "C": (4, 0, 0), "D": (5, 0, 0)},
        [member("ab", "A", "B"), member("bc", "B", "C"), member("cd", "C", "D")],
        sections={"s": {"axial_stiffness": 4e6, "mass_per_length": 0.0, "breaking_force": 1000.0}},
        supports=[held("A"), {"joints": ["B", "C", "D"], "fixed": ["y", "z"]}],
        load_cases={"P": {"forces": [{"joints": ["B", "C"], "force": [600.0, 0, 0]},
                                     {"joints": ["D"], "force": [500.0, 0, 0]}]}},
    )  # fmt: skip
    a = solve_static(structures.build(described), "P")
    (warned,) = a.record.warnings
    assert warned.startswith("1.7 kN in ab is above the breaking force at its end (1 kN): P")
    assert warned.endswith("1 more members too")


# ---- histories ----


def test_the_first_bar_past_its_euler_load_and_when():
    """Pushed at once by P the bar's force is -P (1 - cos wt): past the Euler load where cos wt = 1 - E/P."""
    P = 3000.0
    model = pulled(-P, radius_of_gyration=0.02)
    h = solve_history(model, loads="P", duration=0.02, time_step=1e-5, geometry="small", mass="lumped")
    omega = np.sqrt(4e6 / 2 / 10.0)
    when = np.arccos(1 - EULER / P) / omega
    (said,) = [w for w in h.record.warnings if "first past its Euler load" in w]
    assert said.startswith("m is the first past its Euler load, at ")
    # The step that finds it past, no earlier.
    assert float(said.split(" at ")[1].split()[0]) == pytest.approx(when + 5e-6, abs=7e-6)
    assert any("is above the Euler load" in w and "at its peak" in w for w in h.record.warnings)
    short = solve_history(model, loads="P", duration=0.9 * when, time_step=1e-5, geometry="small")
    assert not any("Euler" in w for w in short.record.warnings)


def test_yield_and_breaking_at_the_peak():
    model = pulled(600.0, breaking_force=1100.0)
    h = solve_history(model, loads="P", duration=0.02, time_step=1e-5, geometry="small")
    # Put on at once: twice the force.
    assert any(w.startswith("1.2 kN in m is above the breaking force") for w in h.record.warnings)


@pytest.mark.parametrize(("swing", "warned"), [(25.0, False), (35.0, True)])
def test_a_bar_that_turns_by_more_than_thirty_degrees_is_named(swing, warned):
    """A pendulum drawn at an angle falls to the other side: it turns by twice that from the drawing."""
    angle = np.deg2rad(swing) / 2
    described = structures.words(
        {"pin": (0, 0, 0), "bob": (2 * np.sin(angle), 0, -2 * np.cos(angle))},
        [member("arm", "pin", "bob")],
        sections={"s": {"axial_stiffness": 2e5, "mass_per_length": 0.0}},
        supports=[held("pin"), {"joints": ["bob"], "fixed": ["y"]}],
        masses=[{"joints": ["bob"], "mass": 5.0}],
    )
    asked = {"loads": "dead", "duration": 2.0, "time_step": 5e-3, "method": "energy-conserving"}
    h = solve_history(structures.build(described), **asked)
    said = [w for w in h.record.warnings if "degrees from where it is drawn" in w]
    assert bool(said) == warned
    assert np.rad2deg(h["audit/greatest_turn"]) == pytest.approx(swing, rel=5e-3)
    if warned:
        assert said[0].startswith("arm turned 35 degrees")


@pytest.mark.parametrize(("times", "warned"), [(9.0, False), (11.0, True)])
def test_so_much_viscosity_that_it_hides_slack_is_named(times, warned):
    """More than ten times what a wave takes along the tie, L0 sqrt(m/EA)."""
    transit = 4.5 * np.sqrt(2.0 / 4e5)
    described = structures.bouncer(retardation_time=times * transit)
    described["sections"]["tie"]["mass_per_length"] = 2.0
    h = solve_history(structures.build(described), loads="dead", duration=0.05, time_step=1e-3)
    said = [w for w in h.record.warnings if "retardation_time of tie is 11 times" in w]
    assert bool(said) == warned


def hit(duration, start, shape="half-sine"):
    described = structures.bouncer()
    described["events"] = {"hit": {"kind": "pulse", "shape": shape, "duration": duration, "start": start,
                                   "forces": [{"joints": ["load"], "force": [0, 0, -10.0]}]}}  # fmt: skip
    h = solve_history(structures.build(described), events=["hit"], duration=0.2, time_step=1e-3)
    return " ".join(h.record.warnings)


def test_an_event_that_the_record_cuts_is_named():
    assert "ends at 0.2 s, within the event hit (to 0.25 s)" in hit(0.1, 0.15)
    assert "the event hit starts at 0.3 s, after the end of the record" in hit(0.1, 0.3)
    assert "event hit" not in hit(0.1, 0.1), "to the end, to rounding"
    assert "event hit" not in hit(0.1, 0.05)
    assert "event hit" not in hit(0.1, 0.15, "ramp"), "a ramp stays: it has no end"


# ---- settings given in memory ----


def static(**settings):
    solve_static(structures.build(structures.mixed()), "all", **settings)


def modes(**settings):
    find_modes(structures.build(structures.mixed()), **settings)


def history(**settings):
    settings = {"duration": 0.01, "time_step": 1e-3} | settings
    solve_history(structures.build(structures.mixed()), loads="dead", **settings)


@pytest.mark.parametrize(
    ("ask", "settings", "said"),
    [
        (static, {"geometri": "small"}, "no setting is called 'geometri'; did you mean geometry?"),
        (static, {"tolerence": 1e-6}, "did you mean tolerance?"),
        (static, {"xyz": 1}, "no setting is called 'xyz'; there are: geometry, steps, tolerance, folding"),
        (static, {"geometry": "tiny"}, "geometry = 'tiny': \"large\" or \"small\" is wanted"),
        (static, {"steps": 0}, "steps = 0: a whole number above 0 is wanted"),
        (static, {"steps": True}, "steps = True: a whole number above 0 is wanted"),
        (static, {"tolerance": 2.0}, "a number between 0 and 1 is wanted"),
        (static, {"folding": "allowed"}, "true or false is wanted"),
        (modes, {"cuont": 3}, "did you mean count?"),
        (modes, {"count": 2.5}, "count = 2.5: a whole number above 0 is wanted"),
        (modes, {"up_to": -1.0}, "up_to = -1.0: a number above 0 is wanted"),
        (modes, {"mass": "heavy"}, "\"consistent\" or \"lumped\" is wanted"),
        (history, {"metod": "newmark"}, "did you mean method?"),
        (history, {"method": "newmarck"}, "\"newmark\" or \"energy-conserving\" is wanted"),
        (history, {"gamma": 0.3}, "gamma = 0.3: a number of at least 0.5 is wanted"),
        (history, {"time_step": 0.0}, "time_step = 0.0: a number above 0 is wanted"),
        (history, {"duration": -1.0}, "duration = -1.0: a number above 0 is wanted"),
        (history, {"snap_loss": "some"}, "\"capture\" or \"none\" is wanted"),
    ],
)  # fmt: skip
def test_settings_are_checked(ask, settings, said):
    with pytest.raises(InputError) as caught:
        ask(**settings)
    assert said in str(caught.value)
    assert caught.value.exit_code == 2


@pytest.mark.parametrize(
    ("ask", "settings"),
    [
        (static, {"tolerance": "small"}),
        (modes, {"up_to": "10 Hz"}),
        (history, {"gamma": "0.6"}),
        (history, {"time_step": "1 ms"}),
    ],
)
def test_settings_of_another_type_are_refused_alike(ask, settings):
    with pytest.raises(InputError, match="is wanted"):
        ask(**settings)
