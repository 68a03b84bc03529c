"""From profiles to coefficients."""

from fbexpand.analysis.expand import expand as expand
