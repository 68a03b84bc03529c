"""Sums of modes at many radii, and plans for inner loops."""

from fbexpand.transform.plan import Transform as Transform
