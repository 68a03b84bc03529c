"""Names of the array types in signatures."""

from __future__ import annotations

from typing import Any

import numpy as np
import numpy.typing as npt

FloatArray = npt.NDArray[np.float64]
IntArray = npt.NDArray[np.int64]
Numeric = npt.NDArray[Any]  # float64 or complex128
ArrayLike = npt.ArrayLike
