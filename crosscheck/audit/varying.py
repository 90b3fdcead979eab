"""Flexibility of stepped and tapered members, piece by piece.

The same unit-load integrals as for prismatic members (flexibility.py), with the true section under each strain. A taper
has powers of its depth there, so the integrals are summed: every piece is cut where a load begins, ends or stands and
where the depth has changed by a half, and each cut is integrated by the rule of C. W. Clenshaw and A. R. Curtis, A method
for numerical integration on an automatic computer, Numerische Mathematik 2 (1960), 197-205 (from memory). Within a cut the
strains are analytic; the nearest singular place (no depth) lies so far off that ORDER + 1 nodes leave less than 1e-13.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache

import numpy as np

from crosscheck.audit.brackets import Brackets
from crosscheck.frame.loads import LoadTable
from crosscheck.frame.model import Floats, Frame, Ints

BENDING, SHEAR_STRAIN, STRETCH = range(3)
"""As in flexibility.py."""
ORDER = 16
CHANGE = 1.5
"""Depth to depth, the most that one cut may span."""


@dataclass(frozen=True, slots=True)
class ByPiece:
    """Flexibilities and load deformations by row (p,) of `Frame.variation`, as parts of its member's.

    matrix: (p, 3, 3, 3) by source (bending, shear, axial force); load: (p, 3, 3); imposed: (p, 3) of the temperature
    difference.
    """

    matrix: Floats
    load: Floats
    imposed: Floats


@lru_cache(maxsize=1)
def _rule() -> tuple[Floats, Floats]:
    """Nodes and weights on -1 to 1: the weights that integrate the first ORDER + 1 Chebyshev polynomials."""
    angle = np.pi * np.arange(ORDER + 1) / ORDER
    degree = np.arange(ORDER + 1)
    integrals = np.where(degree % 2 == 0, 2 / np.where(degree % 2 == 0, 1.0 - degree**2, 1.0), 0.0)
    return -np.cos(angle), np.linalg.solve(np.cos(degree[:, None] * (np.pi - angle)), integrals)


def by_piece(frame: Frame, loads: LoadTable, moment: Brackets, shear: Brackets, axial: Brackets) -> ByPiece:
    """Every piece's part, under the loads as brackets of the simple beam."""
    t, v = frame.member_table, frame.variation
    count = len(v.member)
    found = ByPiece(np.zeros((count, 3, 3, 3)), np.zeros((count, 3, 3)), np.zeros((count, 3)))
    rows, low, high = _cuts(frame, loads)
    if not len(rows):
        return found
    nodes, weights = _rule()
    x = (low + high)[:, None] / 2 + (high - low)[:, None] / 2 * nodes
    w = (high - low)[:, None] / 2 * weights
    k = v.member[rows]
    length = t.length[k][:, None]
    soft, depth = _strains(frame, rows, x, w)
    # A unit clockwise moment at `from` gives 1 - x/L, one at `to` gives -x/L (sagging); both shears are -1/L.
    unit = np.zeros((3, 3, *x.shape))
    unit[BENDING, 0], unit[BENDING, 1] = 1 - x / length, -x / length
    unit[SHEAR_STRAIN, :2] = -1 / length
    unit[STRETCH, 2] = 1.0
    force = np.stack([_values(b, k, x, low) for b in (moment, shear, axial)])
    np.add.at(found.matrix, rows, np.einsum("scn,sacn,sbcn->csab", soft, unit, unit))
    np.add.at(found.load, rows, np.einsum("scn,scn,sacn->csa", soft, force, unit))
    warm = loads.difference[k] != 0
    curve = np.where(warm, t.alpha[k] * loads.difference[k], 0.0)[:, None] * w / np.where(warm[:, None], depth, 1.0)
    np.add.at(found.imposed, rows, np.einsum("cn,acn->ca", curve, unit[BENDING]))
    return found


def _strains(frame: Frame, rows: Ints, x: Floats, w: Floats) -> tuple[Floats, Floats]:
    """(3, c, n) strain of a unit force by source times the weights, nil where the idealisation has none; and depth."""
    t = frame.member_table
    k = frame.variation.member[rows]
    second, area, shear_area, depth = frame.variation.at(rows, x)
    soft = np.zeros((3, *x.shape))
    soft[BENDING] = w / (t.E[k][:, None] * second)
    if frame.analysis.shear == "elastic":
        soft[SHEAR_STRAIN] = w / (t.G[k][:, None] * shear_area)
    stretches = ~t.rigid[k]
    soft[STRETCH, stretches] = w[stretches] / (t.E[k][:, None] * area)[stretches]
    return soft, depth


def _cuts(frame: Frame, loads: LoadTable) -> tuple[Ints, Floats, Floats]:
    """Row of `Frame.variation`, start and end (c,) of every cut between the rigid zones."""
    t, v = frame.member_table, frame.variation
    places = _load_places(loads)
    rows: list[int] = []
    lows: list[float] = []
    highs: list[float] = []
    for row, k in enumerate(v.member.tolist()):
        low = max(float(v.start[row]), float(t.zone[k, 0]))
        high = min(float(v.end[row]), float(t.length[k] - t.zone[k, 1]))
        if high <= low:
            continue
        inside = [x for x in places.get(k, ()) if low < x < high]
        marks = np.unique([low, *inside, *_depth_marks(frame, row, low, high), high])
        rows += [row] * (len(marks) - 1)
        lows += marks[:-1].tolist()
        highs += marks[1:].tolist()
    return np.array(rows, dtype=np.int64), np.array(lows), np.array(highs)


def _load_places(loads: LoadTable) -> dict[int, list[float]]:
    """Where loads stand, begin and end, by member."""
    places: dict[int, list[float]] = {}
    for member, at in (
        (loads.point_member, loads.point_at), (loads.line_member, loads.line_start), (loads.line_member, loads.line_end),
    ):  # fmt: skip
        for k, x in zip(member.tolist(), at.tolist(), strict=True):
            places.setdefault(k, []).append(x)
    return places


def _depth_marks(frame: Frame, row: int, low: float, high: float) -> Floats:
    """Where the depth of a tapered piece has changed by CHANGE at most, in equal ratios."""
    v = frame.variation
    first, last = v.depth[row]
    if not np.isfinite(first + last) or first == last:
        return np.zeros(0)
    rate = (last - first) / (v.end[row] - v.start[row])
    here, there = first + rate * (np.array([low, high]) - v.start[row])
    count = int(np.ceil(abs(np.log(there / here)) / np.log(CHANGE)))
    depth = here * (there / here) ** (np.arange(1, count) / max(count, 1))
    marks = v.start[row] + (depth - first) / rate
    return np.asarray(marks[(marks > low) & (marks < high)])


def _values(brackets: Brackets, member: Ints, x: Floats, low: Floats) -> Floats:
    """(c, n) the sum at x of each cut's member's brackets, those that begin where the cut ends left out."""
    found = np.zeros(x.shape)
    for k in np.unique(member).tolist():
        own, here = brackets.member == k, member == k
        on = brackets.start[own] <= low[here][:, None]
        t = np.maximum(x[here][:, :, None] - brackets.start[own], 0.0)
        found[here] = (on[:, None, :] * t ** brackets.power[own]) @ brackets.factor[own]
    return found
