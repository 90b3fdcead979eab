"""Tables of working for a reader who follows the distribution by hand."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np

from crosscheck.answer import WorkTable
from crosscheck.frame.kinematics import Study
from crosscheck.frame.model import Floats, Frame
from crosscheck.opinions.moment_distribution.displaced_working import by_joint, displaced_working, taken_out
from crosscheck.opinions.moment_distribution.holding import FEW, Held, start, unbalanced
from crosscheck.opinions.moment_distribution.one_way import settled_process
from crosscheck.opinions.moment_distribution.process import Process

NOTHING = 1e-12
"""Share of the largest moment below which a table says zero."""
ROUNDS_SHOWN = 2
"""Rounds of release and carry-over with columns of their own; the rest are summed in one."""
SWAYS_SHOWN = 12
"""Rows of sways, those with the largest holding forces first."""
SWAY_COLUMNS = 3
"""Up to so many sways have a column each in the table of final end moments."""
JOINTS_NAMED = 4

Row = tuple[str | float | None, ...]


def working(frame: Frame, study: Study, name: str) -> list[WorkTable]:
    """The distribution of one load case or combination, table by table. `study` is taken for likeness with the
    others.

    Units are the frame's; moments clockwise on the member ends, rotations per radian.
    """
    if frame.analysis.order == 2:
        return displaced_working(frame, name)
    process = settled_process(frame, name)
    if isinstance(process, str):
        return [WorkTable("One-way members and supports", (), (), (process,))]
    hand = _Hand(process)
    tables = [*taken_out(process.held.frame), _factors(hand), _fixed_ends(hand), _rounds(hand)]
    if process.held.sways.shape.shape[1]:
        tables.append(_sways(hand))
    return [*tables, _final(hand), _passes(process)]


@dataclass(frozen=True)
class _Hand:
    """The first pass told step by step, (m, 2) moments on the member ends."""

    process: Process

    @cached_property
    def held(self) -> Held:
        return self.process.held

    @cached_property
    def factor(self) -> Floats:
        """(j,) one over the joint's stiffness; zero where it is held or nothing resists."""
        factor = np.zeros(len(self.held.frame.joints))
        factor[self.held.turning] = 1 / self.held.distribution.stiffness
        return factor

    @cached_property
    def fixed(self) -> Floats:
        """Fixed-end moments with those of imposed movements."""
        return start(self.held, self.process.given).moment[:, :, 0]

    @cached_property
    def couple(self) -> Floats:
        """(j,) moments on the joints from outside the members, before any release."""
        first = start(self.held, self.process.given)
        return np.asarray(self.process.given.couple[:, 0] + first.twist[:, 0])

    @cached_property
    def rounds(self) -> list[tuple[Floats, Floats, Floats]]:
        """Each shown round: (j,) rotations, (m, 2) moments distributed, (m, 2) carried over."""
        k, ends = self.held.members.joint, self.held.ends
        loose = self.couple - self.held.gather @ self.fixed.ravel()
        found = []
        for _ in range(ROUNDS_SHOWN):
            turned = loose * self.factor
            at = turned[ends]
            shared = np.einsum("mii,mi->mi", k, at)
            carried = k[:, 0, 1, None] * at[:, ::-1]
            loose = -(self.held.gather @ carried.ravel())
            found.append((turned, shared, carried))
        return found

    @cached_property
    def settled(self) -> tuple[Floats, int]:
        """(j,) rotations when nothing is left over, the joints held against sway; and the rounds it took."""
        loose = self.couple - self.held.gather @ self.fixed.ravel()
        turned = np.zeros_like(loose)
        part, rounds = self.held.distribution.distribute(loose[self.held.turning, None], 1e-12)
        turned[self.held.turning] = part[:, 0]
        return turned, rounds

    @cached_property
    def without_sway(self) -> Floats:
        """End moments after distribution, the joints held against sway."""
        turned = self.settled[0][self.held.ends]
        return np.asarray(self.fixed + np.einsum("mij,mj->mi", self.held.members.joint, turned))

    @cached_property
    def holding(self) -> Floats:
        """(q,) forces that hold the sways once the moments are distributed; positive against the unit sway."""
        first = start(self.held, self.process.given)
        force = unbalanced(self.held, self.process.given, first, np.array([0]))[1][:, 0]
        return np.asarray(force - self.held.sway_moment.T @ self.settled[0][self.held.turning])

    @cached_property
    def amounts(self) -> Floats:
        """(q,) how far each sway goes in the end: its own translation is one of the joints'."""
        first = start(self.held, self.process.given)
        moved = (self.process.state.move - first.move)[self.held.sways.free, 0]
        return np.asarray(moved[self.held.sways.own])

    def shown(self, *columns: Floats) -> list[Floats]:
        """Moments as tables say them: rounding, against the largest of the case, is zero."""
        sizes = (self.fixed, self.process.state.moment, self.couple)
        least = NOTHING * max(float(np.abs(size).max(initial=0.0)) for size in sizes)
        return [np.where(np.abs(c) > least, c, 0.0) for c in columns]

    def rows(self) -> list[tuple[str, str, int, int]]:
        """Joint, member, its index and end, joint by joint."""
        return by_joint(self.held)


