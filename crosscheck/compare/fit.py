"""Finding the convention and the unit that a claim is printed in, for each kind and quantity, by what fits the opinions.

A value is bad in a choice when it lies further from the opinion than is allowed. A choice in which no value is bad
fits. Where
no choice fits, every choice gives the same verdict (disagree), and the nearest is taken to show the differences in.
"""

from __future__ import annotations

from dataclasses import dataclass
from itertools import product

import numpy as np

from crosscheck.compare.fit_conventions import Batch, Convention, conventions, expected, of_governing
from crosscheck.compare.fit_units import UnitChoice, angle_choices, arm_choices, force_choices, length_choices
from crosscheck.compare.fit_values import EnvelopeReference, Reference
from crosscheck.compare.tolerance import COARSE, LEAST_SHARE, Tolerance, allowed
from crosscheck.frame.model import Bools, Floats, Units

UNSUPPORTED = 1e-6
"""Share of the case's scale within which a reaction at a joint without support counts as zero."""
FORCES = ("axial", "shear", "fx", "fy")


@dataclass(frozen=True, slots=True)
class Choice:
    """A unit and a convention, and how the batch fits them.

    bad: (n,) beyond what is allowed. telling: (n,) judged at all and large enough to tell a sign or a unit by.
    misses: sum over telling values of |claim - opinion| / (|claim| + |opinion|), and 1 for each that this unit makes
    too coarse
      to judge; about 0 where all is right. Units are chosen by it and not by what fits: a huge unit leaves nothing to
      judge.
    """

    unit: UnitChoice | None
    convention: Convention
    bad: Bools
    telling: Bools
    sizes_bad: Bools
    misses: float
    side: Floats
    """(n,) sign of what the opinion says, for sizes: they are compared without theirs."""

    @property
    def fits(self) -> bool:
        return not bool(self.bad.any())

    @property
    def rank(self) -> tuple[bool, float]:
        """Smaller is better: what fits before what does not, then by how many values it fits or how little it misses."""
        return (False, -float(self.telling.sum())) if self.fits else (True, self.misses)


@dataclass(slots=True)
class Fitted:
    """A batch with every choice tried (the plainest first) and the one taken."""

    batch: Batch
    choices: list[Choice]
    taken: Choice


class Fitter:
    """Tries choices on batches. `references` in the order of each batch's cases."""

    def __init__(self, units: Units, references: list[Reference | EnvelopeReference], tolerance: Tolerance) -> None:
        self.units, self.references, self.tolerance = units, references, tolerance

    def fit(self, batches: list[Batch]) -> list[Fitted]:
        """Fits all batches: one unit of force for the whole claim, one length for its moments; the rest each by itself."""
        tables = [_Trial(self, batch) for batch in batches]
        by_force = [t for t in tables if t.batch.quantity in (*FORCES, "moment")]
        open_force = [t for t in by_force if t.open]
        picked: dict[int, UnitChoice | None] = {}
        if open_force:
            picked = _one_system(open_force, force_choices(self.units), arm_choices(self.units))
        for trial in tables:
            if trial.open and id(trial) not in picked:
                lengths = angle_choices() if trial.batch.quantity == "rotation" else length_choices(self.units)
                picked[id(trial)] = min(lengths, key=lambda u: (trial.best(u).misses, not u.own))
        return [trial.fitted(picked.get(id(trial))) for trial in tables]


class _Trial:
    """One batch against every convention, unit by unit, each worked out once."""

    def __init__(self, fitter: Fitter, batch: Batch) -> None:
        self.batch, self.tolerance = batch, fitter.tolerance
        self.open = bool(np.isnan(batch.factor).any())
        self.conventions = conventions(batch)
        self.expected = _expected(batch, fitter.references, self.conventions)
        governed = bool((batch.governs >= 0).any())
        self.governing = [of_governing(batch, fitter.references, c) if governed else None for c in self.conventions]
        self.scale, self.unsupported = _scales(batch, fitter.references)
        self._known: dict[float, list[Choice]] = {}

    def choices(self, unit: UnitChoice | None) -> list[Choice]:
        key = unit.factor if unit else 1.0
        if key not in self._known:
            factor = np.where(np.isnan(self.batch.factor), key, self.batch.factor)
            value, half = self.batch.value * factor, self.batch.half * factor
            self._known[key] = [
                self._choice(unit, c, e, g, value, half)
                for c, e, g in zip(self.conventions, self.expected, self.governing, strict=True)
            ]
        return self._known[key]

    def best(self, unit: UnitChoice | None) -> Choice:
        choices = self.choices(unit)
        return min(choices, key=lambda c: c.rank)  # the first of equals: the plainest

    def fitted(self, unit: UnitChoice | None) -> Fitted:
        return Fitted(self.batch, self.choices(unit), self.best(unit))

    def _choice(
        self, unit: UnitChoice | None, convention: Convention, said: Floats, governing: Floats | None, value: Floats,
        half: Floats,
    ) -> Choice:  # fmt: skip
        side = np.where(said[:, 0] < 0, -1.0, 1.0) * convention.sign
        value = np.where(self.batch.unsigned, np.abs(value), value)
        said = np.where(self.batch.unsigned[:, None], np.abs(said), said)
        sizes = np.abs(said)
        said = _nearer(said, value)
        may = np.where(self.unsupported, np.maximum(half, UNSUPPORTED * self.scale),
                       allowed(value, said, self.tolerance, self.scale, half))  # fmt: skip
        known = np.isfinite(said) & ((half <= COARSE * self.scale) | self.unsupported)
        apart = np.abs(value - said)
        if governing is not None:  # what is said to govern must have the value, too
            named = np.abs(governing) if self.batch.unsigned.all() else governing
            apart = np.fmax(apart, np.abs(value - _nearer(named, value)))
        bad = known & (apart > may)
        size_apart = np.abs(np.abs(value) - _nearer(sizes, np.abs(value)))
        telling = known & ((np.abs(said) > may) | (np.abs(value) > may))
        total = np.abs(value) + np.abs(said)
        share = np.where(telling & (total > 0), apart / np.where(total > 0, total, 1.0), 0.0)
        # A value that this unit would make too coarse to judge speaks against the unit.
        coarse = np.isfinite(said) & ~known
        misses = float(share.sum() + coarse.sum())
        return Choice(unit, convention, bad, telling, known & (size_apart > may), misses, side)


