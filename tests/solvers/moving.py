"""Equations of motion made straight from a model's words, with a start velocity, for tests of steps."""

from __future__ import annotations

import numpy as np

import structures
from tautbar.analyses.context import Context
from tautbar.mechanics.damping import Rayleigh
from tautbar.mechanics.loads import nothing
from tautbar.mechanics.product import Product
from tautbar.mechanics.pulses import event_forces
from tautbar.solvers.march import march
from tautbar.solvers.motion import Motion, damper_blocks


def motion_of(description, loads=None, lumped=True, rayleigh=(0.0, 0.0), small=False):
    """The scene and the motion under one loading (none: nothing acts) about the drawing."""
    parts = structures.build(description).parts
    scene = Context(parts).first_scene()
    system = scene.system
    acting = scene.acting(parts.loadings[loads][0]) if loads else nothing(scene.structure)
    potential = scene.potential(acting, small)
    look = potential.look(np.zeros(system.n))
    blocks = damper_blocks(potential.springs, look.stretch, look.axial, rayleigh[1], small)
    pulses = list(parts.events.values())
    return scene, Motion(
        system=system,
        springs=potential.springs,
        held=scene.held(acting),
        dead=potential.force,
        events=event_forces(pulses, system.structure.joints),
        joint_mass=Product(system.joint_mass(acting, lumped)),
        rayleigh=Rayleigh(*rayleigh),
        damper_blocks=blocks,
        small=small,
    )


def run(motion, stepper, velocity, times):
    """All computed steps of a march from the drawing with a start velocity (n,)."""
    first = motion.start(np.zeros(motion.system.n), velocity, float(times[1]))
    return [marched.step for marched in march(motion, stepper, first, np.asarray(times))]


def energy(motion, step):
    """Kinetic, strain and load energy after a step [J]."""
    q, v = step.state.q, step.state.v
    return motion.kinetic(v) + motion.strain(q, step.stretch) - float(motion.dead @ q)
