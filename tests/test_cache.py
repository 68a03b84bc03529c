"""The compiled code on disk: stale, damaged, shared, missing or nowhere to put, the digits are the same."""

from __future__ import annotations

import os
import shutil
import subprocess
import sys
from concurrent.futures import ThreadPoolExecutor
from pathlib import Path

import pytest

import fbexpand
from fbexpand.kernels import code_cache

PACKAGE = Path(fbexpand.__file__).parent

# one kernel that compiles in a second, and its bits
SHORT = """
import numpy as np
from fbexpand.kernels.modes import radii_two_part
parts = np.empty((4, 1))
radii_two_part(np.array([0.3]), 0.7, *parts)
print([x.hex() for x in parts.ravel().tolist()])
print("hits", sum(radii_two_part.stats.cache_hits.values()), "misses", sum(radii_two_part.stats.cache_misses.values()))
"""
LONG = """
import numpy as np
from fbexpand import Dini, FourierBessel, expand
print([float(c).hex() for c in expand(lambda r: np.exp(-r), FourierBessel(0.3), terms=5).coefficients])
print([float(c).hex() for c in expand(lambda r: np.exp(-r), Dini(robin=-2.0), terms=5).coefficients])
"""


def environment(**changes):
    env = {k: v for k, v in os.environ.items() if not k.startswith(("FBEXPAND_", "NUMBA_")) and k != "XDG_CACHE_HOME"}
    env["PYTHONPATH"] = str(PACKAGE.parent)
    env.update({k: str(v) for k, v in changes.items() if v is not None})
    for name in [k for k, v in changes.items() if v is None]:
        env.pop(name, None)
    return env


def run(code, env, *flags, cwd=None):
    done = subprocess.run(
        [sys.executable, *flags, "-W", "error", "-c", code],
        env=env,
        cwd=cwd,
        capture_output=True,
        text=True,
        timeout=400,
        check=False,
    )
    assert done.returncode == 0, done.stderr
    assert done.stderr == ""
    return done.stdout.splitlines()


def entries(folder):
    return sorted(folder.rglob("*.nbc"))


@pytest.fixture(scope="module")
def warm(tmp_path_factory):
    """A folder with the entries of SHORT, and the digits."""
    folder = tmp_path_factory.mktemp("warm")
    digits, counts = run(SHORT, environment(FBEXPAND_CACHE_DIR=folder))
    assert counts == "hits 0 misses 1"
    return folder, digits


@pytest.fixture
def folder(warm, tmp_path):
    shutil.copytree(warm[0], tmp_path / "cache")
    return tmp_path / "cache"


def test_a_second_process_compiles_nothing(warm, folder):
    assert run(SHORT, environment(FBEXPAND_CACHE_DIR=folder)) == [warm[1], "hits 1 misses 0"]


@pytest.mark.deep
def test_optimised_python_gives_the_same(warm, folder):
    assert run(SHORT, environment(FBEXPAND_CACHE_DIR=folder), "-OO")[0] == warm[1]


