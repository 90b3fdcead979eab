"""The sweep: gather what may have happened, weigh it, rank it, and say what ties with what.

Single mistakes first, those foretold from the factorised matrix before those that need another solution; pairs only
where no single one leaves every value within tolerance. Rank by what is left over beyond the printed rounding, and among
equals by how few and how common the mistakes are.
"""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Sequence
from dataclasses import dataclass, replace
from functools import partial
from heapq import nsmallest
from itertools import islice

import numpy as np

from crosscheck.answer import Answer, CaseAnswer
from crosscheck.compare.claimed import ClosedClaim
from crosscheck.frame.kinematics import study
from crosscheck.frame.model import Floats, Frame
from crosscheck.frame.stations import stations
from crosscheck.opinions import slope_deflection
from crosscheck.opinions.slope_deflection.prepared import Prepared, prepared
from crosscheck.problems import UnusableInput
from crosscheck.suspects.adjusted import adjusted
from crosscheck.suspects.changes import Change, of_case, usable, with_values
from crosscheck.suspects.geometry import geometry_families, geometry_options
from crosscheck.suspects.groups import group_fits, group_options, large_families
from crosscheck.suspects.loads import case_options, load_options
from crosscheck.suspects.members import heavy_families, member_fits, member_options, section_options
from crosscheck.suspects.observation import Observation
from crosscheck.suspects.pairs import Effect, adding_up, paired, same_place
from crosscheck.suspects.paste import paste_options
from crosscheck.suspects.screen import Screen
from crosscheck.suspects.supports import kinds_by_reactions, support_fits, support_options
from crosscheck.suspects.suspect import Family, Option
from crosscheck.suspects.whole import other_order, temperature_options, whole_options
from crosscheck.suspects.zones import zone_families

UNFIT, STEEPNESS = 3.0, 2.0
"""What not fitting to the printed precision costs, and how steeply the misfit counts after that."""
PER_NUMBER = 0.2
CONFIRMED = 16
PLACES_UP_TO = 500
"""Members of a frame whose every member, joint and load is weighed: memory goes with the square of them, half a gigabyte
here. In a larger one only mistakes of the paste, of whole sections and materials and of the whole frame are tried."""
MOST_KEPT = 40
"""Of the mistakes of the paste in a large frame, how many are kept: each holds as many values as the claim."""
SLOW_FEW, SLOW_FITS, SLOW_PLACES = 24, 4, 2
"""Options solved again, and numbers fitted, in second order: the most likely by a forecast of first order; and the places
of which all is tried."""
TURNS = 14
"""Most steps of a fit that solves again."""
LARGEST = 300.0
"""Of the logarithm of a factor that is fitted: beyond it nothing changes any more."""
PROMISE = 0.5
"""A family that leaves more than this share over after two steps is not fitted further."""
RIVALS, MOST_SHARE, STAND_IN_SHARE = 4.0, 0.02, 0.3
"""Places are searched where the least misfit they can leave is within the first of these times rounding, or within the
second's share of the whole misfit; the third's where first order stands in for second."""
SWAY = 0.4
SWAY_ALONE = {
    1: "the second-order effect of sway was counted, without the members' own",
    2: "the second-order effect of sway alone was counted, without the members' own",
}
"""By the frame's own order."""


@dataclass(frozen=True, slots=True, eq=False)
class Weighed:
    """An option with what is left over. said: (n,) the model's values after it; claimed: the claim's.

    explains: share of the squared, tolerance-scaled difference removed. beyond: worst value against what it may be off
    by to count as met. rough: root mean square of what is left, in units of noise. within: every value within tolerance.
    """

    option: Option
    said: Floats
    claimed: Floats
    explains: float
    beyond: float
    rough: float
    within: bool

    @property
    def fits(self) -> bool:
        return self.beyond <= (1.0 if not self.option.fitted else 1.5)

    @property
    def score(self) -> float:
        """Less is better."""
        unfit = 0.0 if self.fits else UNFIT + STEEPNESS * float(np.log(max(self.rough, 1.0)))
        return unfit + self.option.cost + PER_NUMBER * self.option.fitted


