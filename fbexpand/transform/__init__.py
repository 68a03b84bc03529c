"""Sums of modes at many radii."""
