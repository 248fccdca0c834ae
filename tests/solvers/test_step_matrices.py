"""Residuals and matrices of the steps against complex-step derivatives of the plain twins."""

from __future__ import annotations

import numpy as np
import pytest
from moving import motion_of

import plain
import structures
from tautbar.solvers.conserving import EnergyConserving
from tautbar.solvers.conserving import _Trial as ConservingTrial
from tautbar.solvers.motion import State
from tautbar.solvers.newmark import Newmark
from tautbar.solvers.newmark import _Trial as NewmarkTrial

RAYLEIGH = (0.7, 2e-3)
# The twins take l1^2 - l0^2, whose cancellation costs them a factor l/(l1 - l0) of some hundred.
ROUNDING = 1e-11


def everything(viscous):
    """The mixed structure, whose viscous section Newmark's matrix takes only approximately."""
    described = structures.mixed()
    if not viscous:
        del described["sections"]["stiff"]["retardation_time"]
    return described


class Case:
    """A step from a random state to a random increment, and the same in plain numbers."""

    def __init__(self, viscous, seed, lumped=False):
        self.scene, self.motion = motion_of(everything(viscous), "all", lumped, RAYLEIGH)
        self.parts, self.system = self.scene.parts, self.scene.system
        rng = np.random.default_rng(seed)
        n, J = self.system.n, self.system.structure.joints
        q, v, a = 0.05 * rng.normal(size=n), 3 * rng.normal(size=n), 100 * rng.normal(size=n)
        self.now = State(0.02, q, v, a, a)
        self.dt = 0.013
        self.dq = 0.04 * rng.normal(size=n)
        self.T = self.system.freedom.T.toarray().reshape(3, J, n).transpose(1, 0, 2).reshape(3 * J, n)
        loading = self.parts.loadings["all"][0]
        self.rods = plain.in_loading(self.parts, loading)
        force, move = plain.load_vector(self.parts, loading)
        P = plain.free_projector(self.parts)
        self.held = move.ravel() - P @ move.ravel()
        springs = plain.stiffness(self.parts, [], plain.positions(self.parts))
        self.load = self.T.T @ (force.ravel() - springs @ self.held)
        self.M = self.T.T @ np.kron(plain.mass_matrix(self.parts, loading, lumped), np.eye(3)) @ self.T
        self.spring = self.T.T @ springs @ self.T
        self.on = self.carrying(q)
        self.C = RAYLEIGH[0] * self.M + RAYLEIGH[1] * (self.drawn_stiffness() + self.spring)

    def X(self, q):
        """Positions joint by joint, flat; q may be complex."""
        return np.ravel(plain.positions(self.parts)) + self.held + self.T @ q

    def carrying(self, q):
        X = plain.as_joints(self.X(q))
        lengths = [np.sqrt(plain.dot(r, r)) for r in (plain.vector_of(rod, X) for rod in self.rods)]
        return [plain.carries(rod.kind, l - rod.L0) for rod, l in zip(self.rods, lengths, strict=True)]

    def drawn_stiffness(self):
        """Tangents at the start of the history of the members that carry at the start of the step.

        Each as if it carried there; without its compressive geometric part, which would feed energy in.
        """
        X, K = plain.as_joints(self.X(np.zeros(self.system.n))), np.zeros((len(self.T),) * 2)
        for rod, on in zip(self.rods, self.on, strict=True):
            r = plain.vector_of(rod, X)
            l = np.sqrt(plain.dot(r, r))
            nn = np.outer(r, r) / l**2
            N = max(plain.axial_force(rod, l), 0.0)
            B = on * (rod.EA / rod.L0 * nn + N / l * (np.eye(3) - nn))
            i, j = slice(3 * rod.start, 3 * rod.start + 3), slice(3 * rod.end, 3 * rod.end + 3)
            K[i, i] += B
            K[j, j] += B
            K[i, j] -= B
            K[j, i] -= B
        return self.T.T @ K @ self.T

    def pull(self, q):
        F = plain.internal_force(self.rods, plain.as_joints(self.X(q)))
        return self.T.T @ np.array([f for joint in F for f in joint])

    def chi(self, capture):
        viscous = [2 * rod.tau / self.dt for rod in self.rods]
        return [max(1.0, x) if capture and not on else x for x, on in zip(viscous, self.on, strict=True)]


@pytest.fixture(params=[1, 3, 4, 5])
def seed(request):
    return request.param


def assert_close(found, expected):
    assert np.abs(found - expected).max() <= ROUNDING * np.abs(expected).max()


def newmark_residual(case, dq, beta, gamma):
    """Load less inertia, damping and internal force, Newmark's formulas solved for the new acceleration."""
    now, dt = case.now, case.dt
    a = (dq - dt * now.v - dt**2 * (0.5 - beta) * now.a) / (beta * dt**2)
    v = now.v + dt * ((1 - gamma) * now.a + gamma * a)
    return case.load - case.M @ a - case.C @ v - case.pull(now.q + dq) - case.spring @ (now.q + dq)