def _factors(hand: _Hand) -> WorkTable:
    """Stiffness of every member end, its share of the joint's unbalanced moment, and what it carries over."""
    k, index = hand.held.members.joint, hand.held.frame.joint_index
    rows: list[Row] = []
    for joint, member, m, end in hand.rows():
        own = float(k[m, end, end])
        carry = float(k[m, 0, 1] / own) if own > 0 else None
        rows.append((joint, member, own, float(own * hand.factor[index[joint]]), carry))
    for joint, j in index.items():
        spring = float(hand.held.rotation_spring[j])
        if spring > 0:
            rows.append((joint, "support spring", spring, float(spring * hand.factor[j]), None))
    return WorkTable(
        "Distribution and carry-over factors",
        ("joint", "member", "stiffness", "share", "carry-over"),
        tuple(rows),
        ("stiffness: moment at the joint per radian of its rotation, far joint held",
         "share 0: the joint is held against rotation, or the end is hinged there"),
    )  # fmt: skip


def _fixed_ends(hand: _Hand) -> WorkTable:
    """Fixed-end moments of the loads, and of the movements that are imposed with the joints held."""
    loads = hand.process.given.fixed[:, :, 0]
    moved = hand.fixed - loads
    columns = hand.shown(loads, moved, hand.fixed)
    rows: list[Row] = [
        (joint, member, *(float(c[m, end]) for c in columns)) for joint, member, m, end in hand.rows()
    ]
    return WorkTable(
        "Fixed-end moments, every joint held",
        ("joint", "member", "loads", "movements", "sum"),
        tuple(rows),
        ("clockwise on the member; loads with temperature difference, movements: settlements and imposed lengths",),
    )


def _rounds(hand: _Hand) -> WorkTable:
    """The distribution with the joints held against sway."""
    index = hand.held.frame.joint_index
    shown = [part for _, shared, carried in hand.rounds for part in (shared, carried)]
    later = hand.without_sway - hand.fixed - sum(shown)
    columns = hand.shown(hand.fixed, *shown, later, hand.without_sway)
    rows: list[Row] = [
        (joint, member, *(float(c[m, end]) for c in columns)) for joint, member, m, end in hand.rows()
    ]
    for joint, j in index.items():
        spring = float(hand.held.rotation_spring[j])
        if hand.couple[j] or spring:
            turned = [float(spring * r[0][j]) for r in hand.rounds]
            total = float(spring * hand.settled[0][j])
            parts = [value for t in turned for value in (t, 0.0)]
            outside = float(hand.couple[j])
            values = (-outside, *parts, total - sum(turned), total - outside)
            rows.append((joint, "couple, spring", *(value + 0.0 for value in values)))
    heads = [head for r in range(1, ROUNDS_SHOWN + 1) for head in (f"release {r}", f"carry {r}")]
    return WorkTable(
        "Distribution, joints held against sway",
        ("joint", "member", "fixed", *heads, "later", "sum"),
        tuple(rows),
        (f"all joints released at once; {hand.settled[1]} rounds until a 1e-12th is left, 'later' sums the rest",),
    )


