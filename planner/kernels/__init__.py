"""Compiled kernels: plain float64 arrays and scalars in, arrays or floats out.

Each file stands by itself, because the compiler's disk cache does not notice an edit in another
file. No randomness, no file access, no planner constant; units and shapes stand in the docstrings.
Every kernel has a plain NumPy twin in the tests.
"""
