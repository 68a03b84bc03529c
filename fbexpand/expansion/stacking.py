"""Many series as one batch."""

from __future__ import annotations

from collections.abc import Iterable
from typing import Any

import numpy as np

from fbexpand import checks
from fbexpand.estimates.origin import Origin, stacked
from fbexpand.expansion.arithmetic import joint_shape, padded, require_same_basis
from fbexpand.expansion.record import Expansion
from fbexpand.lifting.closed_part import ClosedPart


def stack(expansions: Iterable[Expansion]) -> Expansion:
    """Stack series of one basis along a new leading batch axis, shape `(count, *batch, terms)`.

    Shorter ones are continued with zeros, batches broadcast. Raises TypeError for what is no Expansion,
    ValueError for an empty list or different bases.

    >>> from fbexpand import Expansion, FourierBessel, stack
    >>> basis = FourierBessel()
    >>> stack([Expansion(basis, [1.0]), Expansion(basis, [1.0, 0.5])]).coefficients
    array([[1. , 0. ],
           [1. , 0.5]])
    """
    if isinstance(expansions, Expansion):
        items: list[Any] = list(expansions)
    else:
        try:
            items = list(expansions)
        except TypeError:
            raise checks.type_error("expansions", "a sequence of Expansion", expansions) from None
    if not items:
        raise checks.value_error("expansions", "non-empty", items)
    shape: tuple[int, ...] = ()
    for item in items:
        if not isinstance(item, Expansion):
            raise checks.type_error("expansions", "a sequence of Expansion", item)
        require_same_basis(items[0], item, "expansions")
        shape = joint_shape(shape, item.batch_shape, "expansions", item)
    terms = max(item.terms for item in items)
    coefficients = np.stack([padded(item.coefficients, terms, shape) for item in items])
    origins = _stacked_origins(items, shape, coefficients)
    evaluations = sum(item.evaluations for item in items)
    return Expansion._derive(items[0].basis, coefficients, origins, evaluations, _stacked_parts(items, shape))


def _stacked_parts(items: list[Expansion], shape: tuple[int, ...]) -> ClosedPart | None:
    """Stack the closed parts, those that are not there as zeros."""
    found = [item.closed_part for item in items if item.closed_part is not None]
    if not found:
        return None
    zero = found[0].changed(lambda c: np.zeros((*shape, c.shape[-1])))
    for part in found:
        zero = zero.plus(part.changed(lambda c: 0.0 * c))  # now it has all powers
    parts = [zero if item.closed_part is None else zero.plus(item.closed_part) for item in items]
    return parts[0].changed(lambda _: np.stack([part.coefficients for part in parts]))


def _stacked_origins(items: list[Expansion], shape: tuple[int, ...], coefficients: Any) -> tuple[Origin, ...]:
    """Stack the origins one by one where all series have as many; else judge by the coefficients."""
    depth = len(items[0]._origins)
    if all(len(item._origins) == depth for item in items):
        return tuple(stacked([item._origins[i].broadcast(shape) for item in items]) for i in range(depth))
    quadrature = np.stack([sum(o.broadcast(shape).quadrature for o in item._origins) for item in items])
    table = np.stack([sum(o.broadcast(shape).table for o in item._origins) for item in items])
    return (Origin(coefficients, None, quadrature, table),)
