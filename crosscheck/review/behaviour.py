"""What the first-order answer says about the model: movements, uplift, thrust, locked temperature, and whether first order
may be used at all."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from crosscheck.frame.model import FREE, HELD
from crosscheck.review.finding import Finding, Subject, listed


def sway(subject: Subject) -> Iterator[Finding]:
    """Does a level move sideways more than the usual share of its height? Common practice, not a code's rule."""
    if subject.answer is None:
        return
    frame = subject.frame
    height = frame.xy[:, 1] - frame.xy[:, 1].min()
    for name, case in subject.answer.cases.items():
        dx = np.nan_to_num(case.joints[:, 0])
        ratio = np.divide(height, np.abs(dx), out=np.full(len(dx), np.inf), where=(np.abs(dx) > 0) & (height > 0))
        k = int(np.argmin(ratio))
        if ratio[k] < subject.limits.sway:
            joint = list(frame.joints)[k]
            says = (
                f"in {name} joint {joint} moves {abs(dx[k]) / subject.metre * 1000:.3g} mm sideways, 1/{ratio[k]:.0f} "
                f"of its height; 1/{subject.limits.sway:g} is a usual limit (common practice)"
            )
            yield Finding("check", (joint,), says)


def deflection(subject: Subject) -> Iterator[Finding]:
    """Does a beam deflect more than the usual share of its span, against its own ends? Common practice, not a code's
    rule."""
    if subject.answer is None:
        return
    frame, t = subject.frame, subject.frame.member_table
    beams = np.flatnonzero(np.abs(t.sin) < 0.8)
    names = list(frame.members)
    share = np.linspace(0.0, 1.0, 21)
    member = np.repeat(beams, len(share))
    x = t.length[member] * np.tile(share, len(beams))
    side = np.where(x >= t.length[member], -1, 1)
    for case in subject.answer.cases:
        across = subject.answer.spans.along(case, member, x, side)[:, 3].reshape(-1, len(share))
        chord = across[:, :1] + (across[:, -1:] - across[:, :1]) * share
        sag = np.abs(across - chord).max(axis=1)
        for k, s in zip(beams, sag, strict=True):
            if s > t.length[k] / subject.limits.deflection:
                says = (
                    f"in {case} member {names[k]} deflects {s / subject.metre * 1000:.3g} mm, "
                    f"1/{t.length[k] / s:.0f} of its span; "
                    f"1/{subject.limits.deflection:g} is a usual limit (common practice)"
                )
                yield Finding("check", (names[k],), says)


def uplift(subject: Subject) -> Iterator[Finding]:
    """Does a support have to hold the frame down? Can it, and does its footing weigh enough?"""
    if subject.answer is None:
        return
    frame = subject.frame
    wanted = list(frame.combinations) or list(frame.cases)
    for name in frame.supports:
        k = frame.joint_index[name]
        lifted = []
        for case in wanted:
            pulls = subject.answer.cases[case].reactions
            largest = float(np.nanmax(np.abs(pulls), initial=0.0))
            if pulls[k, 1] < -0.001 * largest:
                lifted.append((float(pulls[k, 1]), case))
        if lifted:
            pull, case = min(lifted)
            says = f"support {name} must hold the frame down with {-pull:.4g} {frame.units.force} in {case}"
            says += f" (and in {len(lifted) - 1} more)" if len(lifted) > 1 else ""
            yield Finding("check", (name,), says)


def thrust(subject: Subject) -> Iterator[Finding]:
    """Do pinned feet push outward under vertical load with nothing tying them? The ground or a tie must take the thrust."""
    if subject.answer is None:
        return
    frame = subject.frame
    pinned = [n for n, s in frame.supports.items() if s.x == HELD and s.rotation == FREE and subject.members_at[n]]
    tied = {frozenset((m.joint_from, m.joint_to)) for m in frame.members.values()}
    for a_index, a in enumerate(pinned):
        for b in pinned[a_index + 1 :]:
            if frozenset((a, b)) in tied:
                continue
            for case in frame.cases:
                total = subject.total(case)
                if abs(total[0]) > 0.01 * abs(total[1]):
                    continue
                pulls = subject.answer.cases[case].reactions
                one, two = float(pulls[frame.joint_index[a], 0]), float(pulls[frame.joint_index[b], 0])
                if one * two < 0 and min(abs(one), abs(two)) > 0.02 * abs(total[1]):
                    push = f"{abs(one):.4g} {frame.units.force}"
                    says = f"under {case} the feet {a} and {b} thrust {push} and nothing ties them"
                    yield Finding("note", (a, b), says)
                    break


def locked_temperature(subject: Subject) -> Iterator[Finding]:
    """Is a heated member held lengthwise between supports? It then takes EA alpha T, whatever its size; real supports
    give a little."""
    frame, t = subject.frame, subject.frame.member_table
    if subject.answer is None or frame.analysis.axial != "elastic":
        return
    names = list(frame.members)
    for case, table in subject.tables.items():
        for k in np.flatnonzero(table.mean):
            full = abs(t.E[k] * t.A[k] * t.alpha[k] * table.mean[k])
            force = abs(float(subject.answer.cases[case].ends[k, 0, 0]))
            if force > 0.5 * full:
                says = (
                    f"in {case} member {names[k]} is locked: it takes {100 * force / full:.0f}% of the force that full "
                    "restraint of its temperature would bring; do the supports really give nothing?"
                )
                yield Finding("check", (names[k],), says)


def second_order(subject: Subject) -> Iterator[Finding]:
    """May first order be used? Below a critical load factor of about 10 (common for elastic analysis) second-order
    effects exceed what first order may leave out; at 1 the frame buckles."""
    for case, factor in subject.critical.items():
        if factor <= 1.0:
            says = f"{case} is past the critical load of the frame: its critical load factor is {factor:.3g}"
            yield Finding("serious", (case,), says)
        elif factor < subject.limits.critical and subject.frame.analysis.order == 1:
            gain = 1 / (1 - 1 / factor)
            says = (
                f"{case} has a critical load factor of {factor:.3g}, below {subject.limits.critical:g}: sway moments grow "
                f"by about {100 * (gain - 1):.0f}% on the displaced frame; first order leaves that out (order = 2 does not)"
            )
            yield Finding("check", (case,), says)


def undetermined(subject: Subject) -> Iterator[Finding]:
    """What does the idealisation leave undetermined? Those forces need axial = "elastic"."""
    if subject.study is None:
        return
    none = subject.study.undetermined
    names = [n for n, lost in zip(subject.frame.members, none.axial, strict=True) if lost]
    if names:
        says = f"axially rigid members leave the axial force of {listed(names)} undetermined; axial = \"elastic\" gives it"
        yield Finding("check", tuple(names), says)


def said_by_the_reader(subject: Subject) -> Iterator[Finding]:
    """What the reader of the frame file warned of."""
    for warning in subject.frame.warnings:
        if not warning.startswith(("joint ", "load case ", "case ")):
            yield Finding("check" if "RIGID" in warning else "note", (), warning)
