"""The equations of one case with their numbers, for a reviewer who follows by hand."""

from __future__ import annotations

import numpy as np

from crosscheck.answer import WorkTable
from crosscheck.frame.kinematics import Study
from crosscheck.frame.loads import load_table
from crosscheck.frame.model import HELD, Floats, Frame
from crosscheck.opinions.slope_deflection.members import fixed_ends
from crosscheck.opinions.slope_deflection.system import Solution, System

MOST_TERMS = 10
"""Terms printed of one joint equation; a longer one says how many more there are."""


def equations(frame: Frame, study: Study, name: str) -> list[WorkTable]:
    """Members, slope-deflection equations, joint equations, their solution and the end moments of case `name`."""
    system = System(frame)
    table = load_table(frame, name)
    solution = system.solve([table])
    fixed = fixed_ends(frame, table, system.coefficients.stiffness).moments
    return [
        _members(frame, system, fixed),
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
    remarks = (
        "s = EI / l with l between the rigid zones; a and b multiply s: 4 and 2 for a plain member, 3 at the stiff "
        "end of one hinged at the other",
        "FEM: fixed-end moments at the faces, clockwise on the member positive",
    )
    columns = ("member", "s = EI/l", "a from", "b", "a to", "FEM from", "FEM to")
    return WorkTable("Members: stiffness and fixed-end moments", columns, rows, remarks)


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
