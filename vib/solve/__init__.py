"""Factorisations, undamped and quadratic eigenproblems, inertia counts."""
