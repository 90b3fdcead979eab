"""Pastes that must be undecided, because fewer than three values fix a choice or the paste leaves one open altogether.

Each recipe makes one paste a frame of the thirty of tests.pastes_frames, or none where the frame's results do not allow it.
`python -m tests.pastes_undecided` prints how many there are by recipe, and every verdict that is not undecided.
"""

from __future__ import annotations

from collections import Counter
from collections.abc import Callable, Iterator

import numpy as np

from crosscheck.claims.read import read_claim_text
from crosscheck.compare.closing import close
from crosscheck.compare.differences import worst
from crosscheck.compare.tolerance import CLAIM
from crosscheck.problems import UnusableInput
from tests.pastes_frames import FRAMES, Known, known

LARGE = 0.1
"""Share of the case's largest value that a value must have to tell a sign or a unit by."""


def _units(k: Known) -> tuple[str, str]:
    u = k.frame.units
    return u.force, f"{u.force} {u.length}"


def _ends(k: Known, column: int, case: str = "dead") -> list[tuple[str, str, float]]:
    """(member, joint, value) of end actions that are large, in the README's signs."""
    ends = k.answers["slope-deflection"].cases[case].ends
    most = float(np.abs(ends[:, :, column]).max())
    if most < 0.01 * k.judgements[case].scales.of(("axial", "shear", "moment")[column]):
        return []  # noise where nothing occurs
    return [
        (m.name, joint, float(ends[n, e, column]))
        for n, m in enumerate(k.frame.members.values()) for e, joint in enumerate((m.joint_from, m.joint_to))
        if abs(ends[n, e, column]) > LARGE * most
    ]  # fmt: skip


def _joints(k: Known, column: int, case: str = "wind") -> list[tuple[str, float]]:
    values = k.answers["slope-deflection"].cases[case].joints[:, column]
    most = np.abs(values).max()
    return [(j, float(v)) for j, v in zip(k.frame.joints, values, strict=True) if abs(v) > LARGE * most > 0]


def few_reversed(k: Known, column: int, count: int) -> str:
    """One or two end values with the other sign."""
    rows = _ends(k, column)[:count]
    if len(rows) < count:
        return ""
    head = f"{'NVM'[column]} [{_units(k)[column == 2]}]"
    return f"Load case: dead\nMember\tEnd\t{head}\n" + "".join(f"{m}\t{j}\t{-v:.6g}\n" for m, j, v in rows)


def few_in_another_unit(k: Known, count: int) -> str:
    """One or two displacements in thousandths of the frame's unit, or a thousand of them, with no unit stated."""
    factor = 1000.0 if k.frame.units.length == "m" else 0.001 if k.frame.units.length == "mm" else 304.8
    rows = _joints(k, 0)[:count]
    return "Load case: wind\nJoint displacements\nJoint\tdx\n" + "".join(f"{j}\t{factor * v:.6g}\n" for j, v in rows)


def few_displacements_down(k: Known, count: int) -> str:
    rows = _joints(k, 1, "dead")[:count]
    unit = k.frame.units.length
    head = f"Load case: dead\nJoint displacements\nJoint\tdy [{unit}]\n"
    return head + "".join(f"{j}\t{-v:.6g}\n" for j, v in rows) if rows else ""


def _whole(k: Known, case: str, sign: float = 1.0, digits: int = 6) -> list[str]:
    force, moment = _units(k)
    rows = [f"Member\tEnd\tN [{force}]\tV [{force}]\tM [{moment}]"]
    ends = k.answers["slope-deflection"].cases[case].ends
    for n, m in enumerate(k.frame.members.values()):
        for e, joint in enumerate((m.joint_from, m.joint_to)):
            rows.append("\t".join([m.name, joint, *(f"{sign * v:.{digits}g}" for v in ends[n, e])]))
    return rows


def two_cases_fit(k: Known) -> str:
    """No case is named, and a load case and a combination of it alone have the same results."""
    return "\n".join(_whole(k, "dead")) if "service" in k.frame.names else ""


def no_case_fits(k: Known) -> str:
    """No case is named, and values of two cases are mixed."""
    dead, wind = _whole(k, "dead"), _whole(k, "wind")
    return "\n".join([*dead[:4], *wind[4:]])


def unknown_case(k: Known) -> str:
    return "Load case: LC9 storm\n" + "\n".join(_whole(k, "dead"))


def end_not_said(k: Known) -> str:
    """One value a member, of which it is not said which end it is for."""
    rows = {m: v for m, _, v in _ends(k, 2)}
    return f"Load case: dead\nMember\tM [{_units(k)[1]}]\n" + "".join(f"{m}\t{v:.6g}\n" for m, v in rows.items())


