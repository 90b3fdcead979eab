"""Suspects for a claim that differs, best first, with what ties with what and what would tell ties apart."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from crosscheck.answer import Answer
from crosscheck.compare.claim import CaseClaim
from crosscheck.compare.claimed import ClosedClaim
from crosscheck.compare.tolerance import Tolerance
from crosscheck.frame.kinematics import study
from crosscheck.frame.model import Frame
from crosscheck.opinions.slope_deflection.prepared import prepared
from crosscheck.problems import UnusableInput
from crosscheck.suspects.observation import observe
from crosscheck.suspects.situations import SituationsSweep
from crosscheck.suspects.suspect import Option, Suspect
from crosscheck.suspects.sweep import PLACES_UP_TO, Sweep, Weighed
from crosscheck.suspects.week import has_week

if TYPE_CHECKING:
    from crosscheck.check import Opinions

EXPLAINS_ENOUGH = 0.9
"""A change that removes less of the difference than this, and leaves values beyond tolerance, is no suspect."""
NEAR = 4.0
"""How much worse in score than the first a suspect may be and still be named."""
LIMIT = 10
"""Most suspects named."""
MOST_TIES = 5
NOTHING_EXPLAINS = "nothing tried, alone or in pairs, explains the difference; start from statics and compatibility"
NOTHING_ALONE = (
    "nothing tried explains the difference; pairs of mistakes are not tried in frames of second order, nor for envelopes: "
    "start from statics and compatibility"
)
PLACES_NOT_TRIED = (
    f"no mistake of the paste, of a section or material, or of the whole frame explains the difference; in a frame of more "
    f"than {PLACES_UP_TO} members its single members, joints and loads are not tried: start from statics"
)


@dataclass(frozen=True, slots=True)
class Findings:
    """suspects: best first. why: one sentence where there are none. solved: frames solved again to find them."""

    suspects: tuple[Suspect, ...]
    why: str = ""
    solved: int = 0


def find(
    frame: Frame,
    opinions: Opinions,
    closed: ClosedClaim,
    claims: Sequence[CaseClaim],
    tolerance: Tolerance,
    limit: int = LIMIT,
) -> tuple[Suspect, ...]:
    """The suspects alone; see search()."""
    return search(frame, opinions, closed, claims, tolerance, limit).suspects


def search(
    frame: Frame,
    opinions: Opinions,
    closed: ClosedClaim,
    claims: Sequence[CaseClaim],
    tolerance: Tolerance,
    limit: int = LIMIT,
    over: Mapping[int, tuple[str, ...]] | None = None,
    explained: bool = False,
) -> Findings:
    """Suspects for a claim on whose values the verdict is disagree.

    over: of values that are the extreme of several cases and combinations, by id, these names; such a value stands in the
    claim under the one that governs it. explained: whether something explains them already, so that only the commonest
    mistakes are tried, for what explains them as well.
    """
    answer = _spokesman(opinions)
    if answer is None:
        return Findings((), "no opinion gives what could be compared")
    names = tuple(c.case for c in claims if c.case in answer.cases and c.compared)
    left = {id(v) for c in claims for v, _ in c.not_compared}
    seen = observe(
        frame,
        answer,
        names,
        [v for v in closed.values if id(v) not in left],
        tolerance,
        {n: opinions.judgements[n].scales for n in names},
    )
    if not len(seen.value):
        return Findings((), "no value could be compared")
    if not (np.abs(seen.residual) > seen.allowed).any():
        return Findings((), "no value is further off than allowed")
    if over or has_week(frame):
        sweep: Sweep = SituationsSweep(seen, closed, answer, over or {}, explained)
    else:
        sweep = Sweep(seen, closed, prepared(frame), answer)
    ranked = sweep.singles()
    if not ranked or not ranked[0].within:
        # Of so many pairs some explain much by chance: only what leaves every value within tolerance is told.
        ranked = sorted([*ranked, *(w for w in sweep.pairs(ranked) if w.within)], key=lambda w: w.score)
    told = _told(sweep, ranked, limit)
    why = "" if told else PLACES_NOT_TRIED if sweep.large else NOTHING_EXPLAINS if sweep.pairwise else NOTHING_ALONE
    return Findings(tuple(told), why, sweep.solved)


def _spokesman(opinions: Opinions) -> Answer | None:
    """Slope-deflection where it speaks: the suspects change its frame. Else whoever gives most."""
    return opinions.answers.get("slope-deflection") or next(iter(opinions.answers.values()), None)


def _told(sweep: Sweep, ranked: list[Weighed], limit: int) -> list[Suspect]:
    """The best of the ranking without repetitions, confirmed by solving again, with their ties. What fits as many numbers
    as there are values explains nothing."""
    kept: list[Weighed] = []
    said: set[tuple[str, tuple[str, ...], str]] = set()
    for weighed in ranked:
        if len(kept) >= limit or (kept and weighed.score > kept[0].score + NEAR):
            break
        option = weighed.option
        key = (option.kind, option.where, option.says)
        if key in said or not _enough(weighed) or option.fitted >= len(sweep.seen.value):
            continue
        said.add(key)
        if option.fitted and any(_stands_for(k, option) for k in kept):
            continue
        confirmed = _confirmed(sweep, weighed)
        if confirmed is not None and _enough(confirmed):
            kept.append(confirmed)
    kept.sort(key=lambda w: w.score)
    return [_suspect(sweep, kept, w) for w in kept]


def _stands_for(plain: Weighed, fitted: Option) -> bool:
    """Whether something with no number to fit explains the same place already: a spring of next to nothing is a hinge."""
    o = plain.option
    return plain.fits and not o.fitted and (o.kind, o.where) == (fitted.kind, fitted.where)


def _enough(w: Weighed) -> bool:
    return w.within or w.explains >= EXPLAINS_ENOUGH


def _confirmed(sweep: Sweep, weighed: Weighed) -> Weighed | None:
    """By solving the changed frame afresh; None where it turns out to be a mechanism or to meet a load with nothing."""
    option = weighed.option
    if option.change.frame is None or option.change.loads_only:
        return weighed
    if option.delta is not None and not sweep.slow:
        again = sweep.solve(option)
        if again is None:
            return None
        weighed = again
    try:
        changed = option.change.frame(sweep.frame)
        for plain in {id(p): p for p in map(changed.under, sweep.names)}.values():
            study(plain)
    except UnusableInput:
        return None
    return weighed


def _suspect(sweep: Sweep, kept: list[Weighed], w: Weighed) -> Suspect:
    ties = [o for o in kept if o is not w and _alike(sweep, w, o)]
    o = w.option
    tied = tuple(tie_words(sweep, w, other) for other in ties[:MOST_TIES])
    return Suspect(o.kind, o.where, o.says, float(np.clip(w.explains, 0.0, 1.0)), tied, o.change, w.fits)


def _alike(sweep: Sweep, one: Weighed, two: Weighed) -> bool:
    """Both fit to the printed precision, or the claim's values cannot tell them apart."""
    if one.fits and two.fits:
        return True
    gap = np.abs((one.claimed - one.said) - (two.claimed - two.said))
    return bool((gap <= sweep.seen.meets).all())


def tie_words(sweep: Sweep, one: Weighed, other: Weighed) -> str:
    """The other, and the further result that would tell it from this one."""
    from crosscheck.suspects.apart import further_result

    return f"{other.option.says}{further_result(sweep, one, other)}"
