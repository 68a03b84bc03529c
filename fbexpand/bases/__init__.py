"""Bases: eigenfunctions of the radial Laplacian, their roots and norms."""