def _expected(batch: Batch, references: list[Reference | EnvelopeReference], tried: list[Convention]) -> list[Floats]:
    """What the opinion says in every convention; the two signs of one are each other's negative, but for extremes."""
    if batch.kind == "extreme" or batch.extreme.any():
        return [expected(batch, references, c) for c in tried]
    straight = {(c.form, c.rule): expected(batch, references, c) for c in tried if c.sign == 1}
    return [c.sign * straight[c.form, c.rule] for c in tried]


def _nearer(said: Floats, value: Floats) -> Floats:
    """(n,) of the values on both sides of a jump the one that the claim is nearer to."""
    if said.shape[1] == 1:
        return said[:, 0]
    first, second = said[:, 0], said[:, 1]
    takes_first = ~(np.abs(second - value) < np.abs(first - value))
    return np.where(takes_first & np.isfinite(first), first, second)


def _scales(batch: Batch, references: list[Reference | EnvelopeReference]) -> tuple[Floats, Bools]:
    """(n,) the scale of each value, and where a reaction stands at a joint without support."""
    scale = np.zeros(len(batch.value))
    unsupported = np.zeros(len(batch.value), dtype=bool)
    for k, reference in enumerate(references):
        mine = batch.case == k
        if batch.kind == "extreme":
            scale[mine] = _extreme_scale(batch, mine, reference)
        elif batch.kind in ("reaction", "displacement"):
            joint = batch.joint[mine]
            scale[mine] = reference.joint_scale(batch.quantity, batch.kind)[joint]
            if batch.kind == "reaction":
                held = np.array([j in reference.frame.supports for j in reference.frame.joints])
                unsupported[mine] = ~held[joint]
        else:
            scale[mine] = reference.member_scale(batch.quantity)[batch.member[mine]]
    if unsupported.any():
        whole = np.array([r.scales.of(batch.quantity) for r in references])
        scale = np.where(unsupported, whole[batch.case], scale)
    return scale, unsupported


def _extreme_scale(batch: Batch, mine: Bools, reference: Reference | EnvelopeReference) -> Floats:
    """The member's or joint's own scale; of an extreme over all of them its own size."""
    member, joint = batch.member[mine], batch.joint[mine]
    most = np.abs(reference.extremes_of(batch.quantity, member, joint)).max(axis=1)
    out: Floats = np.maximum(np.nan_to_num(most), LEAST_SHARE * reference.scales.of(batch.quantity))
    if (member >= 0).any():
        out[member >= 0] = reference.member_scale(batch.quantity)[member[member >= 0]]
    elif (joint >= 0).any():
        kind = "displacement" if batch.quantity in ("dx", "dy", "rotation") else "reaction"
        out[joint >= 0] = reference.joint_scale(batch.quantity, kind)[joint[joint >= 0]]
    return out


def _one_system(trials: list[_Trial], forces: list[UnitChoice], arms: list[UnitChoice]) -> dict[int, UnitChoice | None]:
    """The unit of force and of length in moments under which least is missed, the frame's own before others."""
    turning = [t for t in trials if t.batch.quantity == "moment"]
    pushing = [t for t in trials if t.batch.quantity != "moment"]

    def cost(pair: tuple[UnitChoice, UnitChoice]) -> tuple[float, int]:
        force, arm = pair
        units = [(t, force) for t in pushing] + [(t, _moment_unit(force, arm)) for t in turning]
        return sum(t.best(u).misses for t, u in units), (not force.own) + (not arm.own)

    pairs = product(forces, arms if turning else arms[:1])
    force, arm = min(pairs, key=cost)
    out: dict[int, UnitChoice | None] = {id(t): force for t in pushing}
    out |= {id(t): _moment_unit(force, arm) for t in turning}
    return out


def _moment_unit(force: UnitChoice, arm: UnitChoice) -> UnitChoice:
    return UnitChoice(f"{force.text} {arm.text}", force.factor * arm.factor, force.own and arm.own)