@pytest.mark.parametrize(("beta", "gamma"), [(0.25, 0.5), (0.3, 0.6)])
def test_newmark_residual_and_matrix(seed, beta, gamma):
    case = Case(viscous=False, seed=seed)
    trial = NewmarkTrial(
        Newmark(beta, gamma), case.motion, case.now, case.now.a, case.dt, case.motion.dead, np.array(case.on)
    ).balance(case.dq)
    assert_close(trial.residual, newmark_residual(case, case.dq, beta, gamma))
    exact = -plain.jacobian(lambda dq: newmark_residual(case, np.array(dq), beta, gamma), case.dq)
    found = case.system.pattern.to_csc(trial._matrix()).toarray()
    assert_close(found, exact)
    b = np.arange(1.0, len(exact) + 1)
    assert_close(exact @ trial.exact_factor().solve(b), b)


def conserving_residual(case, dq, chi):
    now, dt = case.now, case.dt
    F = plain.step_force(case.rods, plain.as_joints(case.X(now.q)), plain.as_joints(case.X(now.q + dq)), chi)
    pull = case.T.T @ np.array([f for joint in F for f in joint])
    inertia = case.M @ (2 * (dq / dt - now.v)) / dt
    return case.load - inertia - case.C @ (dq / dt) - pull - case.spring @ (now.q + dq / 2)


@pytest.mark.parametrize("capture", [True, False])
@pytest.mark.parametrize("viscous", [True, False])
def test_conserving_residual_and_exact_matrix(seed, capture, viscous):
    case = Case(viscous, seed)
    trial = ConservingTrial(case.motion, case.now, case.dt, case.motion.dead, capture).balance(case.dq)
    chi = case.chi(capture)
    assert_close(trial.residual, conserving_residual(case, case.dq, chi))
    exact = -plain.jacobian(lambda dq: conserving_residual(case, np.array(dq), chi), case.dq)
    assert np.abs(exact - exact.T).max() > 1e-6 * np.abs(exact).max(), "the case must be an unsymmetric one"
    b = np.arange(1.0, len(exact) + 1)
    assert_close(exact @ trial.exact_factor().solve(b), b)
    ends = [case.carrying(case.now.q), case.carrying(case.now.q + case.dq)]
    assert ends[0] != ends[1], "members must go slack or taut within the step"


def test_symmetric_form_is_the_exact_one_where_nothing_turns():
    """Masses on a line: the two factors must then agree."""
    joints = {f"J{i}": (1.0 * i, 0, 0) for i in range(5)}
    ties = [
        structures.member(f"t{i}", f"J{i}", f"J{i + 1}", kind="tension-only", pretension=500.0)
        for i in range(4)
    ]
    described = structures.words(
        joints, ties, supports=[structures.held("J0"), {"joints": ["J*"], "fixed": ["y", "z"]}]
    )
    _, motion = motion_of(described)
    v = np.array([1.0, -2.0, 0.5, 3.0])
    now = State(0.0, np.zeros(4), v, 0 * v, 0 * v)
    trial = ConservingTrial(motion, now, 1e-3, motion.dead, True).balance(np.array([1e-3, 2e-3, -1e-3, 4e-3]))
    b = np.arange(1.0, 5.0)
    assert_close(trial.symmetric_factor().solve(b), trial.exact_factor().solve(b))


@pytest.mark.parametrize("method", ["newmark", "conserving"])
def test_newton_is_quadratic_near_the_balance(method):
    """The exact matrix squares the residual each time: orders of 2 until rounding."""
    case = Case(viscous=False, seed=4)
    if method == "newmark":
        on = np.array(case.on)
        trial = NewmarkTrial(Newmark(), case.motion, case.now, case.now.a, case.dt, case.motion.dead, on)
    else:
        trial = ConservingTrial(case.motion, case.now, case.dt, case.motion.dead, True)
    dq, sizes = case.dt * case.now.v, []
    for _ in range(12):
        now = trial.balance(dq)
        sizes.append(np.abs(now.residual).max())
        dq = dq + trial.exact_factor().solve(now.residual)
    floor = 1e-9 * sizes[0]
    tail = [s for s in sizes if s > floor][-3:]
    order = np.log(tail[2] / tail[1]) / np.log(tail[1] / tail[0])
    assert order > 1.7
    assert sizes[-1] < 1e-11 * sizes[0]


def test_steps_end_in_balance():
    """What the steppers return satisfies the plain equations to the tolerance they were asked for."""
    case = Case(viscous=True, seed=2)
    step = EnergyConserving().step(case.motion, case.now, case.now.t + case.dt)
    dq = step.state.q - case.now.q
    left = conserving_residual(case, dq, case.chi(True))
    assert np.abs(left).max() <= 1e-7 * np.abs(case.M @ case.now.v).max() / case.dt
    assert step.state.v == pytest.approx(2 * dq / case.dt - case.now.v, rel=1e-12)
