"""The beam element against integration of its shape functions, and laws that it must obey."""

import dataclasses

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from vib.structure.axes import member_axes, turn_about_x
from vib.structure.beam import Bars, local_mass, local_stiffness, to_global
from vib.structure.rigid import arms

NAMES = [field.name for field in dataclasses.fields(Bars)]
VALUES = [0.7, 2.4e-3, 5.1e-6, 1.7e-6, 4.2e-6, 1.1e-3, 1.6e-3, 2.1e11, 8.1e10, 7850.0]


def one_bar(**changed: float) -> Bars:
    return Bars(
        **{name: np.array([changed.get(name, value)]) for name, value in zip(NAMES, VALUES, strict=True)}
    )


def shape_functions(x: np.ndarray, length: float, shear: float) -> tuple[np.ndarray, ...]:
    """Deflection, rotation, curvature and shear angle (4, k) of the static solution with shear.

    Solved here from scratch: w = a + b x + c x^2 + d x^3, rotation w' - g with the shear angle
    g = -EI w''' / (G As) = -6 d shear L^2 / 12 (equilibrium of a bar loaded at its ends only).
    """
    lag = -0.5 * shear * length**2  # shear angle per unit d

    def deflection(at):
        return np.stack([np.ones_like(at), at, at**2, at**3])

    def rotation(at):
        return np.stack([0 * at, np.ones_like(at), 2 * at, 3 * at**2 - lag])

    ends = np.array([0.0, length])
    w, r = deflection(ends), rotation(ends)
    coefficients = np.linalg.inv(np.stack([w[:, 0], r[:, 0], w[:, 1], r[:, 1]])).T
    curvature = np.stack([0 * x, 0 * x, 2 + 0 * x, 6 * x])
    angle = np.stack([0 * x, 0 * x, 0 * x, lag + 0 * x])
    return tuple(coefficients @ part for part in (deflection(x), rotation(x), curvature, angle))


@pytest.mark.parametrize("plane", ["xy", "xz"])
@pytest.mark.parametrize("shear_area", [np.inf, 1.1e-3, 1e-5])
def test_bending_matrices_are_those_of_the_static_shape_functions(plane, shear_area):
    """Energies integrated by Gauss's rule (exact for these polynomials).

    Source of the method: J. S. Przemieniecki, Theory of Matrix Structural Analysis (1968); integrated here.
    """
    area = {"xy": "shear_area_y", "xz": "shear_area_z"}[plane]
    bar = one_bar(**{area: shear_area})
    length, young, line = VALUES[0], VALUES[7], VALUES[9] * VALUES[1]
    second = {"xy": VALUES[3], "xz": VALUES[2]}[plane]
    shear_stiffness = 0.0 if np.isinf(shear_area) else VALUES[8] * shear_area
    shear = 0.0 if np.isinf(shear_area) else 12 * young * second / (shear_stiffness * length**2)
    points, weights = np.polynomial.legendre.leggauss(6)
    w, r, curvature, angle = shape_functions(0.5 * length * (points + 1), length, shear)
    weights = 0.5 * length * weights
    stiffness = (
        young * second * (curvature * weights) @ curvature.T + shear_stiffness * (angle * weights) @ angle.T
    )
    mass = line * (w * weights) @ w.T + VALUES[9] * second * (r * weights) @ r.T
    index = {"xy": [1, 5, 7, 11], "xz": [2, 4, 8, 10]}[plane]
    signs = np.array([1.0, 1, 1, 1]) if plane == "xy" else np.array([1.0, -1, 1, -1])
    for found, wanted in ((local_stiffness(bar)[0], stiffness), (local_mass(bar)[0], mass)):
        block = found[np.ix_(index, index)]
        scale = np.sqrt(np.outer(np.diag(wanted), np.diag(wanted)))
        np.testing.assert_allclose(block / scale, np.outer(signs, signs) * wanted / scale, atol=1e-12)


def test_tip_of_a_cantilever():
    """PL^3/3EI + PL/(G As) under a force, ML/EI under a moment, TL/GJ, NL/EA: strength of materials."""
    tip = np.linalg.inv(local_stiffness(one_bar())[0, 6:, 6:])
    length, area, iy, iz, torsion, asy, asz, young, shear, _ = VALUES
    wanted = [
        length / (young * area),
        length**3 / (3 * young * iz) + length / (shear * asy),
        length**3 / (3 * young * iy) + length / (shear * asz),
        length / (shear * torsion),
        length / (young * iy),
        length / (young * iz),
    ]
    np.testing.assert_allclose(np.diag(tip), wanted, rtol=1e-11)


angles = st.floats(-3.1, 3.1)
components = st.floats(-5, 5)


@settings(max_examples=40, deadline=None)
@given(angle=angles, turn=angles, tilt=angles, moved=st.tuples(*[components] * 6))
def test_rigid_motion_stores_nothing_and_carries_the_whole_mass(angle, turn, tilt, moved):
    """A bar anywhere, moved as one body: no strain energy, and the kinetic energy of a rigid bar."""
    along = np.array([np.cos(angle) * np.cos(tilt), np.sin(angle) * np.cos(tilt), np.sin(tilt)])
    up = np.array([-np.sin(angle), np.cos(angle), 0.3])
    axes = turn_about_x(member_axes(along[None], up[None], np.array([turn])), np.array([0.2]))
    bar = one_bar()
    start = np.array([1.3, -0.4, 2.2])
    rigid = np.concatenate([arms(start), arms(start + VALUES[0] * along)])
    stiffness, mass = (to_global(f(bar), axes)[0] for f in (local_stiffness, local_mass))
    motion = rigid @ np.array(moved)
    assert abs(motion @ stiffness @ motion) <= 1e-12 * (
        np.abs(motion) @ np.abs(stiffness) @ np.abs(motion) + 1e-300
    )

    length, area, iy, iz, *_, density = VALUES
    middle = start + 0.5 * length * along
    total = density * area * length
    in_bar = density * length * np.diag([iy + iz, iy + area * length**2 / 12, iz + area * length**2 / 12])
    wanted = np.zeros((6, 6))
    wanted[:3, :3], wanted[3:, 3:] = total * np.eye(3), axes[0].T @ in_bar @ axes[0]
    wanted = arms(middle).T @ wanted @ arms(middle)
    np.testing.assert_allclose(rigid.T @ mass @ rigid, wanted, atol=1e-11 * np.abs(wanted).max())
