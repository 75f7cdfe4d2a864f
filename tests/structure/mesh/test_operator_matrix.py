"""Stiffness of one region as a matrix and as what multiplies."""

import numpy as np

import vib
from vib.structure.mesh.operators import CellOperator


def test_the_matrix_of_a_region_multiplies_as_its_operator():
    system = vib.read("models/base_plate.toml").system()
    assert system.anatomy is not None
    both = [matrix for part in system.anatomy.parts for matrix in (part.stiffness, part.mass)]
    operators = [matrix for matrix in both if isinstance(matrix, CellOperator)]
    assert operators
    shapes = np.random.default_rng(1).standard_normal((system.size, 3))
    for operator in operators:
        wanted = operator @ shapes
        assert np.abs(operator.matrix() @ shapes - wanted).max() < 1e-12 * np.abs(wanted).max()
