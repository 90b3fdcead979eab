"""A claim against the opinions: every value that it gives, in the frame's own units and signs."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass, field, replace

import numpy as np

from crosscheck.answer import Answer
from crosscheck.compare.claimed import ClaimedValue, ClosedClaim
from crosscheck.compare.differences import Difference, Place, Verdict, worst_first
from crosscheck.compare.opinions import CaseJudgement, extremes
from crosscheck.compare.tolerance import COARSE, KIND, LEAST_SHARE, Scales, Tolerance, allowed
from crosscheck.frame.model import Floats, Frame
from crosscheck.frame.stations import Stations, stations

END_COLUMN = {"axial": 0, "shear": 1, "moment": 2, "across": 3}
JOINT_COLUMN = {"dx": 0, "dy": 1, "rotation": 2}
REACTION_COLUMN = {"fx": 0, "fy": 1, "moment": 2}
ZERO = 1e-6
"""Share of the case's scale within which a reaction at a joint without support counts as zero beside its rounding."""


@dataclass(frozen=True, slots=True)
class Enveloped:
    """A claimed value of an envelope beside what one opinion says at its place in each of the cases; allowed: the
    difference that is."""

    value: ClaimedValue
    said: Mapping[str, float]
    allowed: float

    @property
    def governing(self) -> str:
        """The case of the opinion's extreme, the first of equals."""
        return self._extreme(frozenset())[0]

    def apart(self, without: frozenset[str]) -> float:
        """How far the claim is from the extreme over all cases but these (over all where none is left)."""
        said = self._extreme(without)[1]
        size = self.value.extreme == "size"
        return abs(abs(self.value.value) - abs(said)) if size else abs(self.value.value - said)

    def _extreme(self, without: frozenset[str]) -> tuple[str, float]:
        left = {n: x for n, x in self.said.items() if n not in without} or self.said
        sign = {"max": 1.0, "min": -1.0}.get(self.value.extreme or "")
        return max(left.items(), key=lambda item: abs(item[1]) if sign is None else sign * item[1])


@dataclass(frozen=True, slots=True)
class CaseClaim:
    """The claim on one case.

    compared: values judged; of: values that the case has (end actions, displacements and reactions that are determined)
    and any others that the claim gives; by_floor: those that agree only because of the floor.
    not_compared: values left out, each with why. enveloped: of an envelope, the values compared, case by case.
    """

    case: str
    verdict: Verdict
    differences: tuple[Difference, ...]
    compared: int
    of: int
    by_floor: int
    not_compared: tuple[tuple[ClaimedValue, str], ...] = ()
    enveloped: tuple[Enveloped, ...] = ()


@dataclass(frozen=True, slots=True)
class _Known:
    """What one opinion gives for a case, ready to be looked up."""

    ends: Floats
    joints: Floats
    reactions: Floats
    extremes: Floats


@dataclass(slots=True)
class _Tally:
    differences: list[Difference] = field(default_factory=list)
    compared: int = 0
    by_floor: int = 0
    left: list[tuple[ClaimedValue, str]] = field(default_factory=list)
    enveloped: list[Enveloped] = field(default_factory=list)


