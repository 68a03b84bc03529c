"""Fourier-Bessel and Dini series of radial profiles: the public names."""

from fbexpand._version import __version__ as __version__
from fbexpand.analysis import expand as expand
from fbexpand.bases import Basis as Basis
from fbexpand.bases import Dini as Dini
from fbexpand.bases import FourierBessel as FourierBessel
from fbexpand.crosscheck import CrossCheck as CrossCheck
from fbexpand.crosscheck import crosscheck as crosscheck
from fbexpand.estimates.records import ErrorEstimate as ErrorEstimate
from fbexpand.exceptions import TruncationWarning as TruncationWarning
from fbexpand.exceptions import UnreachableError as UnreachableError
from fbexpand.expansion import Expansion as Expansion
from fbexpand.expansion import stack as stack
from fbexpand.profiles.table import RadialTable as RadialTable
from fbexpand.records import PartialSum as PartialSum
from fbexpand.special.ascending import ascending_series as ascending_series
from fbexpand.special.bessel import bessel_j as bessel_j
from fbexpand.special.compiled import compiled_bessel_j as compiled_bessel_j
from fbexpand.special.roots import bessel_zeros as bessel_zeros
from fbexpand.special.roots import dini_roots as dini_roots
from fbexpand.special.sequence import bessel_j_sequence as bessel_j_sequence
from fbexpand.warm_up import warm_up as warm_up
