"""What a series stands for: the profile it came from, and the errors that came with its coefficients."""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.polynomial import chebyshev

from fbexpand.types import FloatArray, Numeric

if TYPE_CHECKING:
    from fbexpand.profiles.panels import Panels

MOST_ORIGINS = 16  # a sum of more series than this is judged by its coefficients alone


@dataclass(frozen=True, eq=False)
class Origin:
    """Coefficients (*batch, terms), the profile's panels where known, and (*batch,) L2 errors.

    `left` is what all coefficients leave of the profile, where the search for a tolerance has found it out or a law in
    time predicts it. `front`: jumps move about in the field, so that nothing is known of its largest error.
    """

    coefficients: Numeric
    panels: Panels | None
    quadrature: FloatArray
    table: FloatArray
    left: FloatArray | None = None
    projected: bool = True  # whether the coefficients are those of the profile: a filter damps them
    front: bool = False

    @property
    def batch_shape(self) -> tuple[int, ...]:
        """Shape of the batch axes."""
        return self.coefficients.shape[:-1]

    def broadcast(self, shape: tuple[int, ...]) -> Origin:
        """Repeat over the batch shape `shape`."""
        if shape == self.batch_shape:
            return self
        return Origin(
            np.broadcast_to(self.coefficients, (*shape, self.coefficients.shape[-1])),
            spread_panels(self.panels, shape),
            np.broadcast_to(self.quadrature, shape),
            np.broadcast_to(self.table, shape),
            None if self.left is None else np.broadcast_to(self.left, shape),
            self.projected,
            self.front,
        )

    def take(self, index: Any) -> Origin:
        """Select batch entries by an array (or scalar) of flat indices."""

        def pick(array: Numeric, tail: tuple[int, ...]) -> Numeric:
            return np.asarray(array.reshape(-1, *tail)[index])

        return Origin(
            pick(self.coefficients, self.coefficients.shape[-1:]),
            _panels(self.panels, pick),
            pick(self.quadrature, ()),
            pick(self.table, ()),
            None if self.left is None else pick(self.left, ()),
            self.projected,
            self.front,
        )

    def scaled(self, factor: Numeric) -> Origin:
        """Multiply by a factor of a shape that broadcasts to the batch shape."""
        shape = np.broadcast_shapes(self.batch_shape, np.shape(factor))
        whole = self.broadcast(shape)
        size = np.abs(factor)
        panels = whole.panels
        if panels is not None:
            panels = replace(
                panels,
                coefficients=panels.coefficients * np.asarray(factor)[..., None, None],
                residual=panels.residual * np.asarray(size)[..., None],
            )
        return Origin(
            whole.coefficients * np.asarray(factor)[..., None],
            panels,
            _times(whole.quadrature, size),
            _times(whole.table, size),
            None if whole.left is None else _times(whole.left, size),
            whole.projected,
            whole.front,
        )

    def part(self, name: str) -> Origin:
        """Take the real or imaginary part, or the conjugate ("real", "imag", "conjugate")."""

        def of(array: Numeric) -> Numeric:
            return np.conjugate(array) if name == "conjugate" else np.array(getattr(array, name))

        panels = self.panels
        if panels is not None:
            panels = replace(panels, coefficients=of(panels.coefficients))
        left = self.left if name == "conjugate" else None
        return replace(self, coefficients=of(self.coefficients), panels=panels, left=left)

    def truncated(self, terms: int) -> Origin:
        """Keep the first `terms` coefficients."""
        left = self.left if terms >= self.coefficients.shape[-1] else None
        return replace(self, coefficients=self.coefficients[..., :terms], left=left)


def spread_panels(panels: Panels | None, shape: tuple[int, ...]) -> Panels | None:
    """Repeat panels over the batch shape `shape`."""
    if panels is None or panels.coefficients.shape[:-2] == shape == panels.residual.shape[:-1]:
        return panels
    return _panels(panels, lambda array, tail: np.broadcast_to(array, (*shape, *tail)))