def truncated(content):
    return content[: len(content) // 2]


def flipped(content):
    middle = len(content) // 2
    return content[:middle] + bytes([content[middle] ^ 0x10]) + content[middle + 1 :]


DAMAGE = {
    "truncated": truncated,
    "one bit": flipped,
    "empty": lambda content: b"",
    "one byte": lambda content: b"\x80",
    "checksum only": lambda content: content[:32],
    "noise": lambda content: os.urandom(len(content)),
    "longer": lambda content: content + b"x",
}


@pytest.fixture
def one_folder(monkeypatch, tmp_path):
    monkeypatch.setattr(code_cache, "cache_folders", lambda: (tmp_path, (tmp_path,)))
    return tmp_path


@pytest.mark.parametrize("damage", DAMAGE.values(), ids=DAMAGE)
def test_a_damaged_entry_counts_as_none(one_folder, damage):
    found = code_cache.Entries("name", "stamp")
    found.save("key", {"code": b"..." * 100})
    (path,) = entries(one_folder)
    content = path.read_bytes()
    assert found.load("key") == {"code": b"..." * 100}
    path.write_bytes(damage(content))
    assert found.load("key") is None
    found.save("key", "again")
    assert found.load("key") == "again"


def test_an_entry_is_found_under_its_own_key_and_stamp_only(one_folder):
    code_cache.Entries("name", "stamp").save("key", 1)
    assert code_cache.Entries("name", "stamp").load("other key") is None
    assert code_cache.Entries("name", "other stamp").load("key") is None
    assert code_cache.Entries("other name", "stamp").load("key") is None
    (path,) = entries(one_folder)
    path.rename(path.with_name(code_cache.Entries("name", "stamp")._name("other key")))
    assert code_cache.Entries("name", "stamp").load("other key") is None


def test_a_write_that_fails_leaves_nothing_behind(one_folder, monkeypatch):
    def full(*_):
        raise OSError("no space left on device")

    monkeypatch.setattr(code_cache.os, "replace", full)
    with pytest.raises(OSError, match="no space"):
        code_cache.Entries("name", "stamp").save("key", 1)
    assert list(one_folder.iterdir()) == []


def test_damaged_entries_are_compiled_again_and_replaced(warm, folder):
    for path in entries(folder):
        path.write_bytes(truncated(path.read_bytes()))
    env = environment(FBEXPAND_CACHE_DIR=folder)
    assert run(SHORT, env) == [warm[1], "hits 0 misses 1"]
    assert run(SHORT, env) == [warm[1], "hits 1 misses 0"]


@pytest.mark.deep
def test_folders_in_place_of_entries(warm, folder):
    for path in entries(folder):
        path.unlink()
        path.mkdir()
    assert run(SHORT, environment(FBEXPAND_CACHE_DIR=folder))[0] == warm[1]


def test_the_switch_turns_it_off(warm, tmp_path):
    env = environment(FBEXPAND_CACHE_DIR=tmp_path, FBEXPAND_CACHE="0")
    assert run(SHORT, env)[0] == warm[1]
    assert entries(tmp_path) == []


def test_settings_of_numba_keep_entries_of_their_own(warm, folder):
    before = entries(folder)
    env = environment(FBEXPAND_CACHE_DIR=folder, NUMBA_BOUNDSCHECK="1")
    assert run(SHORT, env) == [warm[1], "hits 0 misses 1"]
    assert len(entries(folder)) == 2 * len(before)
    assert run(SHORT, environment(FBEXPAND_CACHE_DIR=folder))[1] == "hits 1 misses 0"
    assert run(SHORT, env)[1] == "hits 1 misses 0"


@pytest.mark.deep
def test_no_folder_to_write_to(warm, tmp_path):
    (tmp_path / "file").write_text("not a folder")
    env = environment(FBEXPAND_CACHE_DIR=tmp_path / "file" / "below")
    assert run(SHORT, env)[0] == warm[1]


@pytest.fixture
def install(tmp_path):
    """A copy of the package in whose folder nothing can be written, not even by root: a file stands in the way."""
    home = tmp_path / "install"
    shutil.copytree(PACKAGE, home / "fbexpand", ignore=shutil.ignore_patterns("__pycache__"))
    (home / "fbexpand" / "kernels" / "__pycache__").write_text("in the way")
    return home


def test_a_read_only_install_uses_the_users_folder(warm, install, tmp_path):
    env = environment(PYTHONPATH=install, HOME=tmp_path / "home", PYTHONDONTWRITEBYTECODE="1")
    assert run(SHORT, env, cwd=tmp_path) == [warm[1], "hits 0 misses 1"]
    assert entries(tmp_path / "home" / ".cache")


def test_a_read_only_install_without_a_home(warm, install, tmp_path):
    code = "import pathlib\ndef nobody(*a): raise RuntimeError('no home')\npathlib.Path.home = nobody\n" + SHORT
    env = environment(PYTHONPATH=install, HOME=None, PYTHONDONTWRITEBYTECODE="1")
    assert run(code, env, cwd=tmp_path)[0] == warm[1]


@pytest.mark.skipif(os.name == "nt" or not hasattr(os, "geteuid") or os.geteuid() == 0, reason="root writes anywhere")
def test_permissions_refused(warm, folder):
    inner = folder / "fbexpand"
    inner.chmod(0o500)
    try:
        assert run(SHORT, environment(FBEXPAND_CACHE_DIR=folder)) == [warm[1], "hits 1 misses 0"]
        for path in entries(folder):
            path.chmod(0o000)
        assert run(SHORT, environment(FBEXPAND_CACHE_DIR=folder))[0] == warm[1]
    finally:
        inner.chmod(0o700)


def test_entries_of_a_read_only_install_are_used(warm, tmp_path):
    home = tmp_path / "install"
    shutil.copytree(PACKAGE, home / "fbexpand", ignore=shutil.ignore_patterns("__pycache__"))
    env = environment(PYTHONPATH=home, HOME=tmp_path / "home", PYTHONDONTWRITEBYTECODE="1")
    run(SHORT, env, cwd=tmp_path)
    made = home / "fbexpand" / "kernels" / "__pycache__"
    assert entries(made)
    code = f"import tempfile, pathlib\nmade = {str(made)!r}\n" + (
        "real = tempfile.TemporaryFile\n"
        "def refuse(*a, dir=None, **k):\n"
        "    if str(dir) == made: raise PermissionError('read-only')\n"
        "    return real(*a, dir=dir, **k)\n"
        "tempfile.TemporaryFile = refuse\n"
    )
    assert run(code + SHORT, env, cwd=tmp_path) == [warm[1], "hits 1 misses 0"]


def test_an_edit_to_a_callee_in_another_file_is_noticed(tmp_path):
    home = tmp_path / "copy"
    shutil.copytree(PACKAGE, home / "fbexpand", ignore=shutil.ignore_patterns("__pycache__"))
    kernels = home / "fbexpand" / "kernels"
    (kernels / "callee.py").write_text(
        "from fbexpand.kernels.jit import kernel\n\n\n@kernel\ndef inner(x):\n    return x + 1.0\n"
    )
    (kernels / "caller.py").write_text(
        "from fbexpand.kernels.callee import inner\nfrom fbexpand.kernels.jit import kernel\n\n\n"
        "@kernel\ndef outer(x):\n    return 2.0 * inner(x)\n"
    )
    code = "from fbexpand.kernels.caller import outer; print(outer(1.0), sum(outer.stats.cache_hits.values()))"
    env = environment(PYTHONPATH=home, FBEXPAND_CACHE_DIR=tmp_path / "cache")
    assert run(code, env, cwd=tmp_path) == ["4.0 0"]
    assert run(code, env, cwd=tmp_path) == ["4.0 1"]
    (kernels / "callee.py").write_text((kernels / "callee.py").read_text().replace("x + 1.0", "x + 5.0"))
    assert run(code, env, cwd=tmp_path) == ["12.0 0"]
    assert run(code, env, cwd=tmp_path) == ["12.0 1"]


def test_old_entries_of_other_versions_are_thrown_away(folder):
    path = entries(folder)[0]
    base, stamp, key, ending = path.name.rsplit(".", 3)
    stale = [path.with_name(f"{base}.{'0' * 16}.{key}.{ending}"), path.with_name(f"{base}.abc.tmp")]
    fresh = path.with_name(f"{base}.{'1' * 16}.{key}.{ending}")
    for name in (*stale, fresh):
        shutil.copy(path, name)
    for name in stale:
        os.utime(name, (1e9, 1e9))
    for name in entries(folder):
        if stamp in name.name:
            name.unlink()
    run(SHORT, environment(FBEXPAND_CACHE_DIR=folder))
    assert not any(name.exists() for name in stale)
    assert fresh.exists()


def test_processes_starting_together_on_an_empty_cache(warm, tmp_path):
    env = environment(FBEXPAND_CACHE_DIR=tmp_path)
    with ThreadPoolExecutor(3) as pool:
        found = list(pool.map(lambda _: run(SHORT, env)[0], range(3)))
    assert found == [warm[1]] * 3
    assert not list(tmp_path.rglob("*.tmp"))
    assert run(SHORT, env)[1] == "hits 1 misses 0"


@pytest.mark.skipif(not hasattr(os, "fork"), reason="no fork on this platform")
def test_children_of_a_fork(warm, folder):
    code = """
import os
import numpy as np
from fbexpand.kernels.modes import radii_two_part


def bits():
    parts = np.empty((4, 1))
    radii_two_part(np.array([0.3]), 0.7, *parts)
    return str([x.hex() for x in parts.ravel().tolist()])


if BEFORE:
    bits()
reads = []
for _ in range(2):
    read, write = os.pipe()
    if os.fork() == 0:
        os.write(write, bits().encode())
        os._exit(0)
    reads.append(read)
for read in reads:
    os.wait()
    print(os.read(read, 1000).decode())
"""
    for before in ("True", "False"):
        env = environment(FBEXPAND_CACHE_DIR=folder)
        assert run(code.replace("BEFORE", before), env) == [warm[1]] * 2


def test_the_whole_job_without_assertions_and_home():
    usual = run(LONG, environment())
    assert run(LONG, environment(HOME=None), "-O") == usual


@pytest.mark.deep
def test_ten_processes_do_the_whole_job_on_an_empty_cache(tmp_path):
    env = environment(FBEXPAND_CACHE_DIR=tmp_path)
    with ThreadPoolExecutor(10) as pool:
        found = list(pool.map(lambda _: run(LONG, env), range(10)))
    assert found == [run(LONG, environment())] * 10


@pytest.mark.deep
def test_the_whole_job_on_damaged_entries_and_without_a_folder(tmp_path):
    usual = run(LONG, environment())
    env = environment(FBEXPAND_CACHE_DIR=tmp_path)
    assert run(LONG, env) == usual
    for i, path in enumerate(entries(tmp_path)):
        content = path.read_bytes()
        path.write_bytes((truncated(content), flipped(content), b"", content)[i % 4])
    assert run(LONG, env) == usual
    assert run(LONG, environment(FBEXPAND_CACHE="0")) == usual


@pytest.mark.deep
def test_after_warm_up_the_main_job_compiles_nothing():
    code = """
import numpy as np
import fbexpand
from numba.core import event
fbexpand.warm_up()
compiled = []
class Listener(event.Listener):
    def on_start(self, e):
        compiled.append(e.data["dispatcher"].py_func.__qualname__)
    def on_end(self, e):
        pass
event.register("numba:compile", Listener())
kinds = fbexpand.FourierBessel(2.5, 3.0), fbexpand.Dini(12.0, 3.0, robin=4.0), fbexpand.Dini(1.0, 3.0, robin=-7.0)
for basis in kinds:
    e = fbexpand.expand(lambda r: np.cos(r), basis, terms=200)
    e(np.linspace(0, 3, 300)), e.derivative(1.0), e.mean()
    e.error_estimate([1, 5]), e.partial_sum(0.3), e.terms_for(0.1)
    fbexpand.expand(lambda r: np.cos(r) * 1j, basis, tol=1e-2)
    fbexpand.expand(fbexpand.RadialTable(np.linspace(0, 3, 30), np.ones((2, 30))), basis, terms=20)
print(sorted(set(compiled)))
"""
    assert run(code, environment(FBEXPAND_CACHE="0")) == ["[]"]


def test_importing_compiles_nothing():
    code = """
import fbexpand
from numba.core.dispatcher import Dispatcher
import fbexpand.kernels, importlib, pkgutil
names = [m.name for m in pkgutil.iter_modules(fbexpand.kernels.__path__)]
modules = [importlib.import_module("fbexpand.kernels." + name) for name in names]
print(sum(len(v.signatures) for m in modules for v in vars(m).values() if isinstance(v, Dispatcher)))
"""
    assert run(code, environment()) == ["0"]
