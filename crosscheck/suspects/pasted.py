"""Results of one case under the name of another, or one quantity's under the head of another, where the paste must be read
again to see it: what it leaves open, signs and units, was told by the wrong results."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass, replace
from functools import partial
from typing import TYPE_CHECKING

from crosscheck.claims.reading import Entry, Reading
from crosscheck.compare.claim import CaseClaim, ClaimComparison
from crosscheck.compare.claimed import ClosedClaim
from crosscheck.compare.closing import close
from crosscheck.compare.enveloped import as_of, name_of
from crosscheck.compare.tolerance import Tolerance
from crosscheck.suspects.changes import Change
from crosscheck.suspects.find import LIMIT
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


def read_again(
    found: Sequence[Suspect], opinions: Opinions, reading: Reading, asked: str | None, claims: Sequence[CaseClaim],
    tolerance: Tolerance,
) -> tuple[Suspect, ...]:  # fmt: skip
    """The suspects found, with those before them that only show when the paste is read again. asked: the case given to what
    names none."""
    known = {s.says for s in found if s.fits}
    again = _Again(opinions, reading, asked, tolerance)
    first = [s for s in (*again.other_cases(claims), *again.exchanged(claims)) if s.says not in known]
    told = {s.says for s in first}
    return (*first, *(s for s in found if s.says not in told))[:LIMIT]


@dataclass(frozen=True)
class _Again:
    opinions: Opinions
    reading: Reading
    asked: str | None
    tolerance: Tolerance

    def other_cases(self, claims: Sequence[CaseClaim]) -> Iterator[Suspect]:
        """Cases whose results the paste has in full where it names another."""
        names = self.opinions.frame.names
        for claim in claims:
            wrong = claim.verdict == "disagree" and 2 * len(claim.differences) >= claim.compared >= FEWEST
            meant = (claim.case, None) if self.asked == claim.case else (claim.case,)
            own = [e for e in self.reading.entries if name_of(e) in meant]
            tried = names[:MOST] if wrong and claim.case in names else ()
            for other in (name for name in tried if name != claim.case):
                closed = self._agreeing([as_of(e, other) for e in own], None, claim.compared)
                if closed is not None:
                    says = f"the results of {other} stand under {claim.case}"
                    yield _suspect("load case", says, partial(_exchanged, case=claim.case, again=closed))

    def exchanged(self, claims: Sequence[CaseClaim]) -> Iterator[Suspect]:
        """Pairs of columns of which each stands under the other's head: exchanged, the whole claim agrees."""
        compared = sum(claim.compared for claim in claims)
        for one, two, words in EXCHANGED if compared >= FEWEST else ():
            other = {one: two, two: one}
            entries = [replace(e, quantity=other.get(e.quantity, e.quantity)) for e in self.reading.entries]
            both = other.keys() <= {e.quantity for e in self.reading.entries}
            closed = self._agreeing(entries, self.asked, compared) if both else None
            if closed is not None:
                says = f"the columns of {words} are exchanged"
                yield _suspect("transcription", says, partial(_instead, again=closed))

    def _agreeing(self, entries: Sequence[Entry], asked: str | None, compared: int) -> ClosedClaim | None:
        """The claim that these entries make; None where not all of at least so many values agree."""
        o = self.opinions
        closed = close(replace(self.reading, entries=tuple(entries)), o.frame, o.answers, asked, self.tolerance)
        judged = ClaimComparison(o.frame, o.answers, o.judgements, self.tolerance).judge(closed)
        fits = all(c.verdict == "agree" for c in judged) and sum(c.compared for c in judged) >= compared
        return closed if fits and not closed.undecided and not closed.reversed_load else None


def _suspect(kind: str, says: str, claim: Callable[[ClosedClaim], ClosedClaim]) -> Suspect:
    return Suspect(kind, (), says, 1.0, change=Change(claim=claim), fits=True)


def _instead(closed: ClosedClaim, again: ClosedClaim) -> ClosedClaim:
    return again


def _exchanged(closed: ClosedClaim, case: str, again: ClosedClaim) -> ClosedClaim:
    """The claim with one case's values as they were read again."""
    kept = tuple(v for v in closed.values if v.case != case)
    cases = tuple(dict.fromkeys(again.cases[0] if name == case else name for name in closed.cases))
    values = (*kept, *again.values)
    return replace(closed, cases=cases, values=values, signs=again.signs, fits=again.fits, units=again.units)
