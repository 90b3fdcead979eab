"""The sweep over a frame whose cases and combinations differ in stiffness, in order or in what works, or that has what no
low-rank change foretells.

Everything is judged by solving again, each case or combination in its own state and order, without superposition. Mistakes
of the week's grammar are few and all tried. For all others a frame of one stiffness and first order stands in, that of
the situation which is furthest off: it foretells the same differences, and the likeliest of what it names are solved again.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import replace
from functools import partial
from itertools import islice

import numpy as np

from crosscheck.answer import Answer, Silent, joined
from crosscheck.compare.claimed import ClosedClaim
from crosscheck.frame.kinematics import study
from crosscheck.frame.model import Floats, Frame, Ints
from crosscheck.opinions import slope_deflection
from crosscheck.opinions.slope_deflection.prepared import prepared, working_frame
from crosscheck.problems import UnusableInput
from crosscheck.suspects.adjusted import adjusted
from crosscheck.suspects.changes import Change, of_case, usable
from crosscheck.suspects.observation import Observation
from crosscheck.suspects.pairs import Effect, adding_up, paired, same_place
from crosscheck.suspects.paste import paste_options
from crosscheck.suspects.supports import kinds_by_reactions
from crosscheck.suspects.suspect import Family, Option
from crosscheck.suspects.sweep import Sweep, Weighed
from crosscheck.suspects.week import week_families, week_options
from crosscheck.suspects.whole import other_order, temperature_options, whole_options

LIKELIEST, FITS = 40, 4
"""Options of the stand-in that are solved again, and how many of them have their number fitted anew."""
MOST, MOST_SLOW, MOST_LARGE = 240, 80, 40
"""Mistakes of the week's grammar that are tried; where a claimed combination is of second order; and in large frames."""
NUMBERS = 12
"""Factors of states, and leans, fitted."""
LIKELIEST_SLOW, FITS_SLOW = 20, 2
"""The same where a claimed combination is of second order."""
PAIRS, PAIRS_SLOW = 80, 40
"""Pairs of mistakes that are solved again, likeliest by the sum of what each does alone; and in second order."""
BEGIN, BEGIN_ONE_WAY = (4, 4, 6), (2, 2, 3)
"""First mistakes for each of which a second is looked for in the frame that has it: of the likeliest pairs, of those that
explain most alone, of the commonest; and where parts work one way only, each solution a search of its own."""


