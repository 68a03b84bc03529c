"""J_nu inside the user's own compiled code."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Any, ClassVar

import numba

from fbexpand import checks
from fbexpand.kernels.bessel_point import evaluate_point
from fbexpand.special.bessel import MAX_ORDER, table_of
from fbexpand.types import FloatArray


@dataclass(frozen=True, eq=False)
class CompiledBessel:
    """J_nu as a nopython function with its data beside it, from `compiled_bessel_j`.

    `evaluate(data, x)` is one function for every order, so that a loop compiled once takes the `data` of another
    order without being compiled again; `data` is a tuple of arrays.
    """

    order: float
    data: tuple[FloatArray]
    evaluate: ClassVar[Callable[[tuple[FloatArray], float], float]] = staticmethod(evaluate_point)

    def bind(self) -> Callable[[float], float]:
        """Return a compiled function of one float; each call of `bind` compiles anew."""
        data = self.data

        @numba.njit(nogil=True, error_model="numpy")  # type: ignore[untyped-decorator, unused-ignore]
        def bound(x: float) -> float:
            return evaluate_point(data, x)

        return bound  # type: ignore[no-any-return, unused-ignore]

    def __reduce__(self) -> tuple[Any, ...]:
        return compiled_bessel_j, (self.order,)


def compiled_bessel_j(order: float) -> CompiledBessel:
    """Prepare J_order for use inside functions compiled by numba.

    `.evaluate(data, x)` gives J_order(x) for a float x >= 0, with the error and the very bits of `bessel_j`; NaN for
    x < 0. Pass `.data` into your compiled function rather than closing over it: then it serves every order.

    Parameters
    ----------
    order
        Real number from 0 to 10^6.

    Raises
    ------
    TypeError
        If `order` is no real number.
    ValueError
        If `order` is negative, not finite or too large.

    Examples
    --------
    >>> import numba
    >>> from fbexpand import compiled_bessel_j
    >>> compiled = compiled_bessel_j(0.0)
    >>> evaluate = compiled.evaluate
    >>> @numba.njit
    ... def mean(data, n):
    ...     total = 0.0
    ...     for i in range(n):
    ...         total += evaluate(data, (i + 0.5) / n)
    ...     return total / n
    >>> round(mean(compiled.data, 1000), 6)
    0.91973
    """
    order = checks.non_negative("order", order)
    if order > MAX_ORDER:
        raise checks.value_error("order", f"at most {MAX_ORDER:g}", order)
    data = table_of(order).view()
    data.flags.writeable = False
    return CompiledBessel(order, (data,))
