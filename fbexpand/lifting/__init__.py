"""What a profile has at the rim that the modes have not: subtracted in closed form, kept beside the coefficients."""