class SituationsSweep(Sweep):
    """As a Sweep, without a matrix factorised once: there is no one matrix."""

    def __init__(
        self, seen: Observation, closed: ClosedClaim, answer: Answer, over: Mapping[int, tuple[str, ...]],
        explained: bool = False,
    ) -> None:  # fmt: skip
        """over: the names that a value is the extreme of, by the value's id. explained: to try few."""
        self.explained = explained
        self.closed, self.answer, self.stand_in = closed, answer, False
        self.frame = seen.frame
        self.solved = 0
        self.results = {}
        self._foretold: list[Effect] = []
        self._over: dict[tuple[str, ...], Ints] = {}
        for names in dict.fromkeys(over.values()):
            self._over[names] = np.flatnonzero([over.get(id(v)) == names for v in seen.values])
        self.seen = seen
        if over:
            size = np.array([v.extreme == "size" for v in seen.values])
            value = np.where(size, np.abs(seen.value), seen.value)
            self.seen = replace(seen, said=self._read(answer, seen.frame, self.names), value=value)

    @property
    def names(self) -> tuple[str, ...]:
        """With all those of which some value is the extreme."""
        return tuple(dict.fromkeys((*self.seen.names, *(n for names in self._over for n in names))))

    @property
    def slow(self) -> bool:
        return any(self.frame.under(name).analysis.order == 2 for name in self.names)

    def _read(self, answer: Answer, changed: Frame, names: tuple[str, ...]) -> Floats:
        """The values, those of envelopes as extremes over all that they are of."""
        own = self.seen.names
        if not self._over or changed.members.keys() != self.frame.members.keys():
            return super()._read(answer, changed, own)
        out = self.seen.read(answer, own)
        for several, rows in self._over.items():
            stack = np.stack([self.seen.read(answer, (n,) * len(own), rows)[rows] for n in several])
            out[rows] = [
                _extreme(column, self.seen.values[k].extreme) for column, k in zip(stack.T, rows.tolist(), strict=True)
            ]
        return out

    # --- solving

    def answer_to(self, changed: Frame, names: Sequence[str], loads_only: bool) -> Answer | None:
        """The changed frame's results, each name in its own situation; None where one has none."""
        self.solved += 1
        groups: dict[int, tuple[Frame, list[str]]] = {}
        for name in names:
            plain = changed.under(name)
            groups.setdefault(id(plain), (plain, []))[1].append(name)
        parts: list[tuple[tuple[str, ...], Answer | Silent]] = []
        with np.errstate(all="ignore"):
            for plain, group in groups.values():
                part = _solved(plain, tuple(group))
                if part is None:
                    return None
                parts.append((tuple(group), part))
        whole = joined(parts)
        return whole if isinstance(whole, Answer) else None

    # --- gathering

    def singles(self) -> list[Weighed]:
        """Every single mistake worth telling, best first."""
        found = [self.weigh(o) for o in paste_options(self.seen)]
        found += self._solved(self._of_the_week())
        found += [] if self._over else self._other_cases()
        if self.explained:
            return sorted(found, key=lambda w: w.score)
        if not any(w.fits for w in found):
            # What is common to every frame costs more to try.
            found += self._solved([*whole_options(self.frame), *temperature_options(self.frame)])
            found += [] if self.frame.one_way or self._over else list(adjusted(self))
            found += self._solved(other_order(self.frame))
        if not any(w.fits for w in found):
            found += self._fitted(islice(week_families(self.frame, self.names), NUMBERS))
        if not any(w.fits for w in found):
            found += self._by_stand_in()
        return sorted(found, key=lambda w: w.score)

    def _of_the_week(self) -> list[Option]:
        """The commonest mistakes of the week's grammar, as many as there is time for."""
        options = sorted(week_options(self.frame, self.names, not self._over), key=lambda o: o.cost)
        return options[: MOST_LARGE if self.large else MOST_SLOW if self.slow else MOST]

    def _other_cases(self) -> list[Weighed]:
        """Results of one case standing under the name of another: all are at hand."""
        seen, out = self.seen, []
        for k, name in enumerate(seen.names):
            rows = np.flatnonzero(seen.case == k)
            for other in self.frame.names:
                if other == name or other not in self.answer.cases:
                    continue
                said = seen.said.copy()
                names = tuple(other if n == name else n for n in seen.names)
                said[rows] = seen.read(self.answer, names, rows)[rows]
                change = Change(claim=partial(of_case, case=name, other=other))
                option = Option("load case", (), f"the results of {other} stand under {name}", change, 0.2)
                if np.isfinite(said).all():
                    out.append(self.weigh(option, said))
        return out

    # --- one frame that stands in for all

    def _by_stand_in(self, fitting: bool = True) -> list[Weighed]:
        """What explains the same differences from a frame of one stiffness and first order, solved again."""
        name = self._furthest()
        frame, names = self._first_order(name)
        inner = self._stand_in(frame, names, True)
        as_claimed = self._working_as_claimed(frame, name) if self.frame.one_way else frame
        if (as_claimed.out_members, as_claimed.out_supports) != (frame.out_members, frame.out_supports):
            inner = self._stand_in(as_claimed, names, False) or inner
        if inner is None:
            return []
        with np.errstate(all="ignore"):
            every = inner.singles() if fitting else inner.cheap_singles()
            ranked = [w for w in every if w.option.change.frame is not None and w.option.claimed is None]
        alone = {(w.option.where, w.option.says): (replace(w.option, delta=None), w.said - inner.seen.said) for w in ranked}
        distinct = {key: option for key, (option, _) in alone.items()}
        if len(inner.seen.value) == len(self.seen.value):
            self._foretold = list(alone.values())
        likeliest, fits = (LIKELIEST_SLOW, FITS_SLOW) if self.slow else (LIKELIEST, FITS)
        chosen = [*(kinds_by_reactions(self.seen) if self.slow else ()), *islice(distinct.values(), likeliest)]
        found = sorted(self._solved({(o.where, o.says): o for o in chosen}.values()), key=lambda w: w.rough)
        for w in [] if any(w.fits for w in found) or not fitting else found[:fits]:
            found += self._fitted_again(w)
        return found

    def _fitted_again(self, w: Weighed) -> Iterator[Weighed]:
        if w.option.again is not None:
            at, p = w.option.again
            better = self.fit(Family(at, (p, 1.1 * p), p > 0))
            if better is not None:
                yield better

    def _stand_in(self, frame: Frame, names: tuple[str, ...], same: bool) -> Sweep | None:
        """A sweep over the claim's part of these names, in a frame of first order that stands in for them; None where that
        frame can move. same: whether the frame is ours but for effects of second order, so that it has to explain how far
        the claim is from our results; else it has to explain the claim."""
        index = {n: k for k, n in enumerate(names)}
        rows = np.flatnonzero([self.seen.names[k] in index for k in self.seen.case])
        case = np.array([index[self.seen.names[k]] for k in self.seen.case[rows]], dtype=np.int64)
        try:
            base = prepared(frame)
            answer = base.answer(names)
        except (ArithmeticError, np.linalg.LinAlgError, UnusableInput):
            return None
        part = _part(self.seen, frame, names, rows, case)
        said = part.read(answer)
        good = np.isfinite(said)
        part = replace(part, said=said, value=said + part.residual if same else part.value)
        return Sweep(part, self.closed, base, answer, True) if good.all() and len(rows) else None

    def _working_as_claimed(self, frame: Frame, name: str) -> Frame:
        """The frame with those one-way parts out that the claim gives no force in, as far as it gives any."""
        members, supports = set(frame.out_members), set(frame.out_supports)
        for v in self.seen.values:
            if v.case != name:
                continue
            if v.kind == "end" and v.quantity == "axial" and (only := _only(frame, v.member)):
                works = (v.value if only == "tension" else -v.value) > v.half_digit
                (members.discard if works else members.add)(str(v.member))
            if v.kind == "reaction" and v.quantity in ("fx", "fy") and v.joint in frame.supports:
                s, axis = frame.supports[v.joint], v.quantity[1]
                only = getattr(s, f"{axis}_only")
                if only and s.angle == 0.0:
                    works = (v.value if only == "push" else -v.value) > v.half_digit
                    (supports.discard if works else supports.add)((v.joint, axis))
        return replace(frame, out_members=frozenset(members), out_supports=frozenset(supports))

    def _furthest(self) -> str:
        """The claimed name whose values are furthest off in all, in units of tolerance."""
        off = (self.seen.residual / self.seen.allowed) ** 2
        total = np.bincount(self.seen.case, weights=off, minlength=len(self.seen.names))
        return self.seen.names[int(np.argmax(total))]

    def _first_order(self, name: str) -> tuple[Frame, tuple[str, ...]]:
        """The frame that stands in for the situation of a name, and the claimed names that are in the same one."""
        plain = self.frame.under(name)
        same = tuple(n for n in self.seen.names if self.frame.under(n) is plain)
        first = plain if plain.analysis.order == 1 else replace(plain, analysis=replace(plain.analysis, order=1))
        return (working_frame(first, name), (name,)) if self.frame.one_way else (first, same)

    # --- pairs

    @property
    def pairwise(self) -> bool:
        return not (self.large or self._over)

    def pairs(self, singles: list[Weighed]) -> list[Weighed]:
        """Two mistakes together: those whose effects add up best to the difference, solved again; then what is second in a
        frame that has the first, for the likeliest of these."""
        if not self.pairwise:
            return []
        own = sorted(filter(_of_the_frame, singles), key=lambda w: w.rough)
        found = [*((w.option, w.said - self.seen.said) for w in own), *self._foretold]
        alone = list({(o.where, o.says): (o, delta) for o, delta in reversed(found)}.values())[::-1]
        likeliest = list(adding_up(alone, self.seen.residual, self.seen.allowed))
        if not likeliest:
            return []
        out = list(self.both(likeliest[: PAIRS_SLOW if self.slow else PAIRS]))
        for one in self._beginnings([o for pair in likeliest for o in pair], [w.option for w in own]):
            if any(w.fits for w in out):
                break
            out += self._seconds(one)
        return sorted(out, key=lambda w: w.score)

    def _beginnings(self, of_pairs: list[Option], alone: list[Option]) -> list[Option]:
        """First mistakes that leave all in first order."""
        chosen: dict[int, Option] = {}
        rankings = (of_pairs, alone, sorted(alone, key=lambda o: o.cost))
        for some, few in zip(rankings, BEGIN_ONE_WAY if self.frame.one_way else BEGIN, strict=True):
            quick = (o for o in dict.fromkeys(some) if id(o) not in chosen and self._first_order_after(o))
            chosen.update((id(o), o) for o in islice(quick, few))
        return list(chosen.values())

    def _first_order_after(self, one: Option) -> bool:
        assert one.change.frame is not None
        changed = one.change.frame(self.frame)
        return all(changed.under(name).analysis.order == 1 for name in self.names)

    def _seconds(self, one: Option) -> Iterator[Weighed]:
        """What explains the rest in the frame that has the first mistake."""
        changed, claim = one.change.apply(self.frame, self.closed)
        answer = self.answer_to(changed, self.names, False)
        if answer is None or changed.members.keys() != self.frame.members.keys():
            return
        said = self.seen.read(answer)
        if not np.isfinite(said).all():
            return
        inner = SituationsSweep(replace(self.seen, frame=changed, said=said), claim, answer, {})
        for two in inner.seconds():
            if not same_place(one, two.option):
                yield self.weigh(paired(one, two.option), two.said)

    def seconds(self) -> list[Weighed]:
        """Singles of the frame without the searches that fit a number."""
        found = self._solved(self._of_the_week())
        if not any(w.fits for w in found):
            found += self._by_stand_in(False)
        return sorted(filter(_of_the_frame, found), key=lambda w: w.rough)[:8]


