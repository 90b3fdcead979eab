"""The equations of one case with their numbers, for a reviewer who follows by hand."""

from __future__ import annotations

import numpy as np

from crosscheck.answer import WorkTable
from crosscheck.frame.kinematics import Study
from crosscheck.frame.loads import load_table
from crosscheck.frame.model import HELD, Floats, Frame
from crosscheck.opinions.slope_deflection.one_way import OneWay, Part, Settled
from crosscheck.opinions.slope_deflection.system import Solution, System
from crosscheck.opinions.slope_deflection.varying import flexibility

MOST_TERMS = 10
"""Terms printed of one joint equation; a longer one says how many more there are."""


def equations(frame: Frame, study: Study, name: str) -> list[WorkTable]:
    """Members, slope-deflection equations, joint equations, their solution and the end moments of case `name`."""
    if frame.one_way:
        one_way = OneWay(frame)
        settled = one_way.settled(name)
        if settled is None:
            return []
        first = [_one_way_parts(one_way.parts, settled)]
        frame, system, solution = settled.frame, settled.system, settled.solution
    else:
        first, system = [], System(frame)
        solution = system.solve([load_table(frame, name)])
    fixed = solution.fixed[0].moments
    return [
        *first,
        _members(frame, system, fixed),
        *([_varying(frame, system)] if frame.member_table.varying.any() else []),
        _slope_deflection(frame, system, fixed),
        _joint_equations(frame, system, solution),
        _unknowns(frame, system, solution),
        _end_moments(frame, solution, study),
    ]


def _members(frame: Frame, system: System, fixed: Floats) -> WorkTable:
    t, k = frame.member_table, system.coefficients.stiffness
    s = t.E * t.I / t.clear
    rows = tuple(
        (name, s[m], k[m, 0, 0] / s[m], k[m, 0, 1] / s[m], k[m, 1, 1] / s[m], fixed[m, 0], fixed[m, 1])
        for m, name in enumerate(frame.members)
    )
    remarks: tuple[str, ...] = (
        "s = EI / l with l between the rigid zones; a and b multiply s: 4 and 2 for a plain member, 3 at the stiff "
        "end of one hinged at the other",
        "FEM: fixed-end moments at the faces, clockwise on the member positive",
    )
    if t.varying.any():
        remarks = (*remarks, "I of a stepped or tapered member is its mean here; a and b hold what differs from that")
    columns = ("member", "s = EI/l", "a from", "b", "a to", "FEM from", "FEM to")
    return WorkTable("Members: stiffness and fixed-end moments", columns, rows, remarks)


def _one_way_parts(parts: tuple[Part, ...], settled: Settled) -> WorkTable:
    rows = tuple((part.says, "out" if out else "works") for part, out in zip(parts, settled.out.tolist(), strict=True))
    remarks = ("what follows holds for this state alone: a part that is out carries nothing of its own",)
    return WorkTable("One-way members and supports in this case", ("part", "state"), rows, remarks)


def _varying(frame: Frame, system: System) -> WorkTable:
    """Flexibilities of stepped and tapered members as simple beams; stiffness and carry-over with their connections."""
    names, k, v = list(frame.members), system.coefficients.stiffness, flexibility(frame)
    rows = []
    for m, *turns in zip(v.member.tolist(), v.near.tolist(), v.cross.tolist(), v.far.tolist(), strict=True):
        near, cross, far = float(k[m, 0, 0]), float(k[m, 0, 1]), float(k[m, 1, 1])
        over = [cross / own if own else None for own in (near, far)]
        rows.append((names[m], *turns, near, over[0], far, over[1]))
    remarks = (
        "f: end rotations of the simple beam per end moment, by integrals of (1 - x/l)^2/EI, -(1 - x/l)(x/l)/EI and "
        "(x/l)^2/EI between the faces, shear flexibility added where it counts",
        "k: end moment per rotation of that end, the other one held; c: carry-over to the other end",
    )
    columns = ("member", "f11", "f12", "f22", "k from", "c from", "k to", "c to")
    return WorkTable("Stepped and tapered members", columns, tuple(rows), remarks)


