"""Compiled loops: numba, math and NumPy arrays only; no validation, no Python objects."""