def _of_the_frame(w: Weighed) -> bool:
    """Whether the mistake is in the frame alone, and has no number fitted to the whole difference."""
    o = w.option
    return o.change.frame is not None and o.claimed is None and o.half is None and not o.fitted


def _only(frame: Frame, member: str | None) -> str:
    """The one sense in which a member works; "" where it works in both, or is none of the frame's."""
    return frame.members[member].only if member in frame.members else ""


def _extreme(values: Floats, which: str | None) -> float:
    if which == "size":
        return float(np.abs(values).max())
    return float(values.max() if which == "max" else values.min())


def _part(seen: Observation, frame: Frame, names: tuple[str, ...], rows: Ints, case: Ints) -> Observation:
    """Some rows of an observation, of other names and of a frame that stands in."""
    return Observation(
        frame, names, tuple(seen.values[k] for k in rows.tolist()), case, seen.part(rows), seen.extreme[rows],
        seen.value[rows], seen.said[rows], seen.half[rows], seen.allowed[rows], seen.at,
    )  # fmt: skip


def _solved(plain: Frame, names: tuple[str, ...]) -> Answer | None:
    """Results of a frame in one situation; None where it can move, lacks a number or has none for some name."""
    try:
        if not usable(plain):
            return None
        if plain.analysis.order == 1 and not plain.one_way:
            return prepared(plain).answer(names, deflections=True)
        answer = slope_deflection.opine(plain, study(plain), names)
    except (ArithmeticError, np.linalg.LinAlgError, RuntimeError, UnusableInput):
        return None
    return answer if isinstance(answer, Answer) and all(n in answer.cases for n in names) else None