def _slope_deflection(frame: Frame, system: System, fixed: Floats) -> WorkTable:
    k = system.coefficients.stiffness
    rows = []
    for m, member in enumerate(frame.members.values()):
        i, j = member.joint_from, member.joint_to
        for end, joint in ((0, i), (1, j)):
            own, other, chord = k[m, end, 0], k[m, end, 1], k[m, end, 0] + k[m, end, 1]
            terms = [(own, f"θ({i})"), (other, f"θ({j})"), (-chord, f"ψ({member.name})")]
            rows.append((f"M {member.name} at {joint}", _sum(terms, float(fixed[m, end]))))
    remarks = (
        "θ: rotation of a joint, clockwise, rad; ψ: rotation of the chord between the faces, clockwise, rad",
        "ψ = -(movement across at the `to` face - the same at the `from` face) / l",
    )
    return WorkTable("Slope-deflection equations", ("end moment", "equation"), tuple(rows), remarks)


def _joint_equations(frame: Frame, system: System, solution: Solution) -> WorkTable:
    names = _unknown_names(frame)
    matrix = system.matrix.tocsr()
    right = matrix @ solution.shift[system.free, 0]
    rows = []
    for row, unknown in enumerate(system.free.tolist()):
        entries = matrix[row]
        terms = [(float(v), names[system.free[c]]) for c, v in zip(entries.indices, entries.data, strict=True)]
        rows.append((_equation_name(names[unknown]), f"{_sum(terms)} = {_number(float(right[row]))}"))
    remarks = ["A held direction has no equation; a support spring stands in the coefficient of its own unknown"]
    if system.rigid.any():
        remarks.append(
            "Members are axially rigid: a large coefficient stands for their length being kept, corrected in rounds "
            "until no elongation remains"
        )
    if frame.ties:
        remarks.append("Joints are tied: a large coefficient stands for their moving together, corrected in the same way")
    return WorkTable("Joint and translation equations", ("equation", "sum"), tuple(rows), tuple(remarks))


def _unknowns(frame: Frame, system: System, solution: Solution) -> WorkTable:
    names = _unknown_names(frame)
    held = frame.support_table.stiffness.ravel() == HELD
    shift = solution.shift[:, 0]
    solved = set(system.free.tolist())
    rows = tuple(
        (names[k], float(shift[k]), "support" if held[k] else "solved")
        for k in range(len(names))
        if k in solved or (held[k] and shift[k] != 0.0)
    )
    remarks = (f"lengths in {frame.units.length}, rotations in rad",)
    return WorkTable("Displacements", ("unknown", "value", ""), rows, remarks)


def _end_moments(frame: Frame, solution: Solution, study: Study) -> WorkTable:
    ends = solution.case_answer(0, study.undetermined).ends
    rows = []
    for m, member in enumerate(frame.members.values()):
        for end, joint in ((0, member.joint_from), (1, member.joint_to)):
            axial, shear, moment = (None if np.isnan(v) else float(v) for v in ends[m, end])
            rows.append((member.name, joint, axial, shear, moment))
    return WorkTable("End actions", ("member", "at", "axial", "shear", "moment"), tuple(rows))


def _unknown_names(frame: Frame) -> list[str]:
    turned = frame.support_table.sin != 0.0
    names = []
    for k, joint in enumerate(frame.joints):
        axes = ("x'", "y'") if turned[k] else ("x", "y")
        names += [f"δ{axes[0]}({joint})", f"δ{axes[1]}({joint})", f"θ({joint})"]
    return names


def _equation_name(unknown: str) -> str:
    kind, joint = unknown.split("(", 1)
    word = "moments" if kind == "θ" else f"forces along {kind[1:]}"
    return f"{word} at {joint[:-1]}"


def _sum(terms: list[tuple[float, str]], constant: float = 0.0) -> str:
    shown = [(v, n) for v, n in terms if v != 0.0]
    parts = [f"{'-' if v < 0 else '+'} {_number(abs(v))} {n}" for v, n in shown[:MOST_TERMS]]
    if len(shown) > MOST_TERMS:
        parts.append(f"+ ... {len(shown) - MOST_TERMS} more")
    if constant:
        parts.append(f"{'-' if constant < 0 else '+'} {_number(abs(constant))}")
    text = " ".join(parts) or "0"
    return text[2:] if text.startswith("+ ") else text


def _number(value: float) -> str:
    return f"{value:.5g}"
