"""Slow plain twins of the vectorised kernels: one member at a time, straight from the formulas.

Nothing here comes from the package but the names of a model's parts. Joint vectors are lists of
three numbers a joint; numbers may be floats, complex (for complex-step derivatives) or mpmath's.

Formulas: engineering strain N = EA (l - L0)/L0; consistent mass (m L0/6)[[2, 1], [1, 2]];
Rayleigh and Newmark as published; discrete gradient g = 2 (dU + loss)/(l1^2 - l0^2).
"""

from __future__ import annotations

from dataclasses import dataclass

import mpmath
import numpy as np

KIND = {0: "bar", 1: "tie", 2: "strut", 3: "hanging"}


@dataclass
class Rod:
    """One member in plain numbers, SI."""

    start: int
    end: int
    kind: str
    EA: float
    L0: float
    m: float = 0.0
    expansion: float = 0.0
    tau: float = 0.0


def real(x):
    """The real part that decides whether a tie is taut."""
    return x.real if isinstance(x, complex | np.complexfloating) else x


def dot(a, b):
    return a[0] * b[0] + a[1] * b[1] + a[2] * b[2]


def root(x):
    return mpmath.sqrt(x) if isinstance(x, mpmath.mpf) else x**0.5


def positions(parts):
    return [[parts.joints.x[j], parts.joints.y[j], parts.joints.z[j]] for j in range(len(parts.joints.names))]


def rods(parts):
    """Members of a model without hanging ones, lengths by what each one gives."""
    X, m, out = positions(parts), parts.members, []
    for i in range(len(m.names)):
        section = parts.sections[m.section[i]]
        r = [X[m.end[i]][c] - X[m.start[i]][c] for c in range(3)]
        l = root(dot(r, r))
        EA, L0 = section.axial_stiffness, l
        if m.unstressed_length[i] == m.unstressed_length[i]:
            L0 = m.unstressed_length[i]
        elif m.slack[i] == m.slack[i]:
            L0 = l - m.slack[i] if KIND[m.kind[i]] == "strut" else l + m.slack[i]
        elif m.pretension[i] == m.pretension[i]:
            L0 = l / (1 + m.pretension[i] / EA) if EA else l - m.pretension[i] / section.stiffness
        out.append(
            Rod(
                m.start[i],
                m.end[i],
                KIND[m.kind[i]],
                EA if EA else section.stiffness * L0,
                L0,
                section.mass_per_length or 0.0,
                section.expansion or 0.0,
                section.retardation_time,
            )
        )
    return out


def in_loading(parts, loading):
    """The rods with their lengths under a loading: take-up first, then the temperature."""
    out = rods(parts)
    take_up, heating = [0.0] * len(out), [0.0] * len(out)
    for name, factor in loading.factors.items():
        case = parts.load_cases[name]
        for which, length in case.take_up:
            for i in which:
                take_up[i] += factor * length
        for which, change in case.temperature_change:
            for i in which:
                heating[i] += factor * change * out[i].expansion
    for i, rod in enumerate(out):
        rod.L0 = (rod.L0 - take_up[i]) * (1 + heating[i])
    return out


def vector_of(rod, X):
    return [X[rod.end][c] - X[rod.start][c] for c in range(3)]


def carries(kind, e):
    return kind == "bar" or (kind == "tie" and real(e) > 0) or (kind == "strut" and real(e) < 0)


def axial_force(rod, l):
    e = l - rod.L0
    return rod.EA * e / rod.L0 if carries(rod.kind, e) else 0.0 * e


def strain_energy(rods, X):
    total = 0.0
    for rod in rods:
        r = vector_of(rod, X)
        e = root(dot(r, r)) - rod.L0
        if carries(rod.kind, e):
            total = total + rod.EA / rod.L0 * e * e / 2
    return total


def internal_force(rods, X):
    """What the members' forces ask of every joint: minus the force that they put on it."""
    F = [[0.0, 0.0, 0.0] for _ in X]
    for rod in rods:
        r = vector_of(rod, X)
        l = root(dot(r, r))
        N = axial_force(rod, l)
        for c in range(3):
            F[rod.end][c] = F[rod.end][c] + N * r[c] / l
            F[rod.start][c] = F[rod.start][c] - N * r[c] / l
    return F


