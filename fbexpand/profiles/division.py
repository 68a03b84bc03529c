"""Division of the panels on which a profile is not resolved yet."""

from __future__ import annotations

from dataclasses import dataclass
from itertools import pairwise

import numpy as np

from fbexpand.profiles import chebyshev
from fbexpand.profiles.first_look import DEGREES, FirstLook, panel_nodes
from fbexpand.profiles.judge import BoolArray, Judge, Verdict
from fbexpand.profiles.sampling import Sampler
from fbexpand.types import FloatArray, IntArray, Numeric

MOST_EVALUATIONS = 1 << 16  # then what is left unresolved stays so, and the residual says it
NARROWEST = 8.0  # units in the last place: a panel of this width is not divided
DEEPEST = 1e-60  # of the radius: nor is one that lies this close to the axis
GRADE = 0.25  # of a panel beside an end where f is not smooth: what is left to divide again
RUNGS = 3  # times that it is divided so with one call of the profile
PERSISTENT = 2  # halvings that a plateau survives in both halves: then it is noise
UNRESOLVED = float(DEGREES)  # times the last coefficients: the error of a panel given up, a jump's height say


@dataclass(eq=False)
class Piece:
    """One panel of the batch; arrays are (size,), coefficients (size, DEGREES)."""

    low: float
    high: float
    coefficients: Numeric
    height: FloatArray
    level: FloatArray
    residual: FloatArray
    smooth: BoolArray
    streak: IntArray
    at_low: bool  # the panel begins at the axis or a break
    at_high: bool  # the panel ends at a break or the rim
    graded: bool = False  # its siblings were smooth: whatever is wrong is at the end that it touches
    checked: bool = False
    narrowest: float = 0.0  # a panel of this width is not divided

    @property
    def narrow(self) -> bool:
        """Whether the panel is too narrow to be divided."""
        return self.high - self.low <= max(NARROWEST * float(np.spacing(self.high)), self.narrowest)

    def cuts(self, rungs: int) -> list[float]:
        """Return where to divide, ascending: in the middle, or `rungs` times toward an end where f is not smooth."""
        width = self.high - self.low
        if not self.graded or self.at_low == self.at_high:
            return [self.low + 0.5 * width]
        if self.at_low:
            shares = [GRADE**i for i in range(rungs, 0, -1)]
        else:
            shares = [1.0 - GRADE**i for i in range(1, rungs + 1)]
        cuts = [self.low + share * width for share in shares]
        ends = [self.low, *cuts, self.high]
        least = NARROWEST * float(np.spacing(self.high))
        if min(b - a for a, b in pairwise(ends)) <= max(least, self.narrowest):  # down to there, one at a time
            return [cuts[-1] if self.at_low else cuts[0]]
        return cuts


def divide(
    sampler: Sampler,
    judge: Judge,
    look: FirstLook,
    verdict: Verdict,
    coefficients: Numeric,
    on_scan: Numeric,
    most: int = MOST_EVALUATIONS,
) -> list[Piece]:
    """Return the panels, ascending, that resolve the profile, starting from those of the first look.

    Not more than `most` evaluations are made in all; what is unresolved then stays so, and its residual says it.
    """
    edges = look.edges
    streak = np.zeros(coefficients.shape[0], dtype=np.int64)
    # half the degrees will do from here on: what a piece has beyond them must be noise
    beyond = np.abs(coefficients[:, :, DEGREES:]).max(axis=2)
    verdict = verdict._replace(smooth=verdict.smooth & (beyond <= verdict.residual))
    coefficients = coefficients[:, :, :DEGREES]
    pieces = [
        _piece(float(edges[p]), float(edges[p + 1]), coefficients[:, p], verdict, p, streak, (True, True))
        for p in range(edges.size - 1)
    ]
    for piece in pieces:
        piece.narrowest = DEEPEST * float(edges[-1])
    done = [piece for piece in pieces if piece.smooth.all()]
    active = [piece for piece in pieces if not piece.smooth.all()]
    while True:
        while active:
            room = max(0, most - sampler.evaluations) // (2 * DEGREES)
            if room < len(active):  # what weighs most is divided first
                active.sort(key=lambda piece: float(np.max(piece.level / judge.scale_of())), reverse=True)
                done += [_given_up(piece) for piece in active[room:]]
                active = active[:room]
                if not active:
                    break
            rungs = RUNGS if (RUNGS + 1) * len(active) * DEGREES <= most - sampler.evaluations else 1
            children = _divided(sampler, judge, active, rungs)
            done += [child for child in children if child.smooth.all()]
            rest = [child for child in children if not child.smooth.all()]
            done += [_given_up(child) for child in rest if child.narrow]
            active = [child for child in rest if not child.narrow]
        active = _missed(judge, look, on_scan, done)
        if not active:
            break
        missed = {id(piece) for piece in active}
        done = [piece for piece in done if id(piece) not in missed]
    done.sort(key=lambda piece: piece.low)
    return done


