"""Profiles against a two-dimensional solution on a fine grid of square cells, which shares nothing with them.

Torsion: the warping function w minimises the integral of (w_y - z)^2 + (w_z + y)^2, which is then J
(Saint-Venant's problem; Timoshenko & Goodier, Theory of Elasticity, torsion, from memory). Shear without the
effect of Poisson's ratio: the stress is the gradient of f with laplacian f = -z and no flow across the
boundary, and A_s = I^2 / integral |grad f|^2. Both by bilinear finite elements on the cells whose middles lie
within the outline.
"""

import math
from functools import cache
from typing import NamedTuple

import numpy as np
import pytest
import scipy.sparse as sp
import scipy.sparse.linalg as spl

from vib.study import profiles

SIGNS_Y, SIGNS_Z = np.array([-1, 1, 1, -1]), np.array([-1, -1, 1, 1])
GAUSS = 1 / math.sqrt(3)


class Solution(NamedTuple):
    area: float
    moment_y: float
    moment_z: float
    torsion: float
    shear_y: float
    shear_z: float


def cells_inside(outline, cell, turn):
    """Middles of the columns and rows of cells, the size of a cell, and which cells lie inside (even-odd)."""
    cos, sin = math.cos(turn), math.sin(turn)
    loops = [np.array(line) @ np.array([[cos, -sin], [sin, cos]]) for line in outline]
    low, high = loops[0].min(axis=0), loops[0].max(axis=0)
    count = np.round((high - low) / cell).astype(int)
    size = (high - low) / count
    y, z = (low[k] + (np.arange(count[k]) + 0.5) * size[k] for k in (0, 1))
    inside = np.zeros(count, dtype=bool)
    for loop in loops:
        start, end = loop[:-1], loop[1:]
        for row, height in enumerate(z):
            crossing = (start[:, 1] <= height) != (end[:, 1] <= height)
            a, b = start[crossing], end[crossing]
            for where in a[:, 0] + (height - a[:, 1]) * (b[:, 0] - a[:, 0]) / (b[:, 1] - a[:, 1]):
                inside[:, row] ^= y > where
    return y, z, size, inside


def solve(profile, cell):
    """All properties of a profile about its principal axes, from its outline."""
    y, z, (dy, dz), inside = cells_inside(profile.outline, cell, profile.principal_angle)
    column, row = np.nonzero(inside)
    wide = inside.shape[1] + 1
    corners = np.stack([column, column + 1, column + 1, column]), np.stack([row, row, row + 1, row + 1])
    used, nodes = np.unique((corners[0] * wide + corners[1]).T, return_inverse=True)
    nodes = nodes.reshape(-1, 4)
    stiffness, loads = np.zeros((4, 4)), np.zeros((len(nodes), 4, 3))
    moment_y = moment_z = 0.0
    for a, b in ((i, j) for i in (-GAUSS, GAUSS) for j in (-GAUSS, GAUSS)):
        shape = (1 + SIGNS_Y * a) * (1 + SIGNS_Z * b) / 4
        by_y, by_z = SIGNS_Y * (1 + SIGNS_Z * b) / (2 * dy), SIGNS_Z * (1 + SIGNS_Y * a) / (2 * dz)
        at_y, at_z, weight = y[column] + a * dy / 2, z[row] + b * dz / 2, dy * dz / 4
        stiffness += weight * (np.outer(by_y, by_y) + np.outer(by_z, by_z))
        loads[:, :, 0] += weight * (np.outer(at_z, by_y) - np.outer(at_y, by_z))
        loads[:, :, 1] += weight * np.outer(at_y, shape)
        loads[:, :, 2] += weight * np.outer(at_z, shape)
        moment_y += weight * np.sum(at_z**2)
        moment_z += weight * np.sum(at_y**2)
    places = np.repeat(nodes, 4, axis=1).ravel(), np.tile(nodes, (1, 4)).ravel()
    matrix = sp.coo_array((np.tile(stiffness.ravel(), len(nodes)), places)).tocsc()
    right = np.zeros((len(used), 3))
    np.add.at(right, nodes.ravel(), loads.reshape(-1, 3))
    right -= right.mean(axis=0)
    found = spl.splu(matrix[1:, 1:], permc_spec="MMD_AT_PLUS_A", diag_pivot_thresh=0.0).solve(right[1:])
    energy = np.sum(right[1:] * found, axis=0)
    return Solution(
        area=len(nodes) * dy * dz,
        moment_y=moment_y,
        moment_z=moment_z,
        torsion=moment_y + moment_z - energy[0],
        shear_y=moment_z**2 / energy[1],
        shear_z=moment_y**2 / energy[2],
    )