def _sways(hand: _Hand) -> WorkTable:
    """Holding forces and how far the frame sways until they are gone."""
    count = len(hand.holding)
    order = np.argsort(-np.abs(hand.holding), kind="stable")[:SWAYS_SHOWN]
    rows = tuple(
        (f"sway {k + 1}", _moving(hand, int(k)), float(hand.holding[k]), float(hand.amounts[k]))
        for k in sorted(order.tolist())
    )
    how = (
        "each sway imposed by one unit, its moments distributed, and as many equations solved"
        if count <= FEW
        else "all sways corrected and all joints released together, round by round, by conjugate gradients"
    )
    remarks = [how, "holding force: what the frame pushes with along the sway while it is held"]
    if count > len(rows):
        remarks.append(f"the {len(rows)} with the largest holding forces of {count} sways")
    return WorkTable("Sways", ("sway", "moves", "holding force", "amount"), rows, tuple(remarks))


def _moving(hand: _Hand, sway: int) -> str:
    """Which joints a unit sway moves, and where to."""
    sways = hand.held.sways
    own = np.zeros((2 * len(hand.held.frame.joints), 1))
    own[sways.free] = sways.shape[:, [sway]].toarray()
    moved = sways.global_axes(own)[:, :, 0]
    names = list(hand.held.frame.joints)
    size = np.hypot(moved[:, 0], moved[:, 1])
    some = [k for k in np.argsort(-size, kind="stable") if size[k] > 1e-9]
    said = [f"{names[k]} {_way(moved[k])}" for k in sorted(some[:JOINTS_NAMED])]
    more = len(some) - JOINTS_NAMED
    return ", ".join(said) + (f" and {more} more" if more > 0 else "")


def _way(move: Floats) -> str:
    """A movement in words: "right", "right 0.8 down 0.3"."""
    words = [(("left", "right"), float(move[0])), (("down", "up"), float(move[1]))]
    said = [(pair[value > 0], abs(value)) for pair, value in words if abs(value) > 1e-9]
    return " ".join(word if abs(size - 1) < 1e-9 else f"{word} {size:.3g}" for word, size in said)


def _final(hand: _Hand) -> WorkTable:
    """End moments without sway, what the sways add, and the sum."""
    total = hand.process.state.moment[:, :, 0]
    count = len(hand.amounts)
    if 0 < count <= SWAY_COLUMNS:
        unit = hand.held.unit_sways[0] * hand.amounts
        chord = hand.held.sways.turn[:, hand.held.sways.free] @ hand.held.sways.shape.toarray() * hand.amounts
        turned = np.zeros((len(hand.factor), count))
        turned[hand.held.turning] = unit
        by_sway = hand.held.members.joint @ (turned[hand.held.ends] - chord[:, None])
        parts, heads = [by_sway[:, :, k] for k in range(count)], [f"sway {k + 1}" for k in range(count)]
    else:
        parts, heads = ([total - hand.without_sway], ["sways"]) if count else ([], [])
    columns = hand.shown(hand.without_sway, *parts, total)
    rows: list[Row] = [
        (joint, member, *(float(c[m, end]) for c in columns)) for joint, member, m, end in hand.rows()
    ]
    return WorkTable("End moments", ("joint", "member", "held", *heads, "final"), tuple(rows))


def _passes(process: Process) -> WorkTable:
    """How the process settled: each pass takes up what the one before left unbalanced."""
    rows = tuple(
        (f"pass {k + 1}", float(p.rounds), float(p.corrections), p.moment, p.force)
        for k, p in enumerate(process.trace)
    )
    left = float(process.left.max(initial=0.0))
    return WorkTable(
        "Convergence",
        ("pass", "rounds", "sway corrections", "unbalanced moment", "holding force"),
        rows,
        (f"unbalanced in the end: {left:.1e} of the largest moment or force",),
    )
