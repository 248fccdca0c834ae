"""An invented rope bridge with made-up results: hanging members, a path, modes with ropes in pieces.

The numbers are chosen so that answers can be said by hand; nothing here is mechanics.
"""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np

from tautbar.records.fields import Field, Record

JOINTS = {"W": (0.0, 0.0, 4.0), "E": (8.0, 0.0, 6.0), "M": (4.0, 0.0, 3.0), "Q": (4.0, 0.0, 2.0)}
MEMBERS = {  # ends, kind, group
    "main.1": ("W", "M", "hanging", "main"),
    "main.2": ("M", "E", "hanging", "main"),
    "hanger": ("M", "Q", "tension-only", "hanger"),
    "prop": ("Q", "E", "bar", "prop"),
}
SAG = {"main.1": 0.4, "main.2": 0.25}  # m
POINTS = 33
MOVED = np.array([[0.0, 0.0, 0.0], [0.0, 0.0, 0.0], [0.01, 0.0, -0.05], [0.0, 0.0, -0.06]])  # m
FORCE = np.array([[5e3, 6e3, 2e3, np.nan], [7e3, 8e3, 0.0, -1e3]])  # N; the prop is not there at first
SHARED = ("loading", "joint", "direction")


@dataclass
class FakeBridge:
    """What `results_files.write` needs of a structure."""

    more_fields: dict[str, Field] = field(default_factory=dict)

    @property
    def model_fields(self) -> dict[str, Field]:
        member = ("member",)
        place = {name: k for k, name in enumerate(JOINTS)}
        ends = np.array([[place[a], place[b]] for a, b, _, _ in MEMBERS.values()])
        return {
            "joints/name": Field(np.array(list(JOINTS)), "1", "names", ("joint",)),
            "joints/position": Field(
                np.array(list(JOINTS.values())), "m", "position", ("joint", "direction")
            ),
            "members/name": Field(np.array(list(MEMBERS)), "1", "names", member),
            "members/group": Field(np.array([m[3] for m in MEMBERS.values()]), "1", "group", member),
            "members/ends": Field(ends, "1", "ends", ("member", "end")),
            "members/kind": Field(np.array([m[2] for m in MEMBERS.values()]), "1", "kind", member),
        } | self.more_fields


def along(name: str) -> np.ndarray:
    """Points (P, 3) of a rope between its displaced ends: a parabola below its chord."""
    place = {joint: k for k, joint in enumerate(JOINTS)}
    start, end = (np.array(JOINTS[joint]) + MOVED[place[joint]] for joint in MEMBERS[name][:2])
    share = np.linspace(0.0, 1.0, POINTS)[:, np.newaxis]
    points = (1.0 - share) * start + share * end
    points[:, 2] -= (4.0 * SAG[name] * share * (1.0 - share))[:, 0]
    return points


def hanging_record(name: str = "hanging", curves: bool = True) -> Record:
    """Two loadings, both displaced alike; in the second the hanger is slack and the prop has come."""
    loads = np.array(["night: calm", "night: storm"])
    per_member = ("loading", "member")
    ends = np.stack([FORCE - 100.0, FORCE + 100.0], axis=2)
    fields = {
        "loads": Field(loads, "1", "loadings", ("loading",)),
        "displacement": Field(np.stack([MOVED, MOVED]), "m", "displacement", SHARED),
        "axial_force": Field(FORCE, "N", "axial force", per_member),
        "end_tension": Field(ends, "N", "tension at the ends", (*per_member, "end")),
        "reaction": Field(np.ones((2, 4, 3)), "N", "reaction", SHARED),
        "taut": Field(np.array([[1, 1, 1, 0], [1, 1, 0, 1]]), "1", "taut", per_member),
        "loose_length": Field(np.where(FORCE == 0.0, 0.02, 0.0), "m", "too long", per_member),
        "slack_onset": Field(np.where(FORCE == 0.0, 0.7, np.nan), "1", "load factor", per_member),
        "converged": Field(np.array([1, 1], dtype=np.int8), "1", "holds", ("loading",)),
        "audit/greatest_turn": Field(np.array([0.1, 0.2]), "rad", "turn", ("loading",)),
    }
    return Record(
        name,
        "static",
        "complete",
        "two loadings hold",
        acting=tuple(loads),
        fields=fields | (_curves() if curves else {}),
    )


