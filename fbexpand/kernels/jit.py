"""The decorators of every compiled loop.

`kernel` is numba's njit without fastmath, with the GIL released, nothing compiled at import, and the compiled code
kept on disk (`code_cache`). FBEXPAND_CACHE=0 in the environment turns that off, FBEXPAND_CACHE_DIR names another
folder. What only kernels call is a `callee`: its code is kept in theirs, and keeping it once more by itself would make
the first compilation half as long again.
"""

from __future__ import annotations

import contextlib
from collections.abc import Callable
from typing import Any, TypeVar, cast

import numba
from numba.core import config

from fbexpand.kernels.code_cache import CodeCache, cache_folders

F = TypeVar("F", bound=Callable[..., Any])

JIT_DISABLED = bool(getattr(config, "DISABLE_JIT", False))


def kernel(function: F) -> F:
    """Compile `function` on first call, GIL released, division by zero as in IEEE 754, cached on disk."""
    if JIT_DISABLED:
        return function
    dispatcher: Any = numba.njit(nogil=True, error_model="numpy")(function)
    if cache_folders()[1]:
        with contextlib.suppress(Exception):
            dispatcher._cache = CodeCache(function)
    return cast(F, dispatcher)


def callee(function: F) -> F:
    """Compile `function` for the kernels that call it; nothing of its own is kept on disk."""
    if JIT_DISABLED:
        return function
    dispatcher: Any = numba.njit(nogil=True, error_model="numpy")(function)
    return cast(F, dispatcher)


def inline_kernel(function: F) -> F:
    """Compile `function` as a callee only: LLVM is asked to inline it into the kernels that call it."""
    if JIT_DISABLED:
        return function
    dispatcher: Any = numba.njit(nogil=True, error_model="numpy", forceinline=True)(function)
    return cast(F, dispatcher)
