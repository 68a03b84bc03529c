"""Bessel functions, their zeros and the Dini roots: typed wrappers over the kernels."""