def two_columns_alike(k: Known) -> str:
    unit = _units(k)[1]
    rows = [f"{m}\t{j}\t{v:.6g}\t{1.5 * v:.6g}" for m, j, v in _ends(k, 2)]
    return f"Load case: dead\nMember\tEnd\tM [{unit}]\tM [{unit}]\n" + "\n".join(rows)


def member_not_said(k: Known) -> str:
    """Values along a member that is not named."""
    x = np.linspace(0, k.frame.member_table.length[0], 5)
    values = k.answers["slope-deflection"].spans.along("dead", np.zeros(5, dtype=int), x, np.where(x > 0, -1, 1))
    rows = [f"{a:.6g}\t{v[1]:.6g}\t{v[2]:.6g}" for a, v in zip(x, values, strict=True)]
    return f"Load case: dead\nx\tV [{_units(k)[0]}]\tM [{_units(k)[1]}]\n" + "\n".join(rows)


def moments_at_joints(k: Known) -> str:
    """Two moments at joints where members meet, not said to be of members or reactions."""
    rows = [(j, v) for _, j, v in _ends(k, 2) if j not in k.frame.supports or k.frame.supports[j].rotation == 0][:2]
    return f"Load case: dead\nJoint\tM [{_units(k)[1]}]\n" + "".join(f"{j}\t{v:.6g}\n" for j, v in rows) if rows else ""


def foreign_member(k: Known) -> str:
    """All right, and a row for a member that the frame lacks."""
    return "Load case: dead\n" + "\n".join([*_whole(k, "dead"), "Tie-99\tZ\t1.0\t2.0\t3.0"])


def spoilt_value(k: Known) -> str:
    """All right, but for one value that was too wide for its column."""
    rows = _whole(k, "dead")
    cells = rows[3].split("\t")
    rows[3] = "\t".join([*cells[:4], "*******"])
    return "Load case: dead\n" + "\n".join(rows)


def every_second_member_turned(k: Known) -> str:
    """All sizes right, and the moments of every second member with the other sign: no convention and no one's error."""
    large = {m for m, _, _ in _ends(k, 2)}
    if len(large & set(list(k.frame.members)[1::2])) < 2:
        return ""  # one member that needs another sign is an error of that member
    rows = _whole(k, "dead")
    for n in range(1, len(rows)):
        if (n - 1) // 2 % 2:
            cells = rows[n].split("\t")
            rows[n] = "\t".join([*cells[:4], f"{-float(cells[4]):.6g}"])
    return "Load case: dead\n" + "\n".join(rows)


RECIPES: dict[str, Callable[[Known], str]] = {
    **{f"{count} of {name} reversed": lambda k, c=column, n=count: few_reversed(k, c, n)  # type: ignore[misc]
       for column, name in enumerate(("axial", "shear", "moment")) for count in (1, 2)},
    **{f"{count} in another unit": lambda k, n=count: few_in_another_unit(k, n) for count in (1, 2)},  # type: ignore[misc]
    **{f"{count} downward": lambda k, n=count: few_displacements_down(k, n) for count in (1, 2)},  # type: ignore[misc]
    "two cases fit": two_cases_fit, "no case fits": no_case_fits, "unknown case": unknown_case,
    "end not said": end_not_said, "two columns alike": two_columns_alike, "member not said": member_not_said,
    "moments at joints": moments_at_joints, "foreign member": foreign_member, "spoilt value": spoilt_value,
    "every second member turned": every_second_member_turned,
}  # fmt: skip


def verdict(k: Known, text: str) -> tuple[str, str]:
    """The verdict as `verify` gives it, and the first reason for it."""
    try:
        reading = read_claim_text(text, k.names)
    except UnusableInput as refused:
        return "refused", str(refused)
    closed = close(reading, k.frame, k.answers, None, CLAIM)
    cases = k.comparison.judge(closed)
    verdicts = [c.verdict for c in cases]
    if closed.undecided or closed.foreign or not sum(c.compared for c in cases):
        verdicts.append("undecided")
    if closed.reversed_load:
        verdicts.append("disagree")
    return worst(verdicts), next(iter(closed.undecided), "")


def pastes(recipe: str, frames: range = range(FRAMES)) -> Iterator[tuple[int, str]]:
    """(frame, text) of every paste that there is of a recipe."""
    for k in frames:
        if (text := RECIPES[recipe](known(k))).count("\n") > 1:
            yield k, text


def main() -> None:
    counts: Counter[tuple[str, str]] = Counter()
    for name in RECIPES:
        for k, text in pastes(name):
            found, why = verdict(known(k), text)
            counts[name, found] += 1
            if found != "undecided":
                print(f"{name}, frame {k}: {found} {why}")
    for (name, found), n in sorted(counts.items()):
        print(f"{name:<30} {found:<10} {n:>4}")
    print(f"{sum(counts.values())} in all, {sum(n for (_, f), n in counts.items() if f == 'undecided')} undecided")


if __name__ == "__main__":
    main()
