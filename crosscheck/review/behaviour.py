"""What the answer says about the model: movements, uplift, thrust, locked temperature."""

from __future__ import annotations

import itertools
from collections.abc import Iterator

import numpy as np

from crosscheck.frame.model import FREE, HELD, Floats
from crosscheck.review.finding import Finding, Subject, and_more, listed
from crosscheck.review.loading import runs


def in_service(subject: Subject) -> list[str]:
    """Cases, and combinations without a factor above 1: movements under design loads are not what the ratios are for."""
    frame = subject.frame
    names = [*frame.cases, *(c.name for c in frame.combinations.values() if max(c.factors.values(), default=0.0) <= 1.0)]
    return [n for n in names if n in subject.solved]


def sway(subject: Subject) -> Iterator[Finding]:
    """Does a column top move sideways more than the usual share of its height?

    Why: cladding, cranes and people notice; it is also the first sign of a member or a foot that is too soft.
    Look at: sections of columns and beams, feet, bracing, and units of E and I.
    Example: 24 mm at eaves 3.4 m high is 1/140.
    Source: common practice (1/300, settable by --sway; the governing code or client sets the real one).
    """
    found = []
    for top, foot in column_chains(subject).items():
        height = float(subject.frame.xy[top, 1] - subject.frame.xy[foot, 1])
        for case in in_service(subject):
            moves = subject.solved[case].joints[:, 0]
            found.append((_share(abs(float(moves[top] - moves[foot])), height), case, top, height))
    over = sorted((f for f in found if f[0] > 1 / subject.limits.sway), reverse=True)
    if over:
        share, case, top, height = over[0]
        joint = list(subject.frame.joints)[top]
        move = f"{1000 * share * height / subject.metre:.3g} mm sideways, 1/{1 / share:.0f} of its height"
        says = f"in {case} joint {joint} moves {move}{and_more(len({f[1] for f in over}) - 1)}"
        limit = f"1/{subject.limits.sway:g} is a usual limit (common practice)"
        joints = [list(subject.frame.joints)[f[2]] for f in over]
        where = dict.fromkeys([joint, case, *joints, *(f[1] for f in over)])
        yield Finding("check", tuple(where), f"{says}; {limit}")


def column_chains(subject: Subject) -> dict[int, int]:
    """Upper joint to foot, for every joint that columns alone link with a supported joint below it."""
    frame, t = subject.frame, subject.frame.member_table
    y = frame.xy[:, 1]
    links: dict[int, list[int]] = {}
    for name in subject.columns:
        a, b = (int(j) for j in t.ends[frame.member_index[name]])
        low, high = (a, b) if y[a] < y[b] else (b, a)
        links.setdefault(low, []).append(high)
    foot: dict[int, int] = {}
    waiting = [(frame.joint_index[n], frame.joint_index[n]) for n in frame.supports]
    while waiting:
        joint, base = waiting.pop()
        for high in links.get(joint, []):
            if high not in foot:
                foot[high] = base
                waiting.append((high, base))
    return foot


def _share(move: float, height: float) -> float:
    return move / height if height > 0 and np.isfinite(move) else 0.0


def deflection(subject: Subject) -> Iterator[Finding]:
    """Does a beam deflect more than the usual share of its span, against the line between its ends?

    Why: finishes crack and roofs pond; it is also a sign of a slip in E, I or a load.
    Look at: section, span, load, and units of E and I. A free end counts as half a span.
    Example: 32 mm over 6 m is 1/188.
    Source: common practice (1/250, settable by --deflection; the governing code or client sets the real one).
    """
    if subject.answer is None or subject.answer.spans.sampled:
        return
    worst: list[tuple[float, str, list[int], float]] = []
    chains = spans(subject)
    for case in in_service(subject):
        across = _across(subject, case)
        for chain in chains:
            sag, length = _sag(subject, across, chain)
            worst.append((_share(sag, length), case, chain, length))
    over = sorted((w for w in worst if w[0] > 1 / subject.limits.deflection), key=lambda w: -w[0])
    if over:
        share, case, chain, length = over[0]
        names = list(subject.frame.members)
        where = list(dict.fromkeys(names[k] for w in over for k in w[2]))
        others = len({tuple(w[2]) for w in over}) - 1
        move = f"{1000 * share * length / subject.metre:.3g} mm, 1/{1 / share:.0f} of its span"
        more = f" (and {others} more {'span' if others == 1 else 'spans'})" if others else ""
        limit = f"1/{subject.limits.deflection:g} is a usual limit (common practice)"
        says = f"in {case} {listed([names[k] for k in chain])} deflects {move}{more}; {limit}"
        yield Finding("check", (*where, case), says)