class ClaimComparison:
    """Compares a closed claim with the opinions' answers; `judgements` by case supply the scales."""

    def __init__(
        self, frame: Frame, answers: Mapping[str, Answer], judgements: Mapping[str, CaseJudgement], tolerance: Tolerance
    ) -> None:
        self.frame, self.answers, self.judgements, self.tolerance = frame, answers, judgements, tolerance
        self._stations: Stations | None = None

    def judge(self, closed: ClosedClaim) -> list[CaseClaim]:
        """One judgement a case that the claim speaks of, in the claim's order of cases."""
        by_case: dict[str, list[ClaimedValue]] = {case: [] for case in closed.cases}
        for value in closed.values:
            by_case.setdefault(value.beside or value.case, []).append(value)
        return [self._judge(case, values) for case, values in by_case.items()]

    def _judge(self, case: str, values: list[ClaimedValue]) -> CaseClaim:
        parts = self.frame.meant(case) or (case,)
        answers = {o: a for o, a in self.answers.items() if all(n in a.cases for n in parts)}
        tally = _Tally()
        if answers:
            known = {n: {o: self._known(a, n) for o, a in answers.items()} for n in parts}
            found = {n: self._references(answers, known[n], n, values) for n in parts}
            for k, value in enumerate(values):
                mine = parts if value.case == case else (value.case,)
                if mine[0] not in known:
                    tally.left.append((value, f"{value.case} is not of {case}"))
                    continue
                by_part = {n: {o: r[k] for o, r in found[n].items()} for n in mine}
                self._one(value, by_part, {n: next(iter(known[n].values())) for n in mine}, tally)
        else:
            silent = "this case" if len(parts) == 1 else "all that it stands for"
            tally.left = [(v, f"no opinion speaks for {silent}") for v in values]
        verdict: Verdict = "disagree" if tally.differences else "agree" if tally.compared else "undecided"
        beyond = sum(1 for v in values if v.kind in ("span", "extreme") or v.beside)
        return CaseClaim(
            case, verdict, tuple(worst_first(tally.differences)), tally.compared,
            self._whole(case) * (2 if case in self.frame.several else 1) + beyond,
            tally.by_floor, tuple(tally.left), tuple(tally.enveloped),
        )  # fmt: skip

    def _whole(self, case: str) -> int:
        """How many values the case has: end actions, displacements and reactions that are determined (an envelope has a
        greatest and a least one of each)."""
        none = next(iter(self.answers.values())).undetermined
        supported = [self.frame.joint_index[name] for name in self.frame.supports]
        return (
            6 * len(self.frame.members) - 2 * int(none.axial.sum())
            + 3 * len(self.frame.joints) - int(none.joints.sum())
            + 3 * len(supported) - int(none.reactions[supported].sum())
        )  # fmt: skip

    def _known(self, answer: Answer, case: str) -> _Known:
        c = answer.cases[case]
        if self._stations is None:
            self._stations = stations(self.frame)
        return _Known(c.ends, c.joints, c.reactions, extremes(answer, case, self._stations))

    # --- what the opinions say at the claim's places ---

    def _references(
        self, answers: Mapping[str, Answer], known: Mapping[str, _Known], case: str, values: list[ClaimedValue]
    ) -> dict[str, list[tuple[float, ...]]]:
        """By opinion, for each claimed value, what the opinion says there: one number, or both sides of a jump."""
        return {
            o: [self._lookup(v, known[o], spans) for v, spans in zip(values, self._spans(a, case, values), strict=True)]
            for o, a in answers.items()
        }

    def _spans(self, answer: Answer, case: str, values: list[ClaimedValue]) -> list[tuple[float, ...]]:
        """Both sides' values for "span" values, empty for others; asked for in one go."""
        rows = [k for k, v in enumerate(values) if v.kind == "span"]
        out: list[tuple[float, ...]] = [()] * len(values)
        if not rows:
            return out
        member = np.array([self.frame.member_index[str(values[k].member)] for k in rows])
        x = np.array([values[k].at for k in rows], dtype=float)
        column = np.array([END_COLUMN[values[k].quantity] for k in rows])
        sides = [answer.spans.along(case, member, x, np.full(len(x), side)) for side in (-1, 1)]
        for n, k in enumerate(rows):
            out[k] = (float(sides[0][n, column[n]]), float(sides[1][n, column[n]]))
        return out

    def _lookup(self, v: ClaimedValue, known: _Known, spans: tuple[float, ...]) -> tuple[float, ...]:
        if v.kind == "span":
            return spans
        if v.kind == "end":
            m = self.frame.member_index[str(v.member)]
            end = 0 if self.frame.members[str(v.member)].joint_from == v.joint else 1
            return (float(known.ends[m, end, END_COLUMN[v.quantity]]),)
        if v.kind == "reaction":
            return (float(known.reactions[self.frame.joint_index[str(v.joint)], REACTION_COLUMN[v.quantity]]),)
        if v.kind == "displacement":
            return (float(known.joints[self.frame.joint_index[str(v.joint)], JOINT_COLUMN[v.quantity]]),)
        return (self._extreme(v, known),)

    def _extreme(self, v: ClaimedValue, known: _Known) -> float:
        if v.quantity in JOINT_COLUMN:
            rows = slice(None) if v.joint is None else [self.frame.joint_index[v.joint]]
            values = known.joints[rows, JOINT_COLUMN[v.quantity]]
        elif v.quantity in ("fx", "fy") or v.joint is not None:
            rows = slice(None) if v.joint is None else [self.frame.joint_index[v.joint]]
            values = known.reactions[rows, REACTION_COLUMN[v.quantity]]
        else:
            rows = slice(None) if v.member is None else [self.frame.member_index[v.member]]
            values = known.extremes[rows, :, END_COLUMN[v.quantity]].ravel()
        values = values[np.isfinite(values)]
        if len(values) == 0:
            return float("nan")
        if v.extreme == "size":
            return float(values[np.argmax(np.abs(values))])
        return float(values.max() if v.extreme == "max" else values.min())

    # --- judging one value ---

    def _one(
        self, v: ClaimedValue, by_part: Mapping[str, Mapping[str, tuple[float, ...]]], known: Mapping[str, _Known],
        tally: _Tally,
    ) -> None:  # fmt: skip
        """by_part: by case (several where v is an envelope's) and opinion what is said at its place; known: one opinion's
        whole answer by case, for the scales."""
        said = over_cases(v.extreme, [*by_part.values()])
        nearest = {o: _nearest(v, r) for o, r in said.items()}
        given = {o: r for o, r in nearest.items() if np.isfinite(r)}
        if not given:
            tally.left.append((v, "undetermined in this idealisation"))
            return
        unsupported = v.kind == "reaction" and v.joint not in self.frame.supports
        scales = {n: self.judgements[n].scales for n in by_part}
        scale = max(s.of(v.quantity) if unsupported else self._scale(v, known[n], s) for n, s in scales.items())
        reference = next(iter(given.values()))
        claimed = abs(v.value) if v.extreme == "size" else v.value
        reference = abs(reference) if v.extreme == "size" else reference
        apart = abs(claimed - reference)
        if unsupported:
            may = max(v.half_digit, ZERO * scale)
        else:
            may = float(allowed(claimed, reference, self.tolerance, scale, v.half_digit))
            # A whole digit off, no coarse printing explains: that much can be judged, and is never passed over in silence.
            if v.half_digit > COARSE * scale and apart <= max(may, 2 * v.half_digit):
                tally.left.append((v, "printed too coarsely to judge"))
                return
        tally.compared += 1
        if v.case in self.frame.several:
            opinion = next(iter(given))
            there = {n: x for n, said in by_part.items() if np.isfinite(x := _nearest(v, said[opinion]))}
            tally.enveloped.append(Enveloped(v, there, may))
        if apart <= may and v.governs and (other := self._other_governs(v, by_part, may)):
            tally.differences.append(other)
        elif apart <= may:
            relative = max(self.tolerance.relative * max(abs(claimed), abs(reference)), v.half_digit)
            tally.by_floor += int(apart > relative)
        if apart <= may:
            return
        values: dict[str, float | None] = {o: (r if np.isfinite(r) else None) for o, r in nearest.items()}
        values["claim"] = v.value
        note = "no support here, so nothing can react" if unsupported else ""
        if v.kind == "extreme" and v.extreme == "size" and len(known) == 1:
            note = self._of_other_sign(v, next(iter(known.values())), scale)
        tally.differences.append(
            Difference(_place(v), values, apart, may, abs(claimed) < abs(reference), note, v.line)
        )

    def _other_governs(
        self, v: ClaimedValue, by_part: Mapping[str, Mapping[str, tuple[float, ...]]], may: float
    ) -> Difference | None:
        """A difference where what the claim says governs does not have this value there, or is not of the envelope."""
        named = self.frame.meant(v.governs)
        opinion = next(iter(next(iter(by_part.values()))))
        there = {n: _nearest(v, said[opinion]) for n, said in by_part.items()}
        size = abs if v.extreme == "size" else float
        off = {n: abs(size(x) - size(v.value)) for n, x in there.items() if np.isfinite(x)}
        inside = [n for n in named if n in off]
        if any(off[n] <= may for n in inside):
            return None
        governs = ", ".join(n for n in off if off[n] <= may)
        note = f"governs by the claim: {v.governs}{'' if inside else f', which is not in {v.case}'}; by us: {governs}"
        best = min(inside, key=off.__getitem__, default=None)
        values: dict[str, float | None] = {opinion: there[best] if best else None, "claim": v.value}
        return Difference(_place(v), values, off[best] if best else 0.0, may, False, note, v.line)

    def _of_other_sign(self, v: ClaimedValue, known: _Known, scale: float) -> str:
        """What to say where the claimed size is that of the largest value of the other sign."""
        ends = [self._extreme(replace(v, extreme="max"), known), self._extreme(replace(v, extreme="min"), known)]
        other, claimed = min(map(abs, ends)), abs(v.value)
        if ends[0] * ends[1] < 0 and abs(claimed - other) <= float(
            allowed(claimed, other, self.tolerance, scale, v.half_digit)
        ):
            words = {"moment": 'say "sagging" or "hogging"', "axial": 'say "tension" or "compression"'}.get(v.quantity)
            return f"the size of the largest with the other sign{f'; {words} if that is meant' if words else ''}"
        return ""

    def _scale(self, v: ClaimedValue, known: _Known, scales: Scales) -> float:
        """The member's or joint's own largest value of the quantity, but no less than a share of the case's scale."""
        least = LEAST_SHARE * scales.of(v.quantity)
        if v.kind in ("end", "span") or (v.kind == "extreme" and v.member is not None):
            own = known.extremes[self.frame.member_index[str(v.member)], :, END_COLUMN[v.quantity]]
            ends = known.ends[self.frame.member_index[str(v.member)]][:, min(END_COLUMN[v.quantity], 2)]
            own = own if v.quantity == "across" else np.concatenate([own, ends])
        elif v.joint is not None:
            reacts = KIND[v.quantity] in ("forces", "moments")
            table = known.reactions if reacts else known.joints
            columns = (0, 1) if KIND[v.quantity] in ("forces", "displacements") else (2,)
            own = table[self.frame.joint_index[v.joint], columns]
        else:
            own = np.array([self._extreme(v, known)])
        return max(_largest(own), least)


