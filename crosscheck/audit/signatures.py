"""What single slip or single mistake of stiffness would explain a misfit, without solving any frame again.

Results of a frame with one support freed, one end hinged or one stiffness changed still fit together in that frame. In
this frame they then misfit by a multiple of one fixed vector a_k, so that the share of the squared misfit that it
explains, (a'Ld)^2 / (a'La d'Ld), is exactly 1 for the true mistake (fit.py has L; the test is Baarda's, 1968). The
multiple gives the mistake's size: the spring constant, or the factor of stiffness, that the claim goes with.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from scipy import sparse
from scipy.sparse.linalg import splu

from crosscheck.audit.compatibility import CompatibilityFindings
from crosscheck.audit.equilibrium import Sparse
from crosscheck.audit.fit import NUDGE, Fit
from crosscheck.audit.flexibility import BENDING, SHEAR_STRAIN, STRETCH, flexibility
from crosscheck.frame.loads import load_table
from crosscheck.frame.model import FREE, HELD, Bools, Floats, Frame, Ints, Member

SUPPORT, END, LENGTH, TIE = "support", "end", "length", "tie"
PROFILE = "profile"
LIGHT, DEEP, REVERSED = "all of its lightest section", "all of its deepest section", "profile end for end"
EACH_STEPPED = "every stepped or tapered member"
KINDS = ("EI", "shear stiffness", "EA")
"""Factors by source of deformation (flexibility.BENDING, SHEAR_STRAIN, STRETCH)."""
BOTH = "x and y"
"""Direction of a support that gives way between its axes, because rigid members stop it along each of them."""
STOPPED = 1e-6
"""Elongation of rigid members by a unit movement beyond which they stop it."""
BENDING_FACTOR, AXIAL_FACTOR, SHEAR_FACTOR, MODULUS = "EI", "EA", "shear stiffness", "E"
STIFFEST = 100.0
"""The largest factor of stiffness of a whole section or material that is worth naming."""
INVISIBLE, INVISIBLE_LARGE = 1e-19, 1e-9
"""A signature of which less than this share of its square survives the fit is only round-off (coarser beyond
fit.DENSE_ROWS). A slip along a stiff member survives by little, for the far joint follows it: measured on 60 random
frames, no share lies between 1e-26 (nil) and 4e-14."""
ALIKE = 1e-9
"""Two signatures within this of the same direction cannot be told apart by compatibility."""


@dataclass(frozen=True, slots=True)
class Signature:
    """One candidate and what it would explain.

    kind: "support" (one direction gives way), "end" (a member end turns against its joint), "length" (a member's
      elongation is off), "tie" (a joint of a tie parts from it), "profile" (a stepped or tapered member taken for another:
      `direction` says which; a size of 1 is that very member), "EI", "EA", "shear stiffness" (by a factor, of a member or
      of all of a section), "E" (of a material, and with it G: bending, axial and shear together).
    of, where: "joint", "member", "members" (every stepped or tapered one), "section" (its prismatic parts) or "material",
      and its name. joint: of an "end", its joint.
    direction: of a "support" one of "x", "y", "rotation" in its own axes, or "x and y" (between the two).
    share: of the squared misfit it explains, 0 to 1. size: movement, rotation or stretch of the slip, or 1 - 1/factor.
    allowed: how large a size rounding alone could give; significant: size beyond that.
    fitted: what the claim goes with: the stiffness left (0: free, or a hinge), or the factor; NaN for the others.
    """

    kind: str
    of: str
    where: str
    share: float
    size: float
    allowed: float
    fitted: float
    joint: str = ""
    direction: str = ""

    @property
    def significant(self) -> bool:
        return abs(self.size) > self.allowed

    @property
    def possible(self) -> bool:
        """No negative stiffness; and not a group of members made (nearly) rigid, which explains any misfit there is:
        where all members are of one section or material, no deformation at all is left."""
        if self.of in ("section", "material"):
            return 0 < self.fitted <= STIFFEST
        return not self.fitted < 0


@dataclass(frozen=True, eq=False)
class SignatureTable:
    """All candidates of a case with their columns (n, k) for pairs and ties; best first, impossible ones last."""

    fit: Fit
    entries: tuple[Signature, ...]
    columns: Sparse

    def share_of(self, chosen: Sequence[int]) -> float:
        """Share of the squared misfit that several candidates explain together, by least squares."""
        return share(self.fit, self.columns[:, list(chosen)])

    def ties(self, index: int, among: int = 40) -> list[int]:
        """Candidates among the best that compatibility cannot tell from this one."""
        count = min(among, len(self.entries))
        part = self.columns[:, [index, *range(count)]].toarray()
        gram = _gram(self.fit, part)
        size = np.diag(gram)
        like = gram[0, 1:] ** 2 >= (1 - ALIKE) * size[0] * size[1:]
        return [k for k in np.flatnonzero(like).tolist() if k != index and self.entries[k].possible]


def share(system: Fit, columns: Sparse) -> float:
    """Share of the squared misfit that any combination of the columns (n, k) explains."""
    if system.squared <= 0:
        return 0.0
    dense = columns.toarray()
    gram = _gram(system, dense)
    seen = dense.T @ system.solved[0]
    size = np.sqrt(np.maximum(np.diag(gram), 1e-300))
    scaled = gram / size / size[:, None]
    found = np.linalg.lstsq(scaled, seen / size, rcond=1e-10)[0]
    return float(found @ (seen / size)) / system.squared


def _gram(system: Fit, columns: Floats) -> Floats:
    """(k, k) a'La of columns (n, k), as (La)'S(La): a'La itself loses digits to cancellation."""
    spread = system.solve(columns)[0]
    return np.asarray(spread.T @ (system.weight @ spread))


