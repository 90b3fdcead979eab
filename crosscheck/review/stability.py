"""May first order be used at all?"""

from __future__ import annotations

import math
from collections.abc import Iterator

from crosscheck.check import FAR
from crosscheck.review.finding import Finding, Subject, and_more, listed


def second_order(subject: Subject) -> Iterator[Finding]:
    """May first order be used, or does the frame sway so easily that loads act on its displaced shape?

    Why: below a critical load factor of about 10, second-order effects exceed what first order may leave out; at 1 the
      frame buckles.
    Look at: bracing, column sections, feet; analyse with order = 2 where the factor is low.
    Example: a factor of 5 raises sway moments by about 25%.
    Source: exact by stability functions; the limit of 10 is common for elastic analysis (EN 1993-1-1:2005 5.2.1(3)),
      settable by --critical; the storey formula beside it is 5.2.1(4)B, up to 21.6% on the unsafe side.
    """
    worst = sorted((factor, case) for case, factor in subject.critical.items())
    past = [case for factor, case in worst if factor <= 1.0]
    if past:
        says = f"past the critical load of the frame: the critical load factor of {past[0]} is {_factor(subject, past[0])}"
        yield Finding("serious", tuple(past), says + and_more(len(past) - 1))
    frame = subject.frame
    low = [(f, c) for f, c in worst if 1.0 < f < subject.limits.critical and frame.under(c).analysis.order == 1]
    if low:
        factor, case = low[0]
        gain = 100 * (1 / (1 - 1 / factor) - 1)
        below = f"below {subject.limits.critical:g}{and_more(len(low) - 1)}"
        says = (
            f"{case} has a critical load factor of {_factor(subject, case)}, {below}: moments grow by up to about "
            f"{gain:.0f}% on the displaced frame; first order leaves that out (order = 2 does not)"
        )
        yield Finding("check", tuple(c for _, c in low), says)


def _factor(subject: Subject, case: str) -> str:
    rough = subject.storeys.get(case)
    beside = f" ({rough:.3g} by the storey formula)" if rough is not None else ""
    return f"{subject.critical[case]:.3g}{beside}"


def critical_factors(subject: Subject) -> Iterator[Finding]:
    """What is the critical load factor of each case?

    Why: it says how far the frame is from buckling elastically, and how much first order leaves out.
    Look at: the least; and where the storey formula is far above the exact one, columns that buckle between their ends.
    Example: exact 6.31, 6.9 by the storey formula.
    Source: exact by stability functions, counted after Wittrick and Williams 1971; EN 1993-1-1:2005 5.2.1(4)B.
    """
    finite = sorted((f, c) for c, f in subject.critical.items() if math.isfinite(f))
    if finite:
        left = len(subject.critical) - len(finite[:4])
        says = f"critical load factors, least first: {listed([f'{c} {_factor(subject, c)}' for _, c in finite[:4]])}"
        says += f"; {left} higher" if left else ""
        if any(c in subject.storeys for _, c in finite[:4]):
            says += "; the storey formula (EN 1993-1-1 5.2.1) may be up to 21.6% on the unsafe side"
        yield Finding("note", (), says)
    elif subject.critical:
        yield Finding("note", (), f"critical load factors are {FAR:g} and more in every case")