def over_cases(extreme: str | None, said: list[Mapping[str, tuple[float, ...]]]) -> dict[str, tuple[float, ...]]:
    """By opinion, the greatest ("max"), least ("min") or largest of what several cases say, on each side of a jump."""
    if len(said) == 1:
        return dict(said[0])
    pick = {"max": max, "min": min}.get(extreme or "", lambda values: max(values, key=abs))
    out: dict[str, tuple[float, ...]] = {}
    for opinion in said[0]:
        sides = zip(*(s[opinion] for s in said), strict=True)
        finite = [[x for x in side if np.isfinite(x)] for side in sides]
        out[opinion] = tuple(pick(side) if side else float("nan") for side in finite)
    return out


def _largest(values: Floats) -> float:
    finite = values[np.isfinite(values)]
    return float(np.abs(finite).max(initial=0.0))


def _nearest(v: ClaimedValue, said: Iterable[float]) -> float:
    """The opinion's value at the claim's place; at a jump the side that the claim is nearer to."""
    finite = [r for r in said if np.isfinite(r)]
    return min(finite, key=lambda r: abs(r - v.value), default=float("nan"))


def _place(v: ClaimedValue) -> Place:
    of = {"end": "member_ends", "span": "spans", "reaction": "reactions", "displacement": "joints"}
    extreme = v.extreme if v.kind != "extreme" and v.extreme in ("max", "min") else ""
    return Place(v.case, of.get(v.kind, "extremes"), v.quantity, v.member, v.joint, v.at, extreme)  # type: ignore[arg-type]