def spans(subject: Subject) -> list[list[int]]:
    """Level members in a line, put together where nothing but the two meets at a joint without support, from the left."""
    frame, t = subject.frame, subject.frame.member_table
    degree = np.bincount(t.ends.ravel(), minlength=len(frame.joints))
    held = {frame.joint_index[n] for n in frame.supports}
    out: list[list[int]] = []
    for run in runs(subject):
        order = sorted(run, key=lambda k: float(frame.xy[t.ends[k], 0].min()))
        chain: list[int] = []
        for k in order:
            shared = set(map(int, t.ends[chain[-1]])) & set(map(int, t.ends[k])) if chain else set()
            through = shared and all(degree[j] == 2 and j not in held for j in shared)
            if chain and not through:
                out.append(chain)
                chain = []
            chain.append(k)
        out.append(chain)
    return out


SHARES = np.linspace(0.0, 1.0, 21)


def _across(subject: Subject, case: str) -> Floats:
    """(m, 21) displacement of every member across its axis at SHARES of its length, up or to the left."""
    assert subject.answer is not None
    t = subject.frame.member_table
    member = np.repeat(np.arange(len(t.length)), len(SHARES))
    side = np.where(np.tile(SHARES, len(t.length)) < 1, 1, -1)
    x = (t.length[:, None] * SHARES).ravel()
    across = subject.answer.spans.along(case, member, x, side)[:, 3].reshape(-1, len(SHARES))
    return np.asarray(across * np.where(t.cos > 0, 1.0, -1.0)[:, None])


def _sag(subject: Subject, across: Floats, chain: list[int]) -> tuple[float, float]:
    """Largest deflection of a chain of members against the line between its ends, and its span; of a free end against
    the direction in which the other end starts out, with twice the length."""
    frame, t = subject.frame, subject.frame.member_table
    start = frame.xy[t.ends[chain, 0], 0] / np.abs(t.cos[chain])
    at = (start[:, None] + (t.length * np.sign(t.cos))[chain, None] * SHARES).ravel()
    move = np.concatenate([across[k] for k in chain])
    order = np.argsort(at, kind="stable")
    at, move = at[order] - at[order[0]], move[order]
    length = float(at[-1])
    for tip, root in ((0, -1), (-1, 0)):
        if _is_free(subject, chain, left=tip == 0) and not _is_free(subject, chain, left=root == 0):
            return abs(float(move[tip] - move[root])) if np.isfinite(move).all() else 0.0, 2 * length
    chord = move[0] + (move[-1] - move[0]) * at / length
    return float(np.nan_to_num(np.abs(move - chord)).max()), length


def _is_free(subject: Subject, chain: list[int], left: bool) -> bool:
    """Does nothing but the chain's own member meet its left (right) end?"""
    frame, t = subject.frame, subject.frame.member_table
    k = chain[0] if left else chain[-1]
    joint = min(map(int, t.ends[k]), key=lambda j: float(frame.xy[j, 0]) * (1 if left else -1))
    name = list(frame.joints)[joint]
    return len(subject.members_at[name]) == 1 and name not in frame.supports


def uplift(subject: Subject) -> Iterator[Finding]:
    """Does a support have to hold the frame down?

    Why: a footing holds down its weight and no more; a bearing holds nothing.
    Look at: holding-down bolts, the footing's weight, and whether the support should be one-way.
    Example: the windward foot of a light shed.
    Source: common practice; judged in combinations where there are any.
    """
    frame = subject.frame
    wanted = [n for n in (list(frame.combinations) or list(frame.cases)) if n in subject.solved]
    found = []
    for name in frame.supports:
        k = frame.joint_index[name]
        pulls = [(float(_upward(subject, case)[k]), case) for case in wanted]
        lifted = [p for p in pulls if p[0] < -0.001 * _largest(subject, p[1])]
        if lifted:
            pull, case = min(lifted)
            found.append((pull, case, name, len(lifted)))
    found.sort()
    if found:
        pull, case, name, count = found[0]
        hold = f"{-pull:.4g} {frame.units.force} in {case}{and_more(count - 1)}"
        says = f"support {name} must hold the frame down with {hold}"
        others = [f[2] for f in found[1:]]
        yield Finding("check", (name, *others), says + (f"; so must {listed(others)}" if others else ""))


def _upward(subject: Subject, case: str) -> Floats:
    return subject.solved[case].reactions[:, 1]


def _largest(subject: Subject, case: str) -> float:
    return float(np.nanmax(np.abs(subject.solved[case].reactions[:, :2]), initial=0.0))


