"""The same coefficients by adaptive quadrature, with roots, J_nu and norms from elsewhere."""

from fbexpand.crosscheck.check import crosscheck as crosscheck
from fbexpand.crosscheck.record import CrossCheck as CrossCheck
from fbexpand.crosscheck.record import Seconds as Seconds