def member_tangent(rod, X):
    """(EA/L0) n nT while it carries + (N/l)(I - n nT), 3x3."""
    r = vector_of(rod, X)
    l = root(dot(r, r))
    k = rod.EA / rod.L0 if carries(rod.kind, l - rod.L0) else 0.0
    N = axial_force(rod, l)
    B = np.zeros((3, 3))
    for c in range(3):
        for d in range(3):
            nn = r[c] * r[d] / (l * l)
            B[c, d] = k * nn + N / l * ((c == d) - nn)
    return B


def stiffness(parts, rods, X):
    """Dense tangent over all joint directions, joint by joint (3J, 3J), springs to ground included."""
    K = np.zeros((3 * len(X), 3 * len(X)))
    for rod in rods:
        B = member_tangent(rod, X)
        for a, b, sign in ((rod.start, rod.start, 1), (rod.end, rod.end, 1), (rod.start, rod.end, -1),
                           (rod.end, rod.start, -1)):  # fmt: skip
            for c in range(3):
                for d in range(3):
                    K[3 * a + c, 3 * b + d] += sign * B[c, d]
    for support in parts.supports:
        for axis, k in support.springs:
            for j in support.joints:
                K[3 * j + axis, 3 * j + axis] += k
    return K


def free_projector(parts):
    """Projector on the free directions, joint by joint (3J, 3J): Gram-Schmidt over what is held."""
    J = len(parts.joints.names)
    P = np.eye(3 * J)
    for j in range(J):
        directions = [] if parts.held_axis is None else [np.eye(3)[parts.held_axis]]
        for support in parts.supports:
            if j in support.joints:
                directions += [np.eye(3)[a] for a in support.fixed]
                directions += [np.array(support.along)] if support.along is not None else []
        basis: list[np.ndarray] = []
        for d in directions:
            for b in basis:
                d = d - (d @ b) * b
            if np.sqrt(d @ d) > 1e-9:
                basis.append(d / np.sqrt(d @ d))
        for b in basis:
            P[3 * j : 3 * j + 3, 3 * j : 3 * j + 3] -= np.outer(b, b)
    return P


def drawn_length(parts, i):
    X, m = positions(parts), parts.members
    r = [X[m.end[i]][c] - X[m.start[i]][c] for c in range(3)]
    return root(dot(r, r))


def own_masses(parts):
    """Masses of the model at its joints [kg], those along members half to each end."""
    mass = [0.0] * len(parts.joints.names)
    for given in parts.masses:
        for j in given.joints:
            mass[j] += given.mass
        for i in given.members:
            for j in (parts.members.start[i], parts.members.end[i]):
                mass[j] += given.per_length * drawn_length(parts, i) / 2
    return mass


def mass_matrix(parts, loading, lumped):
    """Between joints (J, J) [kg]; masses of load cases once each, whatever their factor."""
    J = len(parts.joints.names)
    M = np.zeros((J, J))
    for rod in rods(parts):
        whole = rod.m * rod.L0
        for a in (rod.start, rod.end):
            for b in (rod.start, rod.end):
                if lumped:
                    M[a, b] += whole / 2 * (a == b)
                else:
                    M[a, b] += whole / 6 * (2 if a == b else 1)
    for j, mass in enumerate(own_masses(parts)):
        M[j, j] += mass
    for name, factor in loading.factors.items():
        for joints, mass in parts.load_cases[name].masses:
            for j in joints:
                M[j, j] += mass * (factor != 0)
    return M


