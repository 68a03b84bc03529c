"""Bases: eigenfunctions of the radial Laplacian, their roots and norms."""

from fbexpand.bases.dini import Dini as Dini
from fbexpand.bases.fourier_bessel import FourierBessel as FourierBessel
from fbexpand.bases.protocol import Basis as Basis
from fbexpand.bases.protocol import same_basis as same_basis