@dataclass
class _Candidates:
    """Raw columns (3 m + 3 j) being collected as triplets, with a label and what turns a size into a fitted value."""

    labels: list[Signature]
    forces: list[tuple[float, float]]
    row: list[Ints]
    entry: list[Floats]

    def add(self, label: Signature, row: Ints, entry: Floats, force: float = 0.0, soft: float = 0.0) -> None:
        """force: what acts at a slip; soft: its flexibility today (1/k)."""
        self.labels.append(label)
        self.forces.append((force, soft))
        self.row.append(row)
        self.entry.append(entry)

    def matrix(self, size: int) -> Sparse:
        count = np.array([len(r) for r in self.row])
        column = np.repeat(np.arange(len(count)), count)
        return sparse.coo_array(
            (np.concatenate(self.entry), (np.concatenate(self.row), column)), shape=(size, len(count))
        ).tocsc()


def signatures(findings: CompatibilityFindings, slips_only: bool = False) -> SignatureTable:
    """Every single candidate of the case, best first; invisible ones left out.

    slips_only: supports, ends, lengths and ties only (the local findings of compatibility).
    """
    system = findings.fit
    if system is None:
        raise ValueError("no fit to take signatures of: " + findings.says)
    candidates = _Candidates([], [], [], [])
    _supports(system, candidates)
    _ends(system, candidates)
    _lengths(system, candidates)
    _ties(system, candidates)
    if not slips_only:
        _factors(system, candidates)
        _profiles(system, findings.case, candidates)
    if not candidates.labels:
        return SignatureTable(system, (), sparse.csc_array((len(system.d), 0)))
    columns = (system.keep @ candidates.matrix(system.keep.shape[1])).tocsc()
    return _judge(system, candidates, columns)


def local_findings(findings: CompatibilityFindings) -> list[Signature]:
    """Slips beyond rounding, the one that explains most first; empty where everything fits.

    Which end turns against its joint, which support gives way, which member's length does not fit.
    """
    if findings.fit is None or not findings.dimension:
        return []
    return [s for s in signatures(findings, slips_only=True).entries if s.significant]


