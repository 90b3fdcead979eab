"""The thirty frames whose results tests.pastes prints, with the answers that it prints."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from functools import cache
from random import Random
from typing import Any

import numpy as np

from crosscheck.answer import Answer
from crosscheck.claims.reading import FrameNames
from crosscheck.compare.claim import ClaimComparison
from crosscheck.compare.opinions import CaseJudgement, Comparison
from crosscheck.compare.tolerance import CLAIM
from crosscheck.frame.kinematics import study
from crosscheck.frame.model import Frame
from crosscheck.frame.reader import read_frame_text
from crosscheck.opinions import moment_distribution, slope_deflection

FRAMES = 30
ZONED = frozenset({6, 7, 8, 18, 19, 20})
"""Frames whose beams have rigid zones."""


def frame_text(k: int) -> str:
    """Frame k as a file: portals, grids, gables, beams and trusses with enough members and supports to fix any sign."""
    r = Random(f"frame {k}")
    shape = ("grid", "grid", "gable", "beam", "truss", "portals")[k % 6]
    joints, members, feet, roofs = _SHAPES[shape](r)
    style = k % 4
    names = {j: _joint_name(n, style) for n, j in enumerate(joints)}
    out = [f'title = "Frame {k}"', f'units = "{("kN m", "kN m", "N mm", "kip ft")[k % 4]}"', "[materials.s]"]
    out += ['E = "210 GPa"', "[sections.s]", 'I = "12000 cm^4"', 'A = "60 cm^2"', "[joints]"]
    unit = {0: "m", 1: "m", 2: "m", 3: "m"}[k % 4]
    out += [f'"{names[j]}" = ["{x} {unit}", "{y} {unit}"]' for j, (x, y) in joints.items()]
    out.append("[members]")
    keys = []
    for n, (a, b) in enumerate(members):
        key = _member_name(n, names[a], names[b], style)
        keys.append(key)
        zones = ', rigid_from = "250 mm", rigid_to = "0.2 m"' if k in ZONED and n in roofs else ""
        out.append(f'"{key}" = {{ from = "{names[a]}", to = "{names[b]}", section = "s", material = "s"{zones} }}')
    out.append("[supports]")
    out += [
        f'"{names[j]}" = "{"fixed" if shape in ("grid", "portals") or n == 0 else "pinned"}"' for n, j in enumerate(feet)
    ]
    out += ["[loads.dead]", "apply = ["]
    out += [f'  {{ member = "{keys[m]}", uniform = "{r.uniform(8, 20):.2f} kN/m", direction = "down" }},' for m in roofs]
    out += [f'  {{ member = "{keys[roofs[0]]}", force = "{r.uniform(15, 30):.1f} kN", at = "35%", direction = "down" }},']
    free = [j for j in joints if j not in feet]
    out += ["]", "[loads.wind]", "apply = ["]
    out += [f'  {{ joint = "{names[j]}", force = "{r.uniform(8, 25):.1f} kN", direction = {r.choice([0, 0, 20, 160])} }},'
            for j in (r.sample(free, min(3, len(free))) if free else [])]  # fmt: skip
    out += [f'  {{ member = "{keys[0]}", uniform = "{r.uniform(3, 6):.2f} kN/m", direction = "across" }},']
    out += [f'  {{ member = "{keys[-1]}", force = "{r.uniform(5, 9):.2f} kN", at = "60%", direction = -60 }},', "]"]
    if k % 3 == 0:
        out += ["[combinations]", "strength = { dead = 1.35, wind = 1.5 }"]
    if k % 3 == 1:
        out += ["[combinations]", "service = { dead = 1.0 }"]
    return "\n".join(out) + "\n"


def _grid(r: Random) -> tuple[Any, ...]:
    bays, storeys = r.choice([2, 3]), r.choice([1, 2])
    joints, members, roofs = {}, [], []
    for i in range(bays + 1):
        for s in range(storeys + 1):
            joints[i, s] = (round(i * 5.5 + r.uniform(-0.3, 0.3), 2), round(s * 3.4, 2))
    for i in range(bays + 1):
        members += [((i, s), (i, s + 1)) for s in range(storeys)]
    for s in range(1, storeys + 1):
        for i in range(bays):
            roofs.append(len(members))
            members.append(((i, s), (i + 1, s)))
    return joints, members, [(i, 0) for i in range(bays + 1)], roofs


def _portals(r: Random) -> tuple[Any, ...]:
    joints = {j: (round(x + r.uniform(-0.2, 0.2), 2), y) for j, (x, y) in
              {0: (0, 0), 1: (0, 4), 2: (6, 4.5), 3: (6, 0), 4: (11, 4), 5: (11, 0.5)}.items()}  # fmt: skip
    return joints, [(0, 1), (1, 2), (3, 2), (2, 4), (4, 5)], [0, 3, 5], [1, 3]


def _gable(r: Random) -> tuple[Any, ...]:
    joints = {
        0: (0, 0),
        1: (0, 4),
        2: (5, round(r.uniform(5, 6.5), 2)),
        3: (10, 4),
        4: (10, 0),
        5: (15, 5.2),
        6: (20, 4),
        7: (20, 0),
    }
    return joints, [(0, 1), (1, 2), (2, 3), (4, 3), (3, 5), (5, 6), (6, 7)], [0, 4, 7], [1, 2, 4, 5]


def _beam(r: Random) -> tuple[Any, ...]:
    spans = r.choice([3, 4, 5])
    x = np.cumsum([0, *[round(r.uniform(4, 7), 1) for _ in range(spans)]])
    joints = {i: (round(float(x[i]), 2), 0) for i in range(spans + 1)}
    joints[spans + 1] = (round(float(x[-1]) + 1.5, 2), round(r.uniform(0.5, 1.5), 2))
    members = [(i, i + 1) for i in range(spans + 1)]
    return joints, members, list(range(spans + 1)), list(range(spans))


def _truss(r: Random) -> tuple[Any, ...]:
    n = r.choice([3, 4])
    h = round(r.uniform(1.8, 2.6), 2)
    joints: dict[Any, Any] = {("b", i): (3 * i, 0) for i in range(n + 1)} | {("t", i): (3 * i + 1.5, h) for i in range(n)}
    members = [(("b", i), ("b", i + 1)) for i in range(n)] + [(("t", i), ("t", i + 1)) for i in range(n - 1)]
    for i in range(n):
        members += [(("b", i), ("t", i)), (("t", i), ("b", i + 1))]
    return joints, members, [("b", 0), ("b", n), ("b", 1)], [n, n + 1]


_SHAPES: dict[str, Callable[[Random], tuple[Any, ...]]] = {
    "grid": _grid, "portals": _portals, "gable": _gable, "beam": _beam, "truss": _truss,
}  # fmt: skip


def _joint_name(n: int, style: int) -> str:
    return ("ABCDEFGHJKLMNPQRSTUVW"[n], str(n + 1), f"N{n + 1}", f"J{n + 1:02d}")[style]


def _member_name(n: int, a: str, b: str, style: int) -> str:
    return (f"{a}-{b}", str(n + 1), f"M{n + 1}", f"B{n + 1}")[style]


@dataclass(frozen=True)
class Known:
    """A frame with its opinions."""

    frame: Frame
    answers: dict[str, Answer]
    judgements: dict[str, CaseJudgement]
    comparison: ClaimComparison

    @property
    def names(self) -> FrameNames:
        return FrameNames.of(self.frame)


@cache
def known(k: int) -> Known:
    frame = read_frame_text(frame_text(k), f"frame{k}.toml")
    found = study(frame)
    answers = {
        "slope-deflection": slope_deflection.opine(frame, found),
        "moment-distribution": moment_distribution.opine(frame, found),
    }
    assert all(isinstance(a, Answer) for a in answers.values())
    comparison = Comparison(frame, answers)
    judgements = {name: comparison.judge(name) for name in frame.names}
    return Known(
        frame,
        answers,
        judgements,
        ClaimComparison(frame, {"slope-deflection": answers["slope-deflection"]}, judgements, CLAIM),
    )
