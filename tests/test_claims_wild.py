"""Printouts and mails as people write them, each right and read right; and the same with one value spoiled."""

from __future__ import annotations

import re
from functools import lru_cache

import numpy as np
import pytest

from crosscheck.compare.opinions import extremes
from crosscheck.frame.stations import stations
from tests.claim_frame import bent


def along(m: int, x: float, side: int) -> np.ndarray:
    """Axial, shear, moment, across of case dead."""
    return bent().answer.spans.along("dead", np.array([m]), np.array([x]), np.array([side]))[0]


@lru_cache(maxsize=1)
def wild() -> dict[str, tuple[str, int]]:
    """Name to text and how many values it gives."""
    k = bent()
    c, frame = k.answer.cases["dead"], k.frame
    members, lengths = list(frame.members.values()), frame.member_table.length
    out: dict[str, tuple[str, int]] = {}

    rows = ["Project 12-345   Frame analysis", "Load case: dead", ""]
    for m, member in enumerate(members):
        rows += [
            f"Member {member.name}   L = {lengths[m]:.2f} m",
            "    x        N        V        M",
            "  [m]     [kN]     [kN]    [kNm]",
        ]
        for t in (0, 0.25, 0.5, 0.75, 1):
            n, v, mm, _ = along(m, t * lengths[m], 1 if t < 1 else -1)
            rows.append(f"{t * lengths[m]:7.3f}{n:9.2f}{v:9.2f}{mm:9.2f}")
        rows.append("")
    out["a block of stations a member"] = "\n".join(rows), 75

    most = extremes(k.answer, "dead", stations(frame))
    rows = ["Results for dead", "Member | Value | N (kN) | V (kN) | M (kNm)", "---|---|---|---|---"]
    for m, member in enumerate(members):
        for word, i in (("max", 1), ("min", 0)):
            rows.append(f"{member.name} | {word} | " + " | ".join(f"{x:.2f}" for x in most[m, i, :3]))
    out["max and min in rows"] = "\n".join(rows), 30

    rows = ["Combination dead", "              ------ End i ------    ------ End j ------"]
    rows.append("Member           N      V      M        N      V      M")
    for m, member in enumerate(members):
        a, b = c.ends[m]
        rows.append(f"{member.name:10s}{a[0]:9.2f}{a[1]:7.2f}{-a[2]:8.2f}{b[0]:9.2f}{-b[1]:7.2f}{b[2]:8.2f}")
    out["heads in groups, hogging positive"] = "\n".join(rows), 30

    rows = ["case dead", "Support\tH\tV\tM", "\tkN\tkN\tkNm"]
    rows += ["\t".join([j, *(f"{x:.2f}" for x in c.reactions[frame.joint_index[j]] * (1, 1, -1))]) for j in frame.supports]
    out["H, V and M of supports"] = "\n".join(rows), 9

    rows = ["case dead", "Member\tx/L\tM [kNm]"]
    for m, member in enumerate(members):
        rows += [
            f"{member.name}\t{t}%\t{along(m, t / 100 * lengths[m], 1 if t < 100 else -1)[2]:.2f}" for t in (0, 50, 100)
        ]
    out["stations in percent"] = "\n".join(rows), 15

    rows = ["case dead", "Member,M_AB,M_BA"]
    rows += [f"{mb.name},{c.ends[m, 0, 2]:.2f},{c.ends[m, 1, 2]:.2f}" for m, mb in enumerate(members)]
    out["M_AB and M_BA in heads"] = "\n".join(rows), 10

    rows = ["case dead", "End moments, kNm"]
    for m, member in enumerate(members):
        i, j = member.joint_from, member.joint_to
        rows += [f"M_{i}{j}  {c.ends[m, 0, 2]:.2f}", f"M_{j}{i}  {c.ends[m, 1, 2]:.2f}"]
    out["a list of M_AB"] = "\n".join(rows), 10

    rows = ["Hello Kim,", "please find the moments for dead below:", "", f"  A-B at A  {abs(c.ends[0, 0, 2]):.2f} kNm"]
    out["a mail"] = "\n".join([*rows, f"  A-B at B  {abs(c.ends[0, 1, 2]):.2f} kNm", "", "Regards, Jo"]), 2

    told = [f"Joint {j}: Rx = {c.reactions[n, 0]:.2f} kN, Ry = {c.reactions[n, 1]:.2f} kN" for j, n in (("A", 0), ("D", 3))]
    out["reactions in sentences"] = "\n".join(["case dead", *told]), 4

    rows = ["case dead", "Bar;Knot;N;Q;M", ";;kN;kN;kNm"]
    for m, member in enumerate(members):
        for e, j in enumerate((member.joint_from, member.joint_to)):
            rows.append(f"{member.name};{j};" + ";".join(f"{x:.2f}".replace(".", ",") for x in c.ends[m, e]))
    out["semicolons, decimal commas and a row of units"] = "\n".join(rows), 30

    rows = ["Member end forces, kN m, dead", "Member,Joint,N,V,M"]
    for m, member in enumerate(members):
        for e, j in enumerate((member.joint_from, member.joint_to)):
            rows.append(f"{member.name},{j}," + ",".join(f"{x:.2f}" for x in c.ends[m, e]))
    out["a title with commas above heads with commas"] = "\n".join(rows), 30
    out["a title that is units alone"] = "\n".join(["Forces, kN m", *rows[1:]]), 30
    return out


@pytest.mark.parametrize("name", sorted(wild()))
def test_read_right(name: str) -> None:
    text, values = wild()[name]
    verdict, closed, cases = bent().judge(text)
    assert verdict == "agree", (closed.undecided, closed.not_understood, closed.foreign)
    assert sum(c.compared for c in cases) == values


@pytest.mark.parametrize("name", sorted(wild()))
def test_a_spoiled_value_is_never_agreed_to(name: str) -> None:
    text, _ = wild()[name]
    numbers = re.findall(r"(?<![\w.])-?\d+[.,]\d\d(?!\d)", text)
    printed = max(numbers, key=lambda t: abs(float(t.replace(",", "."))))
    wrong = f"{float(printed.replace(',', '.')) * 1.31 + 1:.2f}".replace(".", "," if "," in printed else ".")
    spoiled = text.replace(printed, wrong, 1)
    assert spoiled != text
    assert bent().judge(spoiled)[0] != "agree"
