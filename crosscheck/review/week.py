"""States of stiffness, leans, patterns, ties, stepped members, one-way parts and included files: are they used as meant?"""

from __future__ import annotations

from collections.abc import Callable, Iterator
from typing import Any

import numpy as np

from crosscheck.frame.model import HELD, Combination, Frame, Lean, Misfit, StiffnessState, Temperature, Tie
from crosscheck.review.finding import Finding, Subject, listed

LEANS = (1 / 600, 1 / 100)
"""Shares that out-of-plumb columns usually lean by: 1/200 times two factors of 1 and less, 1/424 for tall frames."""
OFF_LINE = 0.1
"""Share of the frame's size by which tied joints may lie off a line along the tie."""
FAR = 30.0
"""Metres between tied joints beyond which what holds them together stretches and warms."""
BEAM = 0.7
"""Sine of the slope up to which a stepped member is looked at as a beam."""


def excluding_cases(subject: Subject) -> Iterator[Finding]:
    """Does a combination name cases that exclude each other?

    Why: they never act together; it stands for one combination for each of them, which is often meant so.
    Look at: whether these alternatives are meant, and whether each has the factor that it should have alone.
    Example: windy = { wind_left = 1.5, wind_right = 1.5 } where exclusive has both winds.
    Source: common practice.
    """
    for name, cases in subject.frame.parted.items():
        parts = [n for n, c in subject.frame.combinations.items() if c.stated == name]
        says = f"combination {name} names {listed(cases)}, which exclude each other: it became {listed(parts)}"
        yield Finding("note", (name, *cases), says)


def uneven_states(subject: Subject) -> Iterator[Finding]:
    """Do some combinations of one kind use a state of stiffness, and others not?

    Why: a state added later is easily forgotten in one combination; its results are then of another structure.
    Look at: the combinations without it. Those with a factor above 1 are one kind, the others another.
    Example: ultimate has stiffness = "cracked" and windy has none.
    Source: common practice; a note among combinations in use, where lasting and short loads may differ.
    """
    yield from _uneven(subject, lambda c: c.stiffness, "a state of stiffness", ("check", "note"))


def uneven_leans(subject: Subject) -> Iterator[Finding]:
    """Do some combinations of one kind lean, and others not?

    Why: columns out of plumb are so under every load.
    Look at: the combinations without it; where their sideways loads are large a lean may be left out.
    Example: ultimate leans by 0.4% and windy does not.
    Source: EN 1993-1-1:2005 5.3.2(4)B lets sway imperfections go where sideways loads are 15% of the vertical ones or more.
    """
    yield from _uneven(subject, lambda c: c.lean, "a lean", ("note", "note"))


def uneven_orders(subject: Subject) -> Iterator[Finding]:
    """Are some combinations of one kind of second order, and others of first?

    Why: their results are then not to be compared or put in one envelope without a thought.
    Look at: whether first order is meant for the others.
    Example: winter has order = 2 and storm has no word of its own.
    Source: common practice.
    """
    usual = subject.frame.analysis.order
    yield from _uneven(subject, lambda c: (c.order or usual) == 2, "order = 2", ("note", "note"))


def _uneven(subject: Subject, has: Callable[[Combination], Any], what: str, grades: tuple[Any, Any]) -> Iterator[Finding]:
    """Combinations of one kind (a factor above 1 or none) of which some have something and some have not."""
    kinds: tuple[dict[str, bool], dict[str, bool]] = ({}, {})
    for c in subject.frame.combinations.values():
        kinds[max(c.factors.values(), default=0.0) <= 1.0][c.stated or c.name] = bool(has(c))
    for kind, grade in zip(kinds, grades, strict=True):
        with_it, without = ([n for n, own in kind.items() if own is there] for there in (True, False))
        if with_it and without:
            has_it, has_not = ("has" if len(names) == 1 else "have" for names in (with_it, without))
            says = f"{listed(with_it)} {has_it} {what}, and {listed(without)} {has_not} not"
            yield Finding(grade, (*without, *with_it), says)


def unused_states(subject: Subject) -> Iterator[Finding]:
    """Is a state of stiffness stated and used by no combination, or does it change nothing?

    Why: somebody meant it to be used; results are of the stiffness as stated.
    Look at: the combinations that should name it; sections and materials that no member has.
    Example: [stiffness.cracked], and no combination with stiffness = "cracked".
    Source: common practice.
    """
    frame = subject.frame
    used = {c.stiffness for c in frame.combinations.values()}
    for name, state in frame.states.items():
        if name not in used:
            yield Finding("check", (name,), f"no combination uses the state of stiffness {name}")
        idle = [*(s for s in state.sections if s not in _sections(frame)),
                *(m for m in state.materials if m not in {o.material for o in frame.members.values()})]  # fmt: skip
        if idle:
            yield Finding("check", (name, *idle), f"state {name} has factors on {listed(idle)}, which no member has")


def _sections(frame: Frame) -> set[str]:
    pieces = {s for m in frame.members.values() for p in m.pieces for s in (p.first, p.last)}
    return pieces | {m.section for m in frame.members.values()}