def _piece(
    low: float,
    high: float,
    coefficients: Numeric,
    verdict: Verdict,
    p: int,
    streak: IntArray,
    ends: tuple[bool, bool],
) -> Piece:
    return Piece(
        low,
        high,
        coefficients,
        verdict.height[:, p],
        verdict.level[:, p],
        verdict.residual[:, p],
        verdict.smooth[:, p],
        streak,
        *ends,
    )


def _divided(sampler: Sampler, judge: Judge, active: list[Piece], rungs: int) -> list[Piece]:
    """Divide every panel, one that shrinks toward an end `rungs` times, with one call of the profile."""
    edges = [[piece.low, *piece.cuts(rungs), piece.high] for piece in active]
    low = np.array([end for piece in edges for end in piece[:-1]])
    high = np.array([end for piece in edges for end in piece[1:]])
    radii = panel_nodes(low, high, DEGREES)
    nodes = sampler(radii.ravel()).reshape(-1, *radii.shape)
    coefficients = nodes @ chebyshev.transform(DEGREES)
    verdict = judge.verdict(low, high, nodes, coefficients)
    parent = np.repeat(np.arange(len(active)), [len(piece) - 1 for piece in edges])
    height = np.stack([piece.height for piece in active], axis=1)[:, parent]
    level = np.stack([piece.level for piece in active], axis=1)[:, parent]
    noise = judge.noise(verdict, height, level)
    children = []
    start = 0
    for piece, ends in zip(active, edges, strict=True):
        stop = start + len(ends) - 1
        streak = np.where(noise[:, start:stop].all(axis=1), piece.streak + 1, 0)
        own = [
            _piece(
                float(low[p]), float(high[p]), coefficients[:, p], verdict, p, streak,
                (piece.at_low and p == start, piece.at_high and p == stop - 1),
            )
            for p in range(start, stop)
        ]  # fmt: skip
        for child in own:
            child.smooth = child.smooth | (streak >= PERSISTENT)
            child.narrowest = piece.narrowest
        rough = [child for child in own if not child.smooth.all()]
        if len(rough) < 2:
            for child in rough or own:
                child.graded = True
        children += own
        start = stop
    return children


def _given_up(piece: Piece) -> Piece:
    piece.residual = np.where(piece.smooth, piece.residual, UNRESOLVED * piece.level)
    piece.checked = True
    return piece


def _missed(judge: Judge, look: FirstLook, on_scan: Numeric, done: list[Piece]) -> list[Piece]:
    """Return the panels whose polynomials disagree with the scan."""
    found = []
    for piece in done:
        if piece.checked:
            continue
        piece.checked = True
        start, stop = np.searchsorted(look.scan, (piece.low, piece.high))
        if start == stop:
            continue
        t = chebyshev.local(look.scan[start:stop], np.array(piece.low), np.array(piece.high))
        values = piece.coefficients @ chebyshev.evaluation(t, DEGREES)
        misses = np.abs(values - on_scan[:, start:stop]).max(axis=1)
        wrong = misses > judge.allowed(piece.height, piece.level)
        if wrong.any():
            piece.smooth = piece.smooth & ~wrong
            piece.streak = np.zeros_like(piece.streak)
            if piece.narrow:
                _given_up(piece)
            else:
                found.append(piece)
    return found


def level_jumps(pieces: list[Piece]) -> None:
    """Where a panel of a few units in the last place holds a jump, put the jump on its upper edge.

    Its place is known no better than that, and a polynomial through it would be a ramp with overshoots.
    """
    signs = np.where(np.arange(DEGREES) % 2 == 0, 1.0, -1.0)
    for i in range(1, len(pieces) - 1):
        piece, before, after = pieces[i], pieces[i - 1], pieces[i + 1]
        if not piece.narrow or piece.smooth.all():
            continue
        left, right = before.coefficients.sum(axis=1), after.coefficients @ signs
        bounded = piece.height <= np.maximum(np.abs(left), np.abs(right)) * (1.0 + 1e-6)
        jump = ~piece.smooth & before.smooth & after.smooth & bounded
        constant = np.zeros_like(piece.coefficients)
        constant[:, 0] = left
        piece.coefficients = np.where(jump[:, None], constant, piece.coefficients)
        piece.residual = np.where(jump, np.maximum(before.residual, after.residual), piece.residual)