def _times(error: FloatArray, size: Numeric) -> FloatArray:
    """Scale an error that may be infinite; nothing is left of it under a factor of zero."""
    with np.errstate(invalid="ignore"):
        return np.where(size == 0.0, 0.0, error * size)


def _panels(panels: Panels | None, change: Any) -> Panels | None:
    """Apply change(array, shape without the batch axes) to the arrays of `panels`."""
    if panels is None:
        return None
    return replace(
        panels,
        coefficients=change(panels.coefficients, panels.coefficients.shape[-2:]),
        residual=change(panels.residual, panels.residual.shape[-1:]),
    )


def stacked(origins: list[Origin]) -> Origin:
    """Stack origins of one batch shape along a new leading axis."""
    terms = max(origin.coefficients.shape[-1] for origin in origins)
    coefficients = np.stack(
        [
            np.pad(
                origin.coefficients,
                [*[(0, 0)] * len(origin.batch_shape), (0, terms - origin.coefficients.shape[-1])],
            )
            for origin in origins
        ]
    )
    return Origin(
        coefficients,
        _stacked_panels([origin.panels for origin in origins]),
        np.stack([origin.quadrature for origin in origins]),
        np.stack([origin.table for origin in origins]),
        _stacked_left([origin.left for origin in origins]),
        all(origin.projected for origin in origins),
        any(origin.front for origin in origins),
    )


def _stacked_left(left: list[FloatArray | None]) -> FloatArray | None:
    known = [item for item in left if item is not None]
    return np.stack(known) if len(known) == len(left) else None


def _stacked_panels(panels: list[Panels | None]) -> Panels | None:
    """Stack panels on the union of their edges; None unless all are known."""
    known = [item for item in panels if item is not None]
    if len(known) < len(panels):
        return None
    edges = known[0].edges
    if any(item.edges.shape != edges.shape or np.any(item.edges != edges) for item in known):
        edges = np.unique(np.concatenate([item.edges for item in known]))
    degrees = max(item.coefficients.shape[-1] for item in known)
    shape = np.broadcast_shapes(*(item.coefficients.shape[:-2] for item in known))
    pairs = [regrid(item, edges, degrees) for item in known]
    return replace(
        known[0],
        edges=edges,
        coefficients=np.stack([np.broadcast_to(c, (*shape, *c.shape[-2:])) for c, _ in pairs]),
        residual=np.stack([np.broadcast_to(s, (*shape, *s.shape[-1:])) for _, s in pairs]),
        evaluations=sum(item.evaluations for item in known),
    )


def regrid(panels: Panels, edges: FloatArray, degrees: int) -> tuple[Numeric, FloatArray]:
    """Write the same piecewise polynomial on finer edges, with `degrees` coefficients a panel."""
    old = panels.coefficients
    old = np.pad(old, [*[(0, 0)] * (old.ndim - 1), (0, degrees - old.shape[-1])])
    if edges.shape == panels.edges.shape:
        return old, panels.residual
    middle = 0.5 * (edges[1:] + edges[:-1])
    owner = np.clip(np.searchsorted(panels.edges, middle, side="right") - 1, 0, panels.edges.size - 2)
    low, high = panels.edges[owner], panels.edges[owner + 1]
    t = np.cos(np.pi * (np.arange(degrees) + 0.5) / degrees)
    r = middle[:, None] + 0.5 * (edges[1:] - edges[:-1])[:, None] * t
    at = ((r - low[:, None]) - (high[:, None] - r)) / (high - low)[:, None]
    values = np.einsum("...pj,pij->...pi", old[..., owner, :], chebyshev.chebvander(at, degrees - 1))
    back = chebyshev.chebvander(t, degrees - 1) * (2.0 / degrees)  # the discrete cosine transform
    back[:, 0] *= 0.5
    new = values @ back
    exact = np.all((low == edges[:-1]) & (high == edges[1:]))
    return (old if exact else new), panels.residual[..., owner]
