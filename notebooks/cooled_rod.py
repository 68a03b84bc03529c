# ---
# jupyter:
#   jupytext:
#     formats: ipynb,py:percent
#   kernelspec:
#     display_name: Python 3
#     language: python
#     name: python3
# ---

# %% [markdown]
# # A rod cooled by convection: from a table of temperatures to a cooling curve
#
# A glass rod of radius 25 mm has been heated unevenly and now stands in moving air. Its temperature above the air was
# "measured" at 18 radii. (The numbers are invented, for this notebook only.) How many terms of the Dini series describe
# it, how wrong is what they leave out, and how many does the temperature a minute later need?

# %%
import numpy as np
from matplotlib import pyplot as plt

from fbexpand import Dini, Expansion, RadialTable, crosscheck, expand

r = np.array([0.6, 1.4, 2.5, 4.0, 5.5, 7.0, 8.5, 10.0, 11.5, 13.0, 14.5, 16.0, 17.5, 19.0, 20.5, 22.0, 23.4, 24.4])
temperature = np.array(
    [239.9, 239.4, 238.4, 235.8, 232.0, 227.0, 221.1, 214.2, 206.5,
     198.1, 189.0, 179.4, 169.4, 159.1, 148.6, 138.1, 128.2, 121.3]
)  # fmt: skip

# %% [markdown]
# At the surface the heat that arrives is what the air takes away, $k\,\partial T/\partial r + h\,T = 0$. With
# $h = 52.8$ W/(m² K) and $k = 1.1$ W/(m K) the Robin coefficient is the Biot number $hR/k = 1.2$.

# %%
rod = Dini.from_transfer(52.8, 1.1, 0.025)
rod = Dini(radius=25.0, robin=rod.robin)  # the same, radii in millimetres
table = RadialTable(r, temperature, extend="both")
series = expand(table, rod, tol=1e-3)
print(series)
print("coefficients", series.coefficients[:5].round(3))

# %% [markdown]
# The error comes in parts: what the terms left out carry, what the quadrature may have missed, what lies between the
# radii of the table and beyond them, and rounding. Here the table decides: its own resolution is the larger part.

# %%
estimate = series.error_estimate()
size = series.norm()
for part in ("truncation", "quadrature", "table", "rounding"):
    print(f"{part:>10}: {getattr(estimate, part) / size:.1e} of the norm")
print("terms for 1 %, 0.1 %, 0.01 %:", [int(series.terms_for(tol)) for tol in (1e-2, 1e-3, 1e-4)])

# %% [markdown]
# Do not take our word for the coefficients: the cross-check computes them again by SciPy's adaptive quadrature, with
# roots, Bessel functions and norms from SciPy.

# %%
print(crosscheck(series, table, indices=[1, 2, 3]))

# %% [markdown]
# As the rod cools each coefficient decays on its own, $c_k(t) = c_k \exp(-a \lambda_k^2 t / R^2)$, with the diffusivity
# $a = 0.6$ mm²/s of this glass. The high modes go first: after a minute two terms do what took seven at the start.

# %%
diffusivity = 0.6  # mm^2/s
times = np.array([0.0, 10.0, 60.0, 300.0])  # s
decay = np.exp(-diffusivity * rod.eigenvalues(series.terms) * times[:, None])
cooling = Expansion(rod, series.coefficients * decay)
share = np.abs(cooling.orthonormal) / np.abs(cooling.orthonormal).max(axis=1, keepdims=True)
for t, row in zip(times, share, strict=True):
    print(f"t = {t:5.0f} s: {np.count_nonzero(row > 1e-3)} terms above a thousandth of the largest")

# %%
radii = np.linspace(0.0, 25.0, 201)
figure, axes = plt.subplots(figsize=(6.4, 3.6), layout="constrained")
for t, line, style in zip(times, cooling(radii), ("-", "--", "-.", ":"), strict=True):
    axes.plot(radii, line, style, color="#10243e", label=f"{t:.0f} s")
axes.plot(r, temperature, "o", color="#a8461f", markersize=4, label="table")
axes.set_xlabel("r in mm")
axes.set_ylabel("temperature above the air in K")
axes.legend()
plt.show()

# %% [markdown]
# Temperatures predicted like this guide, they do not certify: verify independently what safety depends on. Local codes
# and licensed practice decide.
