"""What holds for every test."""

import os

# The matrices of the tests are small: a second BLAS thread costs more than it brings, above all where two
# test runs share a machine. Must be set before numpy is loaded; a value from outside wins.
os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")