def test_the_grid_itself_on_a_square():
    """Square: J = 0.140577015 a^4 (Timoshenko & Goodier; from memory), A_s = 5/6 a^2."""
    found = solve(profiles.rectangle(1.0, 1.0), 1 / 60)
    assert found.torsion == pytest.approx(0.140577015, rel=5e-4)
    assert found.shear_z == pytest.approx(5 / 6, rel=5e-4)


MM = 1e-3
# Profile, cell in mm. Sides and walls are whole numbers of cells: only roundings, slopes and turned sides
# have steps.
CASES = {
    "I, roundings": (profiles.i_section(0.2, 0.1, 0.006, 0.008, 0.012), 0.5),
    "H, large roundings": (profiles.i_section(0.152, 0.16, 0.006, 0.009, 0.015), 0.5),
    "H, thick": (profiles.i_section(0.12, 0.106, 0.012, 0.02, 0.012), 0.5),
    "I, sharp": (profiles.i_section(0.2, 0.1, 0.005, 0.008), 0.5),
    "I, web thicker than flange": (profiles.i_section(0.1, 0.08, 0.01, 0.006), 0.5),
    "channel, roundings": (profiles.channel(0.2, 0.08, 0.006, 0.011, 0.013), 0.5),
    "channel, sharp": (profiles.channel(0.1, 0.05, 0.005, 0.005), 0.25),
    "channel, web thicker": (profiles.channel(0.1, 0.05, 0.008, 0.005), 0.25),
    "channel, tapered": (profiles.tapered_channel(0.12, 0.055, 0.007, 0.009, 0.08, 0.009, 0.0045), 0.25),
    "T, compact": (profiles.t_section(0.1, 0.1, 0.011, 0.011, 0.011), 0.5),
    "T, sharp": (profiles.t_section(0.1, 0.1, 0.006, 0.01), 0.5),
    "angle, equal": (profiles.angle(0.08, 0.08, 0.008, 0.01, 0.005), 0.13),
    "angle, unequal": (profiles.angle(0.1, 0.05, 0.008, 0.008, 0.004), 0.2),
    "square hollow": (profiles.square_hollow(0.1, 0.006, 0.009, 0.006), 0.5),
    "rectangular hollow, sharp": (profiles.rectangular_hollow(0.06, 0.12, 0.004), 0.5),
    "circular hollow": (profiles.circular_hollow(0.1, 0.01), 0.25),
    "thick circular hollow": (profiles.circular_hollow(0.05, 0.02), 0.25),
}


@cache
def solved(case):
    profile, cell = CASES[case]
    return profile, solve(profile, cell * MM)


@pytest.mark.parametrize("case", CASES)
def test_area_and_second_moments(case):
    """Within 0.7 %: the steps of the grid along roundings, slopes and turned sides."""
    profile, found = solved(case)
    assert profile.area == pytest.approx(found.area, rel=0.007)
    assert profile.second_moment_y == pytest.approx(found.moment_y, rel=0.007)
    assert profile.second_moment_z == pytest.approx(found.moment_z, rel=0.007)


@pytest.mark.parametrize("case", CASES)
def test_torsion_constant(case):
    """Within 3.5 %: what the published junction formulas are worth, and the steps of the grid."""
    profile, found = solved(case)
    assert profile.torsion_constant == pytest.approx(found.torsion, rel=0.035)


@pytest.mark.parametrize("case", CASES)
def test_shear_areas(case):
    """Within 5 %: thin walls, and the corners that they leave out."""
    profile, found = solved(case)
    assert profile.shear_area_y == pytest.approx(found.shear_y, rel=0.05)
    assert profile.shear_area_z == pytest.approx(found.shear_z, rel=0.05)