def _judge(system: Fit, candidates: _Candidates, columns: Sparse) -> SignatureTable:
    """Shares, sizes and intervals of every candidate, sorted."""
    seen = np.asarray(columns.T @ system.solved[0])
    own = system.own(columns)
    carried = system.carried(columns.T.tocsr(), own)
    scaled = (sparse.diags_array(1 / system.unit) @ columns).tocsc()
    whole = np.asarray(scaled.multiply(scaled).sum(axis=0)).ravel()
    visible = (own > (INVISIBLE if system.small else INVISIBLE_LARGE) * whole) & (whole > 0)
    safe = np.where(visible, own, 1.0)
    size, most = seen / safe, carried / safe
    explained = seen**2 / safe / (system.squared or 1.0)
    order = np.flatnonzero(visible)
    order = order[np.argsort(-explained[order], kind="stable")]
    found = [
        replace(
            candidates.labels[k], share=min(float(explained[k]), 1.0), size=float(size[k]), allowed=float(most[k]),
            fitted=_fitted(candidates.labels[k].kind, float(size[k]), float(most[k]), *candidates.forces[k]),
        )
        for k in order.tolist()
    ]  # fmt: skip
    ranked = sorted(range(len(found)), key=lambda k: not found[k].possible)
    return SignatureTable(system, tuple(found[k] for k in ranked), columns[:, order[ranked]])


def _fitted(kind: str, size: float, allowed: float, force: float, soft: float) -> float:
    """Stiffness left at a slip, or factor of stiffness; nil stiffness where no force acts there to speak of."""
    if kind in (LENGTH, TIE, PROFILE):
        return float("nan")
    if kind not in (SUPPORT, END):
        return 1 / (1 - size) if abs(1 - size) > 1e-12 else float("inf")
    if size == 0:
        return float("inf")
    now = soft - size / force if force else float("inf")
    return 0.0 if np.isinf(now) else 1 / now if now else float("inf")


def _supports(system: Fit, into: _Candidates) -> None:
    """A held direction moves: B of that displacement. A sprung one moves more: its own row."""
    frame, g = system.frame, system.geometry
    m = len(frame.members)
    columns = g.matrix.tocsc()
    blocked, together = _blocked(system)
    for joint, (along, across) in together.items():
        label = Signature(SUPPORT, "joint", list(frame.joints)[joint], 0, 0, 0, 0, direction=BOTH)
        column = (along * columns[:, [3 * joint]] + across * columns[:, [3 * joint + 1]]).tocoo()
        places = 3 * m + 3 * joint + np.arange(2)
        reaction = _beyond(np.dot((along, across), system.forces[places]), system.rounding[places].sum())
        into.add(label, column.row.astype(np.int64), column.data, reaction, 0.0)
    for joint, axis in zip(*np.nonzero(frame.support_table.stiffness != FREE), strict=True):
        place = 3 * int(joint) + int(axis)
        if blocked[place]:
            continue
        label = Signature(
            SUPPORT, "joint", list(frame.joints)[joint], 0, 0, 0, 0, direction=("x", "y", "rotation")[axis]
        )
        reaction = _beyond(system.forces[3 * m + place], system.rounding[3 * m + place])
        if g.held[place]:
            start, end = columns.indptr[place], columns.indptr[place + 1]
            into.add(label, columns.indices[start:end], columns.data[start:end], reaction, 0.0)
        else:
            # Here the row is displacement less (settlement - reaction/k): more give makes it negative by reaction.
            into.add(label, np.array([3 * m + place]), np.array([-1.0]), reaction, 1 / float(g.stiffness[place]))


