"""Error estimates of partial sums: measured against the profile, or from the decay of the coefficients."""
