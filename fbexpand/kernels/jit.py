"""The decorator of every compiled loop, and its cache on disk.

`kernel` is numba's njit without fastmath, with the GIL released and nothing compiled at import. The compiled code is
kept on disk, with three things numba's own cache lacks: an entry is stamped with the text of every kernel file its
file imports, so that an edit to a callee is noticed; it carries a checksum, so that a damaged file is compiled again
instead of run; and whatever goes wrong with the folder (none writable, full, read-only) costs the cache, not the
import. FBEXPAND_CACHE=0 in the environment turns it off, FBEXPAND_CACHE_DIR names another folder.
"""

from __future__ import annotations

import contextlib
import hashlib
import os
import re
import tempfile
from collections.abc import Callable
from functools import cache, lru_cache
from pathlib import Path
from typing import Any, TypeVar

import numba
from numba.core import caching

F = TypeVar("F", bound=Callable[..., Any])

_FOLDER = Path(__file__).resolve().parent
_IMPORT = re.compile(r"^\s*from fbexpand\.kernels\.(\w+) import", re.MULTILINE)
JIT_DISABLED = bool(numba.config.DISABLE_JIT)


@cache
def _text(name: str) -> bytes:
    return (_FOLDER / f"{name}.py").read_bytes()


@cache
def stamp(name: str) -> str:
    """Return a digest over kernel file `name` and every kernel file it imports, directly or not."""
    seen: set[str] = set()
    waiting = [name]
    while waiting:
        current = waiting.pop()
        if current not in seen:
            seen.add(current)
            waiting += _IMPORT.findall(_text(current).decode())
    digest = hashlib.sha256()
    for current in sorted(seen):
        digest.update(current.encode() + b"\0" + _text(current) + b"\0")
    return digest.hexdigest()


def _writable(folder: Path) -> bool:
    try:
        folder.mkdir(parents=True, exist_ok=True)
        with tempfile.TemporaryFile(dir=folder):
            return True
    except OSError:
        return False


@lru_cache(maxsize=1)
def cache_folder() -> Path | None:
    """Return the folder of the compiled code: the one asked for, the package's, the user's, or None."""
    if os.environ.get("FBEXPAND_CACHE", "1").lower() in {"0", "no", "off", "false"}:
        return None
    candidates = []
    asked = os.environ.get("FBEXPAND_CACHE_DIR") or os.environ.get("NUMBA_CACHE_DIR")
    if asked:
        candidates.append(Path(asked) / "fbexpand")
    else:
        candidates.append(_FOLDER / "__pycache__")
        home = os.environ.get("XDG_CACHE_HOME") or os.environ.get("LOCALAPPDATA")
        if home:
            candidates.append(Path(home) / "fbexpand")
        else:
            with contextlib.suppress(RuntimeError, OSError):
                candidates.append(Path.home() / ".cache" / "fbexpand")
    return next((folder for folder in candidates if _writable(folder)), None)


class _Locator(caching._CacheLocator):  # type: ignore[misc]
    """Tells numba where an entry lies and when it is stale."""

    def __init__(self, py_func: Callable[..., Any]) -> None:
        self._name = Path(py_func.__code__.co_filename).stem
        self._line = py_func.__code__.co_firstlineno

    def get_cache_path(self) -> str:
        return str(cache_folder())

    def get_source_stamp(self) -> str:
        return stamp(self._name)

    def get_disambiguator(self) -> str:
        return str(self._line)

    @classmethod
    def from_function(cls, py_func: Callable[..., Any], py_file: str) -> _Locator:
        return cls(py_func)


class _Impl(caching.CompileResultCacheImpl):  # type: ignore[misc]
    _locator_classes = [_Locator]  # noqa: RUF012 (numba's attribute)


class _File(caching.IndexDataCacheFile):  # type: ignore[misc]
    """Index and data files with a SHA-256 in front of the data; the index is rebuilt if unreadable."""

    def _load_index(self) -> dict[Any, Any]:
        try:
            index = super()._load_index()
        except Exception:
            return {}
        return index if isinstance(index, dict) else {}

    def _load_data(self, name: str) -> Any:
        data = Path(self._data_path(name)).read_bytes()
        digest, payload = data[:32], data[32:]
        if hashlib.sha256(payload).digest() != digest:
            raise OSError("damaged cache file")
        return caching.pickle.loads(payload)

    def _save_data(self, name: str, data: Any) -> None:
        payload = self._dump(data)
        with self._open_for_write(self._data_path(name)) as file:
            file.write(hashlib.sha256(payload).digest() + payload)


class _Cache(caching.FunctionCache):  # type: ignore[misc]
    """numba's function cache over the files above; any failure means: compile."""

    _impl_class = _Impl

    def __init__(self, py_func: Callable[..., Any]) -> None:
        super().__init__(py_func)
        old = self._cache_file
        self._cache_file = _File(self._cache_path, self._impl.filename_base, old._source_stamp)

    def load_overload(self, sig: Any, target_context: Any) -> Any:
        try:
            return super().load_overload(sig, target_context)
        except Exception:
            return None

    def save_overload(self, sig: Any, data: Any) -> None:
        with contextlib.suppress(Exception):
            super().save_overload(sig, data)


def kernel(function: F) -> F:
    """Compile `function` on first call, GIL released, division by zero as in IEEE 754, cached on disk."""
    if JIT_DISABLED:
        return function
    dispatcher = numba.njit(nogil=True, error_model="numpy")(function)
    if cache_folder() is not None:
        with contextlib.suppress(Exception):
            dispatcher._cache = _Cache(function)
    return dispatcher  # type: ignore[no-any-return]


def inline_kernel(function: F) -> F:
    """Compile `function` as a callee only: LLVM is asked to inline it into the kernels that call it."""
    if JIT_DISABLED:
        return function
    return numba.njit(nogil=True, error_model="numpy", forceinline=True)(function)  # type: ignore[no-any-return]