def _blocked(system: Fit) -> tuple[Bools, dict[int, tuple[float, float]]]:
    """(3 j,) held directions that rigid members stop from moving even when freed; and by joint (index) the one direction
    between x and y, along its own axes, that they leave where both are held and each alone is stopped.

    Where rigid members leave axial forces undetermined, some of their elongations repeat others and are not kept: a
    freed support may only move if all of them allow it.
    """
    blocked = np.zeros(system.geometry.matrix.shape[1], dtype=bool)
    if not system.lost_rows.shape[0]:
        return blocked, {}
    rigid = sparse.vstack([system.keep[np.flatnonzero(system.rigid)], system.lost_rows]) @ system.geometry.matrix
    rigid = rigid.tocsc()
    base = rigid[:, system.columns]
    square = (base.T @ base + 1e4 * NUDGE * sparse.eye_array(base.shape[1])).tocsc()
    factors = splu(square)
    held = np.flatnonzero(system.geometry.held)
    target = rigid[:, held].toarray()
    left = target.copy()
    for _ in range(3):
        left = left - base @ factors.solve(base.T @ left)
    blocked[held] = np.abs(left).max(axis=0, initial=0.0) > STOPPED
    together = {}
    place = {int(h): k for k, h in enumerate(held)}
    for joint in range(len(blocked) // 3):
        x, y = 3 * joint, 3 * joint + 1
        if blocked[x] and blocked[y]:
            pair = left[:, [place[x], place[y]]]
            _, _, direction = np.linalg.svd(pair.T @ pair)
            if np.abs(pair @ direction[1]).max() <= STOPPED:
                together[joint] = (float(direction[1, 0]), float(direction[1, 1]))
    return blocked, together


def _ends(system: Fit, into: _Candidates) -> None:
    """A member end turns against its joint: a kink at the face of the zone, where the connection is."""
    frame, soft = system.frame, system.flexibility
    t = frame.member_table
    members, joints = list(frame.members), list(frame.joints)
    forces = system.forces[: 3 * len(members)].reshape(-1, 3)
    moment = np.einsum("mea,ma->me", soft.connection, forces) + soft.connection_load
    rounding = np.einsum("mea,ma->me", np.abs(soft.connection), system.rounding[: forces.size].reshape(-1, 3))
    for k, end in zip(*np.nonzero(t.turn != FREE), strict=True):
        label = Signature(END, "member", members[k], 0, 0, 0, 0, joint=joints[int(t.ends[k, end])])
        now = 0.0 if t.turn[k, end] == HELD else 1 / float(t.turn[k, end])
        into.add(label, np.array([3 * k, 3 * k + 1]), soft.connection[k, end, :2],
                 _beyond(moment[k, end], rounding[k, end]), now)  # fmt: skip


def _beyond(force: float, rounding: float) -> float:
    """The force at a slip, nil where it is no more than rounding: then nothing holds there."""
    return float(force) if abs(force) > rounding else 0.0


def _lengths(system: Fit, into: _Candidates) -> None:
    for k, name in enumerate(system.frame.members):
        into.add(Signature(LENGTH, "member", name, 0, 0, 0, 0), np.array([3 * k + 2]), np.ones(1))


def _ties(system: Fit, into: _Candidates) -> None:
    """A further joint of a tie moves by itself, or its first joint does (all others stay together)."""
    place = 3 * (len(system.frame.members) + len(system.frame.joints))
    for tie in system.frame.ties.values():
        rows = place + np.arange(len(tie.joints) - 1)
        place += len(rows)
        for row, joint in zip(rows, tie.joints[1:], strict=True):
            into.add(Signature(TIE, "joint", joint, 0, 0, 0, 0, direction=tie.name), np.array([row]), np.ones(1))
        if len(rows) > 1:
            label = Signature(TIE, "joint", tie.joints[0], 0, 0, 0, 0, direction=tie.name)
            into.add(label, rows, np.ones(len(rows)))


def _profiles(system: Fit, case: str, into: _Candidates) -> None:
    """Stepped and tapered members taken as prismatic, or turned end for end: the difference of the deformations."""
    frame = system.frame
    varying = np.flatnonzero(frame.member_table.varying)
    forces = system.forces[: 3 * len(frame.members)].reshape(-1, 3)
    if not len(varying):
        return
    loads = load_table(frame, case)
    for word in (LIGHT, DEEP, REVERSED):
        other = flexibility(replace(frame, members={n: _taken_as(frame, m, word) for n, m in frame.members.items()}), loads)
        change = (system.flexibility.total - other.total) @ forces[:, :, None]
        deformation = change[:, :, 0] + system.flexibility.total_load - other.total_load
        for k in varying.tolist():
            label = Signature(PROFILE, "member", list(frame.members)[k], 0, 0, 0, 0, direction=word)
            _factor(into, label, np.array([k]), deformation)
        if len(varying) > 1:
            label = Signature(PROFILE, "members", EACH_STEPPED, 0, 0, 0, 0, direction=word)
            _factor(into, label, varying, deformation)


def _taken_as(frame: Frame, member: Member, word: str) -> Member:
    """A stepped or tapered member as another; the others as they are."""
    if not member.pieces:
        return member
    if word == REVERSED:
        starts = [0.0, *(piece.until for piece in member.pieces[:-1])]
        turned = tuple(
            replace(piece, first=piece.last, last=piece.first, until=1.0 - start)
            for piece, start in zip(reversed(member.pieces), reversed(starts), strict=True)
        )
        return replace(member, pieces=turned)
    names = dict.fromkeys(name for piece in member.pieces for name in (piece.first, piece.last))
    choose = min if word == LIGHT else max
    return replace(member, pieces=(), section=choose(names, key=lambda name: frame.sections[name].I))


def _factors(system: Fit, into: _Candidates) -> None:
    """The deformations of bending, of axial force or of shear by a factor: of a member, a section, a material.

    Of stepped members a section has its own pieces; a tapered piece is of neither of its two sections.
    """
    frame, soft = system.frame, system.flexibility
    forces = system.forces[: 3 * len(frame.members)].reshape(-1, 3)
    part = np.einsum("smab,mb->sma", soft.matrix, forces) + soft.load
    members = list(frame.members.values())
    sources: list[tuple[str, Floats]] = [(BENDING_FACTOR, part[BENDING])]
    if not frame.member_table.rigid.all():
        sources.append((AXIAL_FACTOR, part[STRETCH]))
    if frame.analysis.shear == "elastic":
        sources.append((SHEAR_FACTOR, part[SHEAR_STRAIN]))
    for kind, deformation in sources:
        for k, member in enumerate(members):
            _factor(into, Signature(kind, "member", member.name, 0, 0, 0, 0), np.array([k]), deformation)
        for section in frame.sections:
            own = deformation * np.array([not m.pieces and m.section == section for m in members])[:, None]
            np.add.at(own, *_of_pieces(system, section, KINDS.index(kind), forces))
            chosen = np.flatnonzero(own.any(axis=1))
            if len(chosen):
                _factor(into, Signature(kind, "section", section, 0, 0, 0, 0), chosen, own)
    for material in frame.materials:
        chosen = np.array([k for k, member in enumerate(members) if member.material == material], dtype=np.int64)
        if len(chosen):
            every = part[BENDING] + part[STRETCH] + part[SHEAR_STRAIN]
            _factor(into, Signature(MODULUS, "material", material, 0, 0, 0, 0), chosen, every)


def _of_pieces(system: Fit, section: str, source: int, forces: Floats) -> tuple[Ints, Floats]:
    """Members (k,) and deformations (k, 3) of the pieces that are of this section from end to end."""
    parts, member = system.flexibility.by_piece, system.frame.variation.member
    pieces = [piece for m in system.frame.members.values() for piece in m.pieces]
    rows = np.array([k for k, p in enumerate(pieces) if p.first == p.last == section], dtype=np.int64)
    bent = np.einsum("pab,pb->pa", parts.matrix[rows, source], forces[member[rows]]) + parts.load[rows, source]
    return member[rows], bent


def _factor(into: _Candidates, label: Signature, chosen: Ints, deformation: Floats) -> None:
    row = (3 * chosen[:, None] + np.arange(3)).ravel()
    into.add(label, row, deformation[chosen].ravel())
