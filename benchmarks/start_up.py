"""Time fresh processes: the import, and the first `expand` with compiled code on disk and without.

    python -m benchmarks.start_up

The import is timed over that of NumPy and SciPy; medians, except without compiled code, which is timed once.
"""

from __future__ import annotations

import os
import subprocess
import sys
import tempfile

import numpy as np

from benchmarks.measure import seconds, table, verdict, versions

CODE = """
import time
import numpy, scipy
start = time.perf_counter()
import fbexpand
middle = time.perf_counter()
fbexpand.expand(lambda r: numpy.exp(-r * r), fbexpand.{basis}, terms=50)
print(middle - start, time.perf_counter() - middle)
"""
BASES = ("FourierBessel()", "FourierBessel(0.3)", "Dini(robin=1.0)", "FourierBessel(60.5)")
RUNS = 7


def run(basis: str, folder: str) -> list[float]:
    """Return the seconds of the import and of the first expand in a process of its own."""
    environment = {**os.environ, "FBEXPAND_CACHE_DIR": folder}
    code = CODE.format(basis=basis)
    done = subprocess.run([sys.executable, "-c", code], env=environment, capture_output=True, text=True, check=True)
    return [float(word) for word in done.stdout.split()]


def main() -> None:
    rows = []
    for basis in BASES:
        with tempfile.TemporaryDirectory() as folder:
            cold = sum(run(basis, folder))
            warm = np.median([run(basis, folder) for _ in range(RUNS)], axis=0)
        rows.append([f"import, then {basis}", "<= 0.5 s", seconds(float(warm[0])), verdict(warm[0] <= 0.5)])
        rows.append([f"first expand, {basis}", "<= 1.5 s", seconds(float(warm[1])), verdict(warm[1] <= 1.5)])
        rows.append([f"both, nothing compiled, {basis}", "<= 30 s", seconds(cold), verdict(cold <= 30.0)])
    print(table(["what", "required", "measured", ""], rows))
    print(versions())


if __name__ == "__main__":
    main()
