"""What each method costs, by a model with fixed constants: "auto" chooses the same on every machine and in every run.

The constants are nanoseconds measured on one core of a 2020s x86 server. They need to be right among each other only.
"""

from __future__ import annotations

PRODUCT = 0.07  # one multiplication and addition in a matrix product of many profiles
CACHED = 0.15  # one entry of a matrix for one profile, from the cache
STORED = 0.8  # likewise from memory
CACHE = 1 << 20  # bytes
MODE = 7.0  # one value of a mode
CALL = 1500.0  # one call


def matrix_cost(terms: int, size: int, rows: int) -> float:
    """Return the nanoseconds of one product for `rows` real profiles."""
    pairs = float(terms) * size
    read = CACHED if 8.0 * pairs < CACHE else STORED
    return CALL + pairs * max(read, PRODUCT * rows)


def direct_cost(terms: int, size: int, rows: int) -> float:
    """Return the nanoseconds of one direct sum for `rows` real profiles."""
    pairs = float(terms) * size
    return 20.0 * CALL + pairs * (MODE + PRODUCT * rows)


def shown_time(nanoseconds: float) -> str:
    """Show a time with a fitting unit.

    >>> shown_time(2500.0)
    '2.5 µs'
    """
    for unit, size in (("s", 1e9), ("ms", 1e6), ("µs", 1e3)):
        if nanoseconds >= size:
            return f"{nanoseconds / size:.2g} {unit}"
    return f"{nanoseconds:.2g} ns"


def shown_bytes(size: int) -> str:
    """Show a number of bytes with a fitting unit.

    >>> shown_bytes(3 << 20)
    '3 MiB'
    """
    for unit, shift in (("GiB", 30), ("MiB", 20), ("KiB", 10)):
        if size >= 1 << shift:
            return f"{size / (1 << shift):.3g} {unit}"
    return f"{size} bytes"