def _curves() -> dict[str, Field]:
    points = np.stack([along("main.1"), along("main.2")])
    low = points[np.arange(2), points[:, :, 2].argmin(axis=1)]
    return {
        "rope_curve/member": Field(np.array([0, 1]), "1", "member", ("rope",)),
        "rope_curve/position": Field(
            np.stack([points, points]), "m", "points", ("loading", "rope", "point", "direction")
        ),
        "rope_curve/lowest_point": Field(
            np.stack([low, low]), "m", "lowest", ("loading", "rope", "direction")
        ),
    }


def pieces_record(
    name: str = "modes", start: str = "hanging", acting: str = "", scale: float = 1.0
) -> Record:
    """Two modes with main.1 in two pieces; the joint between them moves most in the first."""
    joints = np.array([*JOINTS, "main.1@1"], dtype=object)
    members = np.array([*list(MEMBERS)[1:], "main.1.1", "main.1.2"], dtype=object)
    position = np.array([*JOINTS.values(), (2.0, 0.0, 3.1)])
    ends = np.array([[2, 1], [2, 3], [3, 1], [0, 4], [4, 2]])
    shape = np.zeros((2, 5, 3))
    shape[0, 4, 2] = 2.0
    shape[1, 2, 0] = 1.0
    at_joint = ("joint_with_pieces", "direction")
    fields = {
        "joint_with_pieces": Field(joints, "1", "joints", ("joint_with_pieces",)),
        "member_with_pieces": Field(members, "1", "members", ("member_with_pieces",)),
        "position_with_pieces": Field(position, "m", "position", at_joint),
        "ends_with_pieces": Field(ends, "1", "ends", ("member_with_pieces", "end")),
        "frequency": Field(scale * np.array([1.5, 2.5]), "Hz", "frequency", ("mode",)),
        "shape": Field(shape, "1", "shape", ("mode", *at_joint)),
        "effective_mass": Field(np.array([[1.0, 2.0, 3.0]] * 2), "kg", "mass", ("mode", "direction")),
    }
    return Record(
        name, "modes", "complete", "2 modes", acting=(acting,), settings={"from": start}, fields=fields
    )


def path_record(name: str = "collapse") -> Record:
    """M goes down 1 m in ten steps over a limit point at half a metre; a bifurcation follows."""
    down = np.linspace(0.0, -1.0, 11)
    moved = np.zeros((11, 4, 3))
    moved[:, 2, 2] = down
    moved[:, 3, 0] = 0.1 * down
    factor = 4.0 * -down * (1.0 + down)
    points = np.stack([moved[5], moved[6]])
    at = ("critical_point", "joint", "direction")
    fields = {
        "load_factor": Field(factor, "1", "load factor", ("step",)),
        "displacement": Field(moved, "m", "displacement", ("step", "joint", "direction")),
        "axial_force": Field(np.outer(factor, [1.0, 2.0, -3.0, 0.0]), "N", "force", ("step", "member")),
        "negative_pivots": Field((down < -0.5).astype(int), "1", "pivots", ("step",)),
        "critical_points/load_factor": Field(factor[[5, 6]], "1", "load factor", ("critical_point",)),
        "critical_points/type": Field(
            np.array(["limit point", "bifurcation"], dtype=object), "1", "type", ("critical_point",)
        ),
        "critical_points/displacement": Field(points, "m", "displacement", at),
    }
    return Record(name, "equilibrium-path", "complete", "over a limit point", fields=fields)


def buckling_record(name: str = "buckling") -> Record:
    shape = np.zeros((2, 4, 3))
    shape[:, 2, 2] = 1.0
    fields = {
        "load_factor": Field(np.array([2.5, -4.0]), "1", "load factor", ("mode",)),
        "shape": Field(shape, "1", "shape", ("mode", "joint", "direction")),
    }
    return Record(name, "buckling", "complete", "2 factors", fields=fields)