def state_factors(subject: Subject) -> Iterator[Finding]:
    """Does a state of stiffness make something stiffer than stated, or next to nothing?

    Why: cracking, creep and yielding supports take stiffness away; a factor above 1 is a slip unless loads are brief.
    Look at: the factor; its decimal point; which of the two states is the stated one.
    Example: beam = { I = 3.5 } for 0.35.
    Source: common practice (0.05 to 1; a note for supports, which may be stiffer under brief loads).
    """
    for state in subject.frame.states.values():
        for kind, name, key, factor in _factors(state):
            if 0.05 <= factor <= 1.0:
                continue
            grade: Any = "note" if kind == "support" and factor <= 10.0 else "check"
            word = "stiffer than stated" if factor > 1.0 else "all but gone"
            yield Finding(grade, (state.name, name), f"state {state.name} has {key} of {name} times {factor:g}: {word}")


def _factors(state: StiffnessState) -> Iterator[tuple[str, str, str, float]]:
    for kind in ("member", "section", "material", "support"):
        for name, factors in getattr(state, f"{kind}s").items():
            for key, factor in factors.items():
                yield kind, name, key, factor


def lean_sizes(subject: Subject) -> Iterator[Finding]:
    """Is a lean of a size that columns out of plumb have?

    Why: a percent sign or a decimal point has probably slipped.
    Look at: the lean, and the code that asks for it.
    Example: lean = 0.4 for "0.4%".
    Source: EN 1993-1-1:2005 5.3.2(3): 1/200 times reductions for height and number of columns; usual are 1/600 to 1/100.
    """
    frame = subject.frame
    found = {c.stated or c.name: c.lean for c in frame.combinations.values() if c.lean}
    for case in frame.cases.values():
        found |= {f"{case.name}[{q.entry}]": q.share for q in case.loads if isinstance(q, Lean) and not case.arranged}
    for name, lean in found.items():
        if lean and not LEANS[0] <= abs(lean) <= LEANS[1]:
            says = f"{name} leans by {lean:g}, 1/{1 / abs(lean):.3g}; 1/200 and less, down to 1/600, is usual"
            yield Finding("check" if abs(lean) > LEANS[1] else "note", (name,), says)


def idle_patterns(subject: Subject) -> Iterator[Finding]:
    """Does a load pattern reach no combination, or make no arrangement?

    Why: its arrangements are then results that nobody uses, or none at all.
    Look at: combinations that should have the case; its spans, of which an arrangement leaves some bare.
    Example: [patterns.imposed], and every combination without imposed.
    Source: common practice.
    """
    frame = subject.frame
    for name in frame.patterns:
        arranged = {c.name for c in frame.cases.values() if c.arranged == name}
        if not arranged:
            yield Finding("check", (name,), f"the pattern of {name} makes no arrangement but the case as stated")
        elif frame.combinations and not any(arranged & c.factors.keys() for c in frame.combinations.values()):
            yield Finding("check", (name,), f"no combination uses an arrangement of {name}")
        bare = [n for n in arranged if not frame.cases[n].loads and frame.cases[name].loads]
        if bare:
            yield Finding("check", (name, *bare), f"{listed(bare)} holds no load: do the spans of its pattern carry any?")


def ties(subject: Subject) -> Iterator[Finding]:
    """Do tied joints lie where something can hold them together, and does nothing else do so already?

    Why: a tie neither stretches nor warms, and passes any force; that is a floor or a short strut, not a long rod.
    Look at: the joints' names; whether one at another level slipped in.
    Example: a roof's tie with a joint of the floor below in it.
    Source: common practice (joints off a line along the tie by a tenth of the frame; 30 m apart).
    """
    frame = subject.frame
    for name, tie in frame.ties.items():
        along, across = _places(frame, tie)
        if np.ptp(across) > OFF_LINE * subject.extent:
            off = tie.joints[int(np.argmax(np.abs(across - np.median(across))))]
            says = f"tie {name} holds joints that do not lie in a line along it: {off} is off it, is it meant?"
            yield Finding("check", (name, off, *tie.joints), says)
        if np.ptp(along) > FAR * subject.metre:
            apart = f"{np.ptp(along) / subject.metre:.3g} m apart"
            says = f"tie {name} holds joints {apart} as if nothing between them could stretch"
            yield Finding("note", (name, *tie.joints), says)
        if _chained(frame, tie):
            says = f"axially rigid members hold the joints of tie {name} together already: it does nothing"
            yield Finding("note", (name, *tie.joints), says)
        held = [j for j in tie.joints if j in frame.supports and _held_along(frame, j, tie.direction)]
        if len(held) > 1:
            says = f"supports hold {listed(held)} along tie {name} already"
            yield Finding("check", (name, *held), says)


def _places(frame: Frame, tie: Tie) -> tuple[Any, Any]:
    """Where tied joints lie along the tie and across it."""
    xy = frame.xy[[frame.joint_index[j] for j in tie.joints]]
    c, s = np.cos(np.radians(tie.direction)), np.sin(np.radians(tie.direction))
    return xy[:, 0] * c + xy[:, 1] * s, xy[:, 1] * c - xy[:, 0] * s


