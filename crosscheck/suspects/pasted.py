"""Results of one case under the name of another, or one quantity's under the head of another, where the paste must be read
again to see it: what it leaves open, signs and units, was told by the wrong results."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from functools import partial
from typing import TYPE_CHECKING

from crosscheck.claims.reading import Reading
from crosscheck.compare.claim import CaseClaim, ClaimComparison
from crosscheck.compare.claimed import ClosedClaim
from crosscheck.compare.closing import close
from crosscheck.compare.enveloped import as_of, name_of
from crosscheck.compare.tolerance import Tolerance
from crosscheck.suspects.changes import Change
from crosscheck.suspects.suspect import Suspect

if TYPE_CHECKING:
    from crosscheck.check import Opinions

EXCHANGED = (
    ("axial", "shear", "axial force and shear"), ("fx", "fy", "reactions along x and along y"),
    ("dx", "dy", "displacements along x and along y"),
)  # fmt: skip
"""Quantities of one unit whose columns may stand under each other's heads."""
FEWEST = 6
"""Values that must fit: fewer would fit some case in some signs."""
MOST = 60
"""Cases tried."""


def pasted_from(
    opinions: Opinions, reading: Reading, asked: str | None, claims: Sequence[CaseClaim], tolerance: Tolerance
) -> list[Suspect]:
    """Cases whose results the paste has in full where it names another. asked: the case given to what names none."""
    out = []
    for claim in claims:
        wrong = claim.verdict == "disagree" and 2 * len(claim.differences) >= claim.compared >= FEWEST
        for other in opinions.frame.names[:MOST] if wrong and claim.case in opinions.frame.names else ():
            again = None if other == claim.case else _read_as(opinions, reading, asked, claim, other, tolerance)
            if again is not None:
                says = f"the results of {other} stand under {claim.case}"
                change = Change(claim=partial(_exchanged, case=claim.case, again=again))
                out.append(Suspect("load case", (), says, 1.0, change=change, fits=True))
    return out


def columns_exchanged(
    opinions: Opinions, reading: Reading, asked: str | None, claims: Sequence[CaseClaim], tolerance: Tolerance
) -> list[Suspect]:
    """Pairs of columns of which each stands under the other's head: exchanged, the whole claim agrees."""
    out = []
    compared = sum(claim.compared for claim in claims)
    for one, two, words in EXCHANGED if compared >= FEWEST else ():
        other = {one: two, two: one}
        if not {one, two} <= {e.quantity for e in reading.entries}:
            continue
        entries = tuple(replace(e, quantity=other.get(e.quantity, e.quantity)) for e in reading.entries)
        closed = close(replace(reading, entries=entries), opinions.frame, opinions.answers, asked, tolerance)
        judged = ClaimComparison(opinions.frame, opinions.answers, opinions.judgements, tolerance).judge(closed)
        fits = bool(judged) and all(c.verdict == "agree" for c in judged) and sum(c.compared for c in judged) >= compared
        if fits and not closed.undecided and not closed.reversed_load:
            says = f"the columns of {words} are exchanged"
            change = Change(claim=partial(_instead, again=closed))
            out.append(Suspect("transcription", (), says, 1.0, change=change, fits=True))
    return out


def _instead(closed: ClosedClaim, again: ClosedClaim) -> ClosedClaim:
    return again


def _read_as(
    opinions: Opinions, reading: Reading, asked: str | None, claim: CaseClaim, other: str, tolerance: Tolerance
) -> ClosedClaim | None:
    """The case's part of the paste as results of another; None where not every value then agrees."""
    names = (claim.case, None) if asked == claim.case else (claim.case,)
    entries = tuple(as_of(e, other) for e in reading.entries if name_of(e) in names)
    closed = close(replace(reading, entries=entries), opinions.frame, opinions.answers, None, tolerance)
    judged = ClaimComparison(opinions.frame, opinions.answers, opinions.judgements, tolerance).judge(closed)
    fits = len(judged) == 1 and judged[0].verdict == "agree" and judged[0].compared >= claim.compared
    return closed if fits and not closed.undecided and not closed.reversed_load else None


def _exchanged(closed: ClosedClaim, case: str, again: ClosedClaim) -> ClosedClaim:
    """The claim with one case's values as they were read again."""
    kept = tuple(v for v in closed.values if v.case != case)
    cases = tuple(dict.fromkeys(again.cases[0] if name == case else name for name in closed.cases))
    values = (*kept, *again.values)
    return replace(closed, cases=cases, values=values, signs=again.signs, fits=again.fits, units=again.units)
