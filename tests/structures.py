"""Small structures that several tests share, as the words of the model file."""

from __future__ import annotations

import copy

import numpy as np

from tautbar import Model

EA, LINE = 2.0e6, 1.5  # N, kg/m


def member(name, start, end, kind="bar", section="s", **more):
    return {"name": name, "from": start, "to": end, "kind": kind, "section": section, **more}


def words(joints, members, **more):
    """A model's words around joints and members, with one section and everything named held."""
    out = {
        "joints": {name: [float(c) for c in at] for name, at in joints.items()},
        "members": members,
        "sections": {"s": {"axial_stiffness": EA, "mass_per_length": LINE, "expansion": 1.2e-5}},
        "load_cases": {"dead": {"self_weight": 1.0}},
    }
    for key, value in more.items():
        out[key] = {**out[key], **value} if isinstance(out.get(key), dict) else value
    return out


def build(description) -> Model:
    return Model(**copy.deepcopy(description))


def held(*joints):
    return {"joints": list(joints), "fixed": ["x", "y", "z"]}


def mixed():
    """A mast of bars with ties, struts, all ways of giving a length, springs and an inclined roller.

    Every ingredient that kernels tell apart is in it; no symmetry hides a swapped index.
    """
    joints = {
        "A": (0, 0, 0), "B": (4, 0.3, 0), "C": (1, 3.5, 0.2), "D": (1.4, 1.1, 3), "E": (1.7, 1.3, 6),
        "F": (6, -2, 1),
    }  # fmt: skip
    members = [
        member("ad", "A", "D"),
        member("bd", "B", "D", section="stiff"),
        member("cd", "C", "D", kind="compression-only", unstressed_length=3.9),
        member("de", "D", "E", pretension=-900.0),
        member("ae", "A", "E", kind="tension-only", pretension=1500.0),
        member("be", "E", "B", kind="tension-only", section="stiff", pretension=700.0),
        member("ce", "C", "E", kind="tension-only", slack=0.02),
        member("ef", "E", "F", kind="tension-only", pretension=400.0),
        member("bf", "F", "B"),
        member("af", "F", "A", kind="compression-only", slack=0.01),
        member("cf", "C", "F", kind="tension-only", pretension=300.0),
    ]
    return words(
        joints,
        members,
        sections={"stiff": {"stiffness": 3.0e5, "mass_per_length": 0.8, "retardation_time": 2e-3,
                            "expansion": 1.0e-5}},
        supports=[
            held("A", "B"),
            {"joints": ["C"], "along": [1, 2, 2]},
            {"joints": ["C"], "along": [2, 1, -2]},
            {"joints": ["F"], "springs": {"x": 4e4, "z": 7e4}},
        ],
        masses=[{"joints": ["E"], "mass": 12.0}, {"members": ["ad", "ef"], "per_length": 0.7}],
        load_cases={
            "dead": {"self_weight": 1.0},
            "lamps": {"masses": [{"joints": ["E", "F"], "mass": 25.0}],
                      "forces": [{"joints": ["E"], "force": [120.0, -60.0, 30.0]}]},
            "line": {"line_loads": [{"members": ["ad", "bf"], "per_length": [1.0, 20.0, -35.0]}]},
            "cold": {"temperature_change": -30.0},
            "tight": {"take_up": [{"members": ["ce", "ae"], "length": 0.015}]},
            "moved": {"movements": [{"joints": ["B"], "move": [0.004, -0.002, -0.01]}]},
        },
        combinations={
            "all": {"dead": 1.2, "lamps": 0.8, "line": 1.0, "cold": 0.7, "tight": 0.9, "moved": 1.1},
        },
    )  # fmt: skip


def bouncer(mass=80.0, drop=0.5, length=4.0, EA=4.0e5, **more):
    """A mass that falls ``drop`` on one massless tie below a hook, straight down z."""
    return words(
        {"hook": (0, 0, 0), "load": (0, 0, -length)},
        [member("tie", "hook", "load", kind="tension-only", section="tie", slack=drop)],
        sections={"tie": {"axial_stiffness": EA, "mass_per_length": 0.0, **more}},
        supports=[held("hook"), {"joints": ["load"], "fixed": ["x", "y"]}],
        masses=[{"joints": ["load"], "mass": mass}],
    )


def tumbling_net(n=3, slack=0.02):
    """A free-flying net of n x n joints, its ties ``slack`` longer than drawn (a share of their length)."""
    rng = np.random.default_rng(5)
    joints = {
        f"J{i}{k}": np.array([i, k, 0.0]) + 0.1 * rng.normal(size=3) for i in range(n) for k in range(n)
    }
    pairs = [(f"J{i}{k}", f"J{i + 1}{k}") for i in range(n - 1) for k in range(n)]
    pairs += [(f"J{i}{k}", f"J{i}{k + 1}") for i in range(n) for k in range(n - 1)]
    pairs += [(f"J{i}{k}", f"J{i + 1}{k + 1}") for i in range(n - 1) for k in range(n - 1)]
    ties = []
    for i, (a, b) in enumerate(pairs):
        length = float(np.linalg.norm(joints[a] - joints[b]))
        ties.append(member(f"t{i}", a, b, kind="tension-only", unstressed_length=length * (1 + slack)))
    return words(
        joints,
        ties,
        sections={"s": {"axial_stiffness": 2e5, "mass_per_length": 1.0}},
        masses=[{"joints": [name], "mass": 1.0 + 0.5 * i} for i, name in enumerate(joints)],
        unsupported="allowed",
        gravity=0.0,
    )


def guyed_mast(slack=None, pretension=None, tip=(0.0, 0.0)):
    """A pinned mast of one bar, held upright by three guys, with a weight on top."""
    given = {"slack": slack} if slack else {"pretension": pretension}
    angle = 2 * np.pi * np.arange(3) / 3
    joints = {"foot": (0, 0, 0), "top": (*tip, 10)} | {
        f"anchor{i}": (8 * np.cos(a), 8 * np.sin(a), 0) for i, a in enumerate(angle)
    }
    guys = [
        member(f"guy{i}", f"anchor{i}", "top", kind="tension-only", section="guy", **given) for i in range(3)
    ]
    return words(
        joints,
        [member("mast", "foot", "top", section="mast"), *guys],
        sections={
            "mast": {"axial_stiffness": 2e8, "mass_per_length": 20.0},
            "guy": {"axial_stiffness": 5e6, "mass_per_length": 0.5},
        },
        supports=[held("foot", "anchor0", "anchor1", "anchor2")],
        masses=[{"joints": ["top"], "mass": 300.0}],
    )


def hanging(span=20.0, rise=4.0, pieces=16, EA=5e5, line=2.0, **given):
    """A rope between two hooks, ``given`` its length by one of the four ways."""
    return words(
        {"low": (0, 0, 0), "high": (span, 0, rise)},
        [member("rope", "low", "high", kind="hanging", pieces=pieces, **given)],
        sections={"s": {"axial_stiffness": EA, "mass_per_length": line}},
        supports=[held("low", "high")],
    )
