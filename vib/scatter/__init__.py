"""Scatter and sweeps: what the tolerances of a study do to its frequencies, damping and levels."""
