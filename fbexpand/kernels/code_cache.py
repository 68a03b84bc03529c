"""Compiled code on disk: where it lies, when it is stale, and files that may be damaged or shared.

Four things numba's own cache lacks. An entry is stamped with the text of every kernel file its file imports, so that
an edit to a callee is noticed. It carries a checksum, so that a damaged file is compiled again instead of run. Every
entry has a file of its own, named by what it holds, so that processes writing at the same time cannot mix them up: an
index beside them would be read, changed and written back by each. And whatever goes wrong with the folder (none
writable, full, read-only) costs the cache, not the import.
"""

from __future__ import annotations

import contextlib
import glob
import hashlib
import os
import pickle
import re
import tempfile
import time
from collections.abc import Callable
from functools import cache, lru_cache
from pathlib import Path
from typing import Any

import llvmlite
import numba
from numba.core import caching, serialize

_FOLDER = Path(__file__).resolve().parent
_IMPORT = re.compile(r"^\s*from fbexpand\.kernels\.(\w+) import", re.MULTILINE)
_SETTINGS = ("BOUNDSCHECK", "OPT", "LOOP_VECTORIZE", "SLP_VECTORIZE", "FULL_TRACEBACKS", "DEBUGINFO_DEFAULT")
_dumps: Any = serialize.dumps  # pickles code objects too
_OLD = 7 * 86400.0  # seconds until an entry of another version of the files is thrown away


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
    digest = hashlib.sha256(f"{numba.__version__} {llvmlite.__version__}".encode())
    for current in sorted(seen):
        digest.update(current.encode() + b"\0" + _text(current) + b"\0")
    return digest.hexdigest()


@cache
def settings() -> str:
    """Return a digest of numba's settings that change the code: runs with other ones keep entries of their own."""
    text = repr([(name, getattr(numba.config, name, None)) for name in _SETTINGS])
    return hashlib.sha256(text.encode()).hexdigest()[:8]


def _writable(folder: Path) -> bool:
    try:
        folder.mkdir(parents=True, exist_ok=True)
        with tempfile.TemporaryFile(dir=folder):
            return True
    except OSError:
        return False


@lru_cache(maxsize=1)
def cache_folders() -> tuple[Path | None, tuple[Path, ...]]:
    """Return the folder to write to (None: nowhere), and those to read from, the package's own among them.

    A read-only install may have been warmed up by who installed it: its entries are used, new ones go elsewhere.
    """
    if os.environ.get("FBEXPAND_CACHE", "1").strip().lower() in {"0", "no", "off", "false"}:
        return None, ()
    asked = os.environ.get("FBEXPAND_CACHE_DIR") or os.environ.get("NUMBA_CACHE_DIR")
    candidates = [Path(asked) / "fbexpand"] if asked else [_FOLDER / "__pycache__"]
    if not asked:
        place = "fbexpand-" + hashlib.sha256(str(_FOLDER).encode()).hexdigest()[:12]  # installs do not share
        home = os.environ.get("XDG_CACHE_HOME") or os.environ.get("LOCALAPPDATA")
        with contextlib.suppress(RuntimeError, OSError):  # nobody's home
            candidates.append((Path(home) if home else Path.home() / ".cache") / place)
    for i, folder in enumerate(candidates):
        if _writable(folder):
            return folder, tuple(candidates[: i + 1])
    return None, tuple(candidates)


class _Locator(caching._CacheLocator):  # type: ignore[misc]
    """Tells numba how an entry is named and when it is stale."""

    def __init__(self, py_func: Callable[..., Any]) -> None:
        self._name = Path(py_func.__code__.co_filename).stem

    def get_cache_path(self) -> str:
        return str(cache_folders()[0] or _FOLDER / "__pycache__")

    def ensure_cache_path(self) -> None:
        """Do nothing: whoever writes makes the folder."""

    def get_source_stamp(self) -> str:
        return stamp(self._name)

    def get_disambiguator(self) -> str:
        return settings()

    @classmethod
    def from_function(cls, py_func: Callable[..., Any], py_file: str) -> _Locator:
        return cls(py_func)


class _Impl(caching.CompileResultCacheImpl):  # type: ignore[misc]
    _locator_classes = [_Locator]  # noqa: RUF012 (numba's attribute)


class Entries:
    """The entries of one function: a file each, SHA-256 in front, named by stamp and key, replaced as a whole."""

    def __init__(self, base: str, source_stamp: str) -> None:
        self._base = base
        self._stamp = source_stamp

    def _name(self, key: Any) -> str:
        digest = hashlib.sha256(repr(key).encode()).hexdigest()
        return f"{self._base}.{self._stamp[:16]}.{digest[:16]}.nbc"

    def load(self, key: Any) -> Any:
        """Return what was saved under `key`, None where nothing sound is found."""
        for folder in cache_folders()[1]:
            try:
                content = (folder / self._name(key)).read_bytes()
            except OSError:
                continue
            digest, payload = content[:32], content[32:]
            if hashlib.sha256(payload).digest() == digest:
                source_stamp, saved_key, data = pickle.loads(payload)
                if (source_stamp, saved_key) == (self._stamp, repr(key)):
                    return data
        return None

    def save(self, key: Any, data: Any) -> None:
        """Write the entry beside its place, then move it there, so that a reader sees all of it or nothing."""
        folder = cache_folders()[0]
        if folder is None:
            return
        payload: bytes = _dumps((self._stamp, repr(key), data))
        number, name = tempfile.mkstemp(prefix=f"{self._base}.", suffix=".tmp", dir=folder)
        try:
            with os.fdopen(number, "wb") as file:
                file.write(hashlib.sha256(payload).digest() + payload)
            os.chmod(name, 0o644)  # mkstemp's files are the owner's alone; a warmed-up install serves others
            os.replace(name, folder / self._name(key))
        except BaseException:
            with contextlib.suppress(OSError):
                os.unlink(name)
            raise
        self._prune(folder)

    def flush(self) -> None:
        """Remove every entry of this function."""
        folder = cache_folders()[0]
        if folder is not None:
            for path in folder.glob(f"{glob.escape(self._base)}.*.nbc"):
                path.unlink(missing_ok=True)

    def _prune(self, folder: Path) -> None:
        """Throw away old entries with another stamp, and what a process that was killed left half written."""
        for path in folder.glob(f"{glob.escape(self._base)}.*"):
            if path.name.startswith(f"{self._base}.{self._stamp[:16]}.") or path.suffix not in {".nbc", ".tmp"}:
                continue
            with contextlib.suppress(OSError):
                if time.time() - path.stat().st_mtime > _OLD:
                    path.unlink()


class CodeCache(caching.FunctionCache):  # type: ignore[misc]
    """numba's function cache over such entries; any failure means: compile."""

    _impl_class = _Impl

    def __init__(self, py_func: Callable[..., Any]) -> None:
        super().__init__(py_func)
        self._cache_file: Any = Entries(self._impl.filename_base, self._impl.locator.get_source_stamp())

    def load_overload(self, sig: Any, target_context: Any) -> Any:
        """Return the compiled function, None where it is to be compiled."""
        try:
            return super().load_overload(sig, target_context)
        except Exception:
            return None

    def save_overload(self, sig: Any, data: Any) -> None:
        """Keep the compiled function, if that is possible."""
        with contextlib.suppress(Exception):
            super().save_overload(sig, data)