def _chained(frame: Frame, tie: Tie) -> bool:
    """Whether members that keep their length and lie along the tie link all its joints."""
    t = frame.member_table
    c, s = np.cos(np.radians(tie.direction)), np.sin(np.radians(tie.direction))
    lying = t.rigid & (np.abs(t.cos * s - t.sin * c) < 1e-6)
    group = np.arange(len(frame.joints))
    for a, b in t.ends[lying].tolist():
        group[group == group[b]] = group[a]
    return len({int(group[frame.joint_index[j]]) for j in tie.joints}) == 1


def _held_along(frame: Frame, joint: str, direction: float) -> bool:
    support = frame.supports[joint]
    if support.x == HELD and support.y == HELD:
        return True
    angle = np.radians(direction - support.angle)
    return bool((support.x == HELD and abs(np.sin(angle)) < 1e-6) or (support.y == HELD and abs(np.cos(angle)) < 1e-6))


def idle_one_way(subject: Subject) -> Iterator[Finding]:
    """Does a member or support that works one way only never work?

    Why: it then stands for nothing; it may be meant for the other sense, or for a load that no case has.
    Look at: `only` (tension or compression), push or pull; whether it should be tightened (misfit).
    Example: crossed rods, one of which would work under wind from the right, and there is none.
    Source: common practice.
    """
    frame = subject.frame
    if not subject.solved:
        return
    for name, member in frame.members.items():
        if member.only and not _strained(frame, name) and not _works(subject, name):
            says = f"{name} works in {member.only} only, and is slack in every case and combination"
            yield Finding("note", (name,), says)
    for joint, s in frame.supports.items():
        for axis in "xy":
            only = getattr(s, f"{axis}_only")
            if only and not _pulls(subject, joint, axis):
                says = f"the support at {joint} can only {only} along {axis}, and has let go in every case and combination"
                yield Finding("note", (joint,), says)


def _strained(frame: Frame, member: str) -> bool:
    """Whether a case tightens, warms or loads the member itself."""
    loads = (q for c in frame.cases.values() for q in c.loads)
    return any(isinstance(q, (Misfit, Temperature)) and q.member == member for q in loads)


def _works(subject: Subject, member: str) -> bool:
    """Whether the member has an axial force in some case: more than what its own loads along it make."""
    k = subject.frame.member_index[member]
    sense = 1.0 if subject.frame.members[member].only == "tension" else -1.0
    for case in subject.solved.values():
        size = float(np.nanmax(np.abs(case.ends[:, :, :2]), initial=0.0))
        if sense * float(case.ends[k, :, 0].mean()) > 1e-9 * size:
            return True
    return False


def _pulls(subject: Subject, joint: str, axis: str) -> bool:
    k, table = subject.frame.joint_index[joint], subject.frame.support_table
    c, s = float(table.cos[k]), float(table.sin[k])
    way = np.array([c, s] if axis == "x" else [-s, c])
    cases = subject.solved.values()
    return any(abs(float(way @ q.reactions[k, :2])) > 1e-9 * float(np.nanmax(np.abs(q.reactions[:, :2]))) for q in cases)


def haunches(subject: Subject) -> Iterator[Finding]:
    """Is a stepped beam lighter at an end that meets others than in its span?

    Why: haunches are deeper than the span; the profile was entered the wrong way round, or two names were swapped.
    Look at: the profile, and the depth or I of both sections.
    Example: profile = [["span", "15%"], ["haunch", "85%"], ["span", "100%"]].
    Source: common practice.
    """
    frame, t = subject.frame, subject.frame.member_table
    for k, member in enumerate(frame.members.values()):
        if len(member.pieces) < 2 or abs(t.sin[k]) > BEAM:
            continue
        middle = frame.sections[member.section]
        for joint, end in ((member.joint_from, member.pieces[0].first), (member.joint_to, member.pieces[-1].last)):
            own = frame.sections[end]
            shallow = own.depth < middle.depth if own.depth and middle.depth else own.I < middle.I
            if shallow and len(subject.members_at[joint]) > 1:
                what = "shallower" if own.depth and middle.depth else "lighter"
                beside = f"{what} than {middle.name} in its span"
                says = f"{member.name} has section {end} at {joint}, {beside}: were the two swapped?"
                yield Finding("check", (member.name, end, middle.name), says)


def included_files(subject: Subject) -> Iterator[Finding]:
    """What comes from files that other frames use as well?

    Why: whoever changes such a file changes this frame; the checksum tells whether it is the file that was checked.
    Look at: the checksum beside that of the last check; values on record are no longer of this frame once it changes.
    Example: office-sections.toml with a section's I corrected.
    Source: common practice.
    """
    for included in subject.frame.includes:
        says = f"{included.file} gives sections and materials; its checksum (sha256) begins {included.sha256[:12]}"
        yield Finding("note", (included.file,), says)