class Sweep:
    """One observation and everything tried on it."""

    def __init__(
        self, seen: Observation, closed: ClosedClaim, base: Prepared, answer: Answer, stand_in: bool = False
    ) -> None:
        """stand_in: whether it foretells another sweep, that of the same frame in second order."""
        self.seen, self.closed, self.base, self.answer, self.stand_in = seen, closed, base, answer, stand_in
        self.frame: Frame = seen.frame
        self.screen = Screen(seen, base)
        self.solved = 0
        self.results: dict[int, CaseAnswer | None] = {}
        self._least: dict[tuple[tuple[int, ...], tuple[int, ...]], float] = {}

    @property
    def names(self) -> tuple[str, ...]:
        """Cases and combinations that the claim's values come from."""
        return self.seen.names

    @property
    def slow(self) -> bool:
        """In second order another solution costs a hundred times one of first order: few are tried."""
        return self.frame.analysis.order == 2

    @property
    def large(self) -> bool:
        """Too large a frame for every place in it to be weighed."""
        return len(self.frame.members) > PLACES_UP_TO

    # --- weighing ---

    def weigh(self, option: Option, said: Floats | None = None) -> Weighed:
        seen = self.seen
        said = seen.said if said is None else said
        claimed = seen.value if option.claimed is None else option.claimed
        half = seen.half if option.half is None else option.half
        left = claimed - said
        left = np.where(np.isfinite(left), left, seen.residual)
        # Rounding of the printout is no difference: neither before nor after.
        before = float(((np.maximum(np.abs(seen.residual) - seen.half, 0.0) / seen.allowed) ** 2).sum())
        after = float(((np.maximum(np.abs(left) - half, 0.0) / seen.allowed) ** 2).sum())
        meets = seen.meets + 1.05 * np.maximum(half - seen.half, 0.0)
        noise = np.maximum(half, seen.noise)
        return Weighed(
            option, said, claimed, 1.0 - after / before if before else 0.0, float((np.abs(left) / meets).max()),
            float(np.sqrt(((left / noise) ** 2).mean())), bool((np.abs(left) <= np.maximum(seen.allowed, half)).all()),
        )  # fmt: skip

    def foretold(self, option: Option) -> Weighed | None:
        """By its delta where it has one, else by solving; places without a forecast count as met."""
        if option.delta is None:
            return self.solve(option)
        if not np.isfinite(option.delta).all():
            return None
        rows = self.screen.rows
        direct = self.seen.linear[rows]
        # Places of which no forecast is made tell neither for nor against.
        said = self.seen.value.copy()
        said[rows[direct]] = self.seen.said[rows[direct]] + option.delta[direct]
        return self.weigh(option, said)

    def solve(self, option: Option) -> Weighed | None:
        """By solving the frame so changed; None where it can move or lacks a number."""
        if option.change.frame is None:
            return self.weigh(option)
        changed = option.change.frame(self.frame)
        names = self.names
        answer = self.answer_to(changed, names, option.change.loads_only)
        if answer is None:
            return None
        said = self._read(answer, changed, names)
        return None if not np.isfinite(said).all() else self.weigh(option, said)

    def answer_to(self, changed: Frame, names: Sequence[str], loads_only: bool) -> Answer | None:
        """The changed frame's results; None where it can move, lacks a number or is past a critical load."""
        self.solved += 1
        with np.errstate(all="ignore"):
            try:
                if not usable(changed):
                    return None
                if changed.analysis.order == 2:
                    answer = slope_deflection.opine(changed, study(changed), names)
                    return answer if isinstance(answer, Answer) and all(n in answer.cases for n in names) else None
                if loads_only and self.frame.analysis.order == 1:
                    return self.base.answer(names, changed)
                return prepared(changed).answer(names)
            except (ArithmeticError, np.linalg.LinAlgError, UnusableInput):
                return None

    def _read(self, answer: Answer, changed: Frame, names: tuple[str, ...]) -> Floats:
        seen = self.seen
        if changed.members.keys() == self.frame.members.keys():
            return seen.read(answer, names)
        return _without_missing(seen, answer, changed, names)

    # --- gathering ---

    def singles(self) -> list[Weighed]:
        """Every single mistake worth telling, best first."""
        if self.large:
            return self._of_the_whole()
        quick = [self.weigh(o) for o in paste_options(self.seen)]
        told = [] if self.slow else self._told(quick)
        if self.screen.partial and not self.slow:
            # Foretold in part: the most likely are solved again.
            told.sort(key=lambda w: w.rough)
            told = [w for o in told[: 4 * CONFIRMED] if (w := self.solve(o.option)) is not None]
        quick += told
        quick += self._solved([*whole_options(self.frame), *temperature_options(self.frame)])
        quick += [] if self.stand_in else self._other_cases()
        quick += adjusted(self)
        quick.sort(key=lambda w: w.score)
        if not (quick and quick[0].fits) and not self.stand_in:
            quick += self._solved(other_order(self.frame)) + self._sway_alone()
            quick.sort(key=lambda w: w.score)
        if not self.slow and not (quick and quick[0].fits):
            # What whole sections and materials explain is found soonest, and then nothing is looked for near places.
            quick += self._fitted(large_families(self.frame))
            if not any(w.fits for w in quick):
                quick += self._solved(self._near_geometry()) + self._fitted(self._near_families())
        if self.slow:
            quick += self._by_first_order()
        quick.sort(key=lambda w: w.score)
        return quick

    def _fitted(self, families: Iterable[Family]) -> list[Weighed]:
        return [w for family in families if (w := self.fit(family)) is not None]

    def _by_first_order(self) -> list[Weighed]:
        """In second order: what explains the same differences from a frame of first order, the most likely solved again,
        and what has a number fitted anew."""
        seen = self.seen
        frame = replace(self.frame, analysis=replace(self.frame.analysis, order=1))
        base = prepared(frame)
        answer = base.answer(seen.names)
        said = seen.read(answer)
        inner = Sweep(replace(seen, frame=frame, said=said, value=said + seen.residual), self.closed, base, answer, True)
        ranked = [w.option for w in inner.singles() if w.option.change.frame is not None and w.option.claimed is None]
        ranked = list({(o.where, o.says): o for o in ranked}.values())
        # What softens a frame near its critical load does far more than first order foretells.
        places = {o.where for o in ranked[:SLOW_PLACES]}
        beside = [o for o in ranked[SLOW_FEW:] if o.where in places and not o.fitted][:SLOW_FEW]
        likeliest = {(o.where, o.says): o for o in [*kinds_by_reactions(seen), *ranked[:SLOW_FEW], *beside]}
        found = sorted(self._solved(likeliest.values()), key=lambda w: w.rough)
        if not any(w.fits for w in found):
            for w in found[:SLOW_FITS]:
                if w.option.again is not None:
                    at, p = w.option.again
                    better = self.fit(Family(at, (p, 1.1 * p), p > 0))
                    found += [better] if better is not None else []
        return found

    def _of_the_whole(self) -> list[Weighed]:
        """Mistakes that are of no one place."""
        found = nsmallest(MOST_KEPT, map(self.weigh, paste_options(self.seen)), key=lambda w: w.score)
        found += self._solved([*whole_options(self.frame), *temperature_options(self.frame)]) + self._other_cases()
        if not self.slow and not any(w.fits for w in found):
            found += self._fitted(large_families(self.frame))
        return sorted(found, key=lambda w: w.score)

    def _told(self, already: list[Weighed]) -> list[Weighed]:
        """Everything foretold; numbers are fitted only where nothing without one fits."""
        told = [w for o in self._foretellable() if (w := self.foretold(o)) is not None]
        if self.screen.partial or not any(w.fits and not w.option.fitted for w in (*already, *told)):
            told += [w for o in self._fits() if (w := self.foretold(o)) is not None]
        return told

    def _foretellable(self) -> Iterator[Option]:
        if not len(self.screen.rows):
            return
        with np.errstate(all="ignore"):
            yield from load_options(self.screen)
            yield from support_options(self.screen)
            yield from member_options(self.screen)
            yield from group_options(self.screen)
            yield from case_options(self.screen)

    def _fits(self) -> Iterator[Option]:
        """Options with a number that is fitted, foretold too."""
        if not len(self.screen.rows):
            return
        with np.errstate(all="ignore"):
            yield from support_fits(self.screen)
            yield from member_fits(self.screen)
            yield from group_fits(self.screen)

    def _other_cases(self) -> list[Weighed]:
        """Results of one case standing under the name of another."""
        seen, out = self.seen, []
        for k, name in enumerate(seen.names):
            for other in self.frame.names:
                if other == name:
                    continue
                names = tuple(other if n == name else n for n in seen.names)
                answer = self.answer_to(self.frame, (other,), True)
                if answer is None:
                    continue
                said = np.where(seen.case == k, seen.read(answer, names), seen.said)
                option = Option("load case", (), f"the results of {other} stand under {name}",
                                Change(claim=partial(of_case, case=name, other=other)), 0.2)  # fmt: skip
                if np.isfinite(said).all():
                    out.append(self.weigh(option, said))
        return out

    def _sway_alone(self) -> list[Weighed]:
        """Second-order effect of sway without the members' own: no idealisation of the frame file, so that the claim is
        what changes."""
        seen = self.seen
        if study(self.frame).undetermined.axial.any():
            return []
        with np.errstate(all="ignore"):
            answer = self.base.sway_answer(seen.names)
        said = None if answer is None else seen.read(answer)
        if answer is None or said is None or not np.isfinite(said).all():
            return []
        self.solved += 1
        effect = said - seen.said
        new = {v: float(a) for v, a in zip(seen.values, seen.value - effect, strict=True)}
        change = Change(claim=partial(with_values, new=new))
        says = SWAY_ALONE[self.frame.analysis.order]
        return [self.weigh(Option("idealisation", (), says, change, SWAY, answer=answer), said)]

    def _solved(self, options: Iterable[Option]) -> list[Weighed]:
        return [w for o in options if (w := self.solve(o)) is not None]

    def _near_geometry(self) -> Iterator[Option]:
        for option, joints, members in (*section_options(self.frame), *geometry_options(self.frame)):
            if self._promising(joints, members):
                yield option

    def _near_families(self) -> Iterator[Family]:
        for family in (*geometry_families(self.frame), *heavy_families(self.frame), *zone_families(self.frame)):
            if family.members is None or self._promising(family.joints or (), family.members):
                yield family

    def _promising(self, joints: tuple[int, ...], members: tuple[int, ...]) -> bool:
        """Whether anything at this place could leave little enough over."""
        if not len(self.screen.rows):
            return True
        key = (joints, members)
        if key not in self._least:
            self._least[key] = self.screen.place_left(joints, members)
        share = STAND_IN_SHARE if self.stand_in else MOST_SHARE
        return self._least[key] <= max(RIVALS * len(self.screen.rows), share * self.screen.total)

    # --- fitting one number by solving again ---

    def fit(self, family: Family) -> Weighed | None:
        """The best member of a family: a coarse look, then secant steps on the weighted residual."""
        tried = [(p, w) for p in family.starts if (w := self.solve(family.at(p))) is not None]
        if not tried:
            return None
        at = np.log if family.logarithmic else float
        back = (lambda q: float(np.exp(np.clip(q, -LARGEST, LARGEST)))) if family.logarithmic else float
        nil = self.weigh(Option("", (), "", family.at(family.starts[0]).change, 0.0))
        points = [(0.0, nil), *((float(at(p)), w) for p, w in tried)]
        points.sort(key=lambda pw: pw[1].rough)
        last = points[0]
        for turn in range(TURNS):
            step = self._secant(points, last)
            if step is None or (turn == 2 and points[0][1].rough > np.sqrt(PROMISE) * nil.rough):
                break
            found = self.solve(family.at(back(step)))
            if found is None:
                break
            last = (step, found)
            points.append(last)
            points.sort(key=lambda pw: pw[1].rough)
            if points[0][1].fits and points[0][1].rough < 1.0:
                break
        best_at, best = points[0]
        if best is nil:
            return None
        for digits in (2, 3, 4):
            number = float(f"{back(best_at):.{digits}g}")
            tidy = self.solve(family.at(number))
            # A rounder number must not cost the fit of a single value.
            if tidy is not None and (tidy.fits or (not best.fits and tidy.rough <= max(1.1 * best.rough, 0.75))):
                return replace(tidy, option=replace(tidy.option, again=(family.at, number)))
        return replace(best, option=replace(best.option, again=(family.at, back(best_at))))

    def _secant(self, points: list[tuple[float, Weighed]], last: tuple[float, Weighed]) -> float | None:
        """The next number by Gauss-Newton, with the slope from the best to the last where that was worse, else to the
        nearest."""
        a, one = points[0]
        b, two = min(points[1:], key=lambda pw: abs(pw[0] - a)) if last is points[0] else last
        if a == b:
            return None
        w = 1 / self.seen.noise
        slope = w * (two.said - one.said) / (b - a)
        size = float(slope @ slope)
        if not size > 0:
            return None
        step = float(slope @ (w * (one.claimed - one.said))) / size
        limit = 3 * max(abs(b - a), 1e-6)
        new = a + float(np.clip(step, -limit, limit))
        return None if abs(new - a) <= 1e-7 * max(abs(a), 1e-3) else new

    # --- pairs ---

    @property
    def pairwise(self) -> bool:
        """Whether pairs of mistakes are tried."""
        return not (self.slow or self.large)

    def pairs(self, singles: list[Weighed]) -> list[Weighed]:
        """Two mistakes together, begun from the singles that explain most."""
        if not self.pairwise:
            return []
        out = self._adding_up([w for w in singles if w.option.change.frame is not None and w.option.claimed is None])
        if any(w.fits for w in out):
            return out
        begin = sorted((w for w in singles if w.explains > 0.05), key=lambda w: w.rough)[:BEGIN]
        for one in begin:
            out += self._second(one)
            if any(w.fits for w in out):
                break
        return sorted(out, key=lambda w: w.score)

    def _adding_up(self, singles: list[Weighed]) -> list[Weighed]:
        """Pairs of mistakes of the frame whose effects add up to the difference, solved again, best first."""
        effects: list[Effect] = [(w.option, w.said - self.seen.said) for w in sorted(singles, key=lambda w: w.rough)]
        pairs = adding_up(effects, self.seen.residual, self.seen.allowed)
        return sorted(self.both(islice(pairs, PAIRS)), key=lambda w: w.score)

    def both(self, pairs: Iterable[tuple[Option, Option]]) -> Iterator[Weighed]:
        """Pairs solved; none where the first takes away what the second is a mistake of."""
        for pair in pairs:
            try:
                found = self.solve(paired(*pair))
            except (KeyError, IndexError, ValueError, UnusableInput):
                continue
            if found is not None:
                yield found

    def _second(self, one: Weighed) -> Iterator[Weighed]:
        option = one.option
        changed, claim = option.change.apply(self.frame, self.closed)
        seen = replace(self.seen, frame=changed, said=one.said, value=one.claimed)
        if changed.members.keys() != self.frame.members.keys() or changed.joints.keys() != self.frame.joints.keys():
            return
        try:
            base = prepared(changed)
        except ArithmeticError:
            return
        inner = Sweep(seen, claim, base, base.answer(seen.names))
        with np.errstate(all="ignore"):
            best = inner.cheap_singles()
        for two in best[:8]:
            if same_place(option, two.option):
                continue
            if not all(self._known(where) for where in two.option.where):
                continue
            # With a delta, so that it is confirmed by solving before it is told.
            both = replace(paired(option, two.option), claimed=two.claimed, delta=two.said - self.seen.said)
            yield self.weigh(both, two.said)

    def _known(self, where: str) -> bool:
        """Whether a place is one of the frame as stated, and not a section made for the first mistake."""
        made = (f"{m.section} of {m.name}" for m in self.frame.members.values())
        return where in self.frame.sections or where not in made

    def cheap_singles(self) -> list[Weighed]:
        """Singles without the searches that solve again many times."""
        found = [self.weigh(o) for o in paste_options(self.seen)]
        found += self._told(found)
        found.sort(key=lambda w: w.score)
        if found and found[0].fits:
            return found
        found += self._solved(whole_options(self.frame))
        return sorted(found, key=lambda w: w.score)


BEGIN, PAIRS = 6, 40
"""Singles for each of which a second is looked for; pairs whose effects add up that are solved again."""


def _without_missing(seen: Observation, answer: Answer, changed: Frame, names: tuple[str, ...]) -> Floats:
    """Values of a frame that lacks a member: what the claim says of that member stays as it was."""
    p = seen.places
    old = list(seen.frame.members)
    position = np.array([changed.member_index.get(n, -1) for n in old])
    gone = (p.member >= 0) & (position[np.maximum(p.member, 0)] < 0)
    moved = replace(p, member=np.where(p.member >= 0, position[np.maximum(p.member, 0)], -1))
    keep = np.flatnonzero(~gone)
    if not len(keep):
        return seen.said.copy()
    part = Observation(
        changed, seen.names, tuple(seen.values[k] for k in keep), seen.case[keep],
        replace(moved, **{f: getattr(moved, f)[keep] for f in ("kind", "column", "member", "end", "joint", "x", "side")}),
        seen.extreme[keep], seen.value[keep], seen.said[keep], seen.half[keep], seen.allowed[keep], stations(changed),
    )  # fmt: skip
    out = np.zeros(len(seen.value))
    out[keep] = part.read(answer, names)
    return out