def thrust(subject: Subject) -> Iterator[Finding]:
    """Do pinned feet push outward under vertical load with nothing tying them?

    Why: the ground or a tie must take the thrust; a foot that slides takes the frame's stiffness away.
    Look at: a tie in the floor, or the passive resistance of the footings.
    Example: a shed with pinned feet and a pitched roof.
    Source: common practice (2% of the vertical load).
    """
    frame = subject.frame
    pinned = [n for n, s in frame.supports.items() if s.x == HELD and s.rotation == FREE and subject.members_at[n]]
    ground = _tied(subject, pinned)
    worst: tuple[float, str, str, str] | None = None
    for case in frame.cases:
        fx, fy = subject.total(case)[:2]
        if case not in subject.solved or fy >= 0 or abs(fx) > 0.01 * abs(fy):
            continue
        pulls = subject.solved[case].reactions[:, 0]
        left = [(n, float(pulls[frame.joint_index[n]])) for n in pinned if pulls[frame.joint_index[n]] > 0.02 * abs(fy)]
        right = [(n, -float(pulls[frame.joint_index[n]])) for n in pinned if pulls[frame.joint_index[n]] < -0.02 * abs(fy)]
        for (a, one), (b, two) in itertools.product(left, right):
            apart = frame.joints[a].x < frame.joints[b].x and ground[a] != ground[b]
            if apart and (worst is None or min(one, two) > worst[0]):
                worst = min(one, two), case, a, b
    if worst:
        push, case, a, b = worst
        says = f"under {case} the feet {a} and {b} thrust apart with {push:.4g} {frame.units.force} and nothing ties them"
        yield Finding("note", (a, b), says)


def _tied(subject: Subject, feet: list[str]) -> dict[str, int]:
    """Group of each foot: feet that level members link at their own height are one."""
    frame, t = subject.frame, subject.frame.member_table
    group = {n: k for k, n in enumerate(frame.joints)}
    names = list(frame.joints)
    low = {float(frame.xy[frame.joint_index[n], 1]) for n in feet}
    for k in range(len(frame.members)):
        a, b = (int(j) for j in t.ends[k])
        if abs(t.sin[k]) < 0.05 and any(abs(float(frame.xy[a, 1]) - y) < 0.05 * subject.extent for y in low):
            one, two = group[names[a]], group[names[b]]
            group = {n: one if g == two else g for n, g in group.items()}
    return {n: group[n] for n in feet}


def locked_temperature(subject: Subject) -> Iterator[Finding]:
    """Is a heated member held lengthwise between supports?

    Why: it then takes EA alpha T, whatever its size; real supports give a little, and take most of that away.
    Look at: sliding bearings, springs in place of held supports.
    Example: a beam between two pinned supports, 30 degrees warmer.
    Source: statics (more than half of what full restraint would bring).
    """
    frame, t = subject.frame, subject.frame.member_table
    if frame.analysis.axial != "elastic":
        return
    names = list(frame.members)
    for case, table in subject.tables.items():
        locked = []
        for k in np.flatnonzero(table.mean) if case in subject.solved else ():
            full = abs(t.E[k] * t.A[k] * t.alpha[k] * table.mean[k])
            force = abs(float(subject.solved[case].ends[k, 0, 0]))
            if force > 0.5 * full:
                locked.append((force / full, names[k]))
        if locked:
            share, name = max(locked)
            says = (
                f"in {case} {name} takes {100 * share:.0f}% of the force that full restraint of its temperature would "
                "bring; do the supports really give nothing?"
            )
            yield Finding("check", tuple(n for _, n in sorted(locked, reverse=True)), says)


def undetermined(subject: Subject) -> Iterator[Finding]:
    """What does the idealisation leave undetermined?

    Why: no analysis of this model can give those forces; one that prints them assumed more.
    Look at: axial = "elastic" gives them.
    Example: a triangle of axially rigid members between held supports.
    Source: statics (states of self-stress).
    """
    if subject.study is None:
        return
    lost = subject.study.undetermined.axial
    names = [n for n, gone in zip(subject.frame.members, lost, strict=True) if gone]
    if names:
        says = f"axially rigid members leave the axial force of {listed(names)} undetermined; axial = \"elastic\" gives it"
        yield Finding("note", tuple(names), says)


def said_by_the_reader(subject: Subject) -> Iterator[Finding]:
    """What did reading the frame file bring to light?

    Why: defaults that change the answer should be seen.
    Look at: what the line says.
    Example: axially rigid, because a section has no A.
    Source: the frame file.
    """
    for warning in subject.frame.warnings:
        if not warning.startswith(("joint ", "load case ", "case ")):
            yield Finding("check" if "RIGID" in warning else "note", (), warning)