def load_vector(parts, loading):
    """Forces on the joints and movements of held ones, (J, 3) each."""
    J = len(parts.joints.names)
    F, move = np.zeros((J, 3)), np.zeros((J, 3))
    down = np.zeros(3)
    down[parts.up] = -parts.gravity
    members = rods(parts)
    for name, factor in loading.factors.items():
        case = parts.load_cases[name]
        for j, mass in enumerate(own_masses(parts)):
            F[j] += factor * case.self_weight * mass * down
        for rod in members:
            for j in (rod.start, rod.end):
                F[j] += factor * case.self_weight * rod.m * rod.L0 / 2 * down
        for joints, mass in case.masses:
            for j in joints:
                F[j] += factor * mass * down
        for joints, force in case.forces:
            for j in joints:
                F[j] += factor * np.array(force)
        for which, q in case.line_loads:
            for i in which:
                for j in (members[i].start, members[i].end):
                    F[j] += factor * drawn_length(parts, i) / 2 * np.array(q)
        for joints, by in case.movements:
            for j in joints:
                move[j] += factor * np.array(by)
    return F, move


def step_strength(kind, k, L0, l0, l1, chi=0):
    """g of the conserving step [N/m] by its meaning: force times mid-step vector does the exact work.

    Work over the step is g (r0 + r1)/2 . (r1 - r0) = g (l1^2 - l0^2)/2, and must be the change of
    strain energy plus what chi takes. A one-way member never acts against its sense.
    """
    sigma = -1 if kind == "strut" else 1
    p0, p1 = (sigma * (l - L0) for l in (l0, l1))
    if kind != "bar":
        p0, p1 = max(real(p0), 0) and p0, max(real(p1), 0) and p1
        if real((1 + chi) * p1 + (1 - chi) * p0) < 0:
            return 0 * l1
    work = k * (p1 * p1 - p0 * p0) / 2 + chi * k * (p1 - p0) * (p1 - p0) / 2
    return 2 * work / (l1 * l1 - l0 * l0)


def step_force(rods, X0, X1, chi):
    """Force of the conserving step that members ask of every joint; ``chi`` a number a member."""
    F = [[0.0, 0.0, 0.0] for _ in X0]
    for rod, own in zip(rods, chi, strict=True):
        r0, r1 = vector_of(rod, X0), vector_of(rod, X1)
        g = step_strength(rod.kind, rod.EA / rod.L0, rod.L0, root(dot(r0, r0)), root(dot(r1, r1)), own)
        for c in range(3):
            pull = g * (r0[c] + r1[c]) / 2
            F[rod.end][c] = F[rod.end][c] + pull
            F[rod.start][c] = F[rod.start][c] - pull
    return F


def jacobian(function, x, step=1e-30):
    """Derivatives of ``function(list of numbers) -> list of numbers`` by the complex step."""
    columns = []
    for i in range(len(x)):
        moved = [complex(v) for v in x]
        moved[i] += 1j * step
        columns.append([complex(f).imag / step for f in function(moved)])
    return np.array(columns).T


def as_joints(flat):
    """Flat numbers, three a joint, as a list of joints."""
    return [list(flat[3 * j : 3 * j + 3]) for j in range(len(flat) // 3)]


def catenary_span(H, V, L0, EA, w):
    """Level and vertical distance of a catenary's ends, V the mean of its vertical pulls (Irvine 1981).

    Textbook form, whose differences cancel where the rope is taut: give it more digits than are wanted.
    """
    low, high = V - w * L0 / 2, V + w * L0 / 2
    T0, T1 = root(H * H + low * low), root(H * H + high * high)
    log = mpmath.log if isinstance(T0, mpmath.mpf) else np.log
    return [H * L0 / EA + H / w * log((high + T1) / (low + T0)), V * L0 / EA + (T1 - T0) / w]


def catenary_flexibility(H, V, L0, EA, w):
    """Derivatives of the span over (H, V) to 50 digits: dx/dH, dx/dV = dz/dH, dz/dV."""
    with mpmath.workdps(80):
        H, V, L0, EA, w = (mpmath.mpf(float(v)) for v in (H, V, L0, EA, w))
        # Small beside H and beside all that V - w L0/2 may leave; its square is beyond 50 digits.
        step = H * mpmath.mpf(10) ** -26

        def slope(dH, dV):
            up = catenary_span(H + dH, V + dV, L0, EA, w)
            down = catenary_span(H - dH, V - dV, L0, EA, w)
            return [(a - b) / (2 * step) for a, b in zip(up, down, strict=True)]

        return (*slope(step, 0), slope(0, step)[1])
