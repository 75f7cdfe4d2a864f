"""Frequencies of square plates of shells against published and closed-form values.

In lambda = omega a^2 sqrt(density h / D), D the bending stiffness.
"""

import numpy as np
import pytest

from tests.structure.cells.meshes import angular_frequencies, square
from vib.structure.cells import FAMILIES, Properties
from vib.structure.sparsity import Group, assemble

# A. W. Leissa, J. Sound Vib. 31 (1973) 257-293, and Vibration of Plates, NASA SP-160 (1969), nu = 0.3; where
# the printed values are upper bounds (CCCC, CFFF, FFFF) recomputed by Legendre Ritz series and C1 elements.
THIN = {
    "SSSS": [19.7392088022, 49.3480220054, 49.3480220054, 78.9568352087, 98.6960440109, 98.6960440109],
    "CCCC": [35.98519, 73.39385, 73.39385, 108.2165, 131.5808, 132.2048],
    "CFFF": [3.471, 8.5062, 21.284, 27.199, 30.954, 54.183],
    "FFFF": [13.4682, 19.59614, 24.2702, 34.80089, 34.80089, 61.09323],
}
# R. D. Mindlin, J. Appl. Mech. 18 (1951) 31-38, Navier series, shear factor 5/6; by thickness over side.
THICK = {
    0.01: [19.73202392, 49.30316179, 49.30316179, 78.84210868, 98.51690399, 98.51690399],
    0.1: [19.06496717, 45.48267991, 45.48267991, 69.79436488, 85.03801331, 85.03801331],
    0.2: [17.44859122, 38.15216648, 38.15216648, 55.15007724, 65.14528015, 65.14528015],
}
kinds = pytest.mark.parametrize(("kind", "tolerance"), [("quad", 0.01), ("triangle", 0.02)])


def parameters(kind, across, height, edges, distorted=0.0):
    """The first six lambdas of a plate with edges x = 0, y = 0, x = 1, y = 1 clamped, simple or free."""
    nodes, cells = square(kind, across)
    sides = [nodes[:, 0] < 1e-9, nodes[:, 1] < 1e-9, nodes[:, 0] > 1 - 1e-9, nodes[:, 1] > 1 - 1e-9]
    inside = ~np.any(sides, axis=0)
    random = np.random.default_rng(4)
    nodes[inside, :2] += distorted / across * random.uniform(-1, 1, size=(inside.sum(), 2))
    held = np.zeros((len(nodes), 6), dtype=bool)
    held[:, [0, 1, 5]] = True
    for side, edge, along in zip(edges, sides, (3, 4, 3, 4), strict=True):
        if side == "C":
            held[edge] = True
        elif side == "S":  # the edge does not deflect, nor turn about its own normal
            held[edge, 2] = held[edge, along] = True
    plate = Properties(youngs_modulus=1.0, poissons_ratio=0.3, density=1.0, thickness=height)
    unit = np.sqrt(height**2 / 12 / (1 - 0.3**2))
    skipped = 3 if edges == "FFFF" else 0
    assembly = assemble(nodes, [Group(FAMILIES[kind], cells, plate)])
    found = angular_frequencies(assembly, held, 6 + skipped, -(unit**2))
    return found[skipped:] / unit


@kinds
@pytest.mark.parametrize("edges", THIN)
def test_thin_plates(kind, tolerance, edges):
    np.testing.assert_allclose(parameters(kind, 16, 0.001, edges), THIN[edges], rtol=tolerance)


@kinds
@pytest.mark.parametrize("edges", THIN)
def test_thin_plates_of_distorted_cells(kind, tolerance, edges):
    np.testing.assert_allclose(parameters(kind, 16, 0.001, edges, 0.25), THIN[edges], rtol=tolerance)


@kinds
@pytest.mark.parametrize("height", THICK)
def test_thick_plates(kind, tolerance, height):
    np.testing.assert_allclose(parameters(kind, 16, height, "SSSS"), THICK[height], rtol=0.01)


@pytest.mark.parametrize("kind", ["quad", "triangle"])
def test_no_locking_however_thin(kind):
    """A hundred-thousandth of the side thick: the same lambdas as a thousandth."""
    thin, thinner = (parameters(kind, 8, height, "SSSS") for height in (1e-3, 1e-5))
    np.testing.assert_allclose(thinner, thin, rtol=1e-4)


@pytest.mark.parametrize("kind", ["quad", "triangle"])
def test_plate_frequencies_converge_with_the_square_of_the_size(kind):
    """Linear curvatures: the error of the first three falls by four with each halving (0.25 left)."""
    errors = [parameters(kind, across, 0.001, "SSSS") / THIN["SSSS"] - 1 for across in (16, 32)]
    np.testing.assert_allclose(np.log2(errors[0] / errors[1])[:3], 2, atol=0.25)
