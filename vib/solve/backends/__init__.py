"""Sparse factorisations behind one small interface.

`choice.factor` picks the backend; `interface.Factor` is what every backend gives: many right-hand sides at
once, the inertia, a residual checked after every factorisation, and its memory released on request.
"""
