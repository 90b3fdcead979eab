"""A small frame and its claims, for tests of everything that needs one."""

from __future__ import annotations

from pathlib import Path

SHED = """\
title = "Tool shed"
units = "kN m"

[materials.steel]
E = "210 GPa"
alpha = 12e-6
density = "7850 kg/m^3"

[sections.post]
I = "8360 cm^4"
A = "53.8 cm^2"
shear_area = "25 cm^2"
depth = "300 mm"

[joints]
A = [0, 0]
B = [0, 4.2]
C = [6.5, 5.0]
D = [6.5, 0]

[members]
"A-B" = { section = "post", material = "steel" }
rafter = { from = "B", to = "C", section = "post", material = "steel", hinge = "to" }
"D-C" = { section = "post", material = "steel" }

[supports]
A = "fixed"
D = { x = "held", y = "held", rotation = "4500 kN m/rad" }

[loads.dead]
apply = [
  { member = "rafter", uniform = 8.5, direction = "down" },
  { joint = "B", force = 12.0, direction = "right" },
  { self_weight = 1.0 },
]

[loads.wind]
apply = [{ member = "A-B", uniform = 3.0, direction = "right" }]

[combinations]
strength = { dead = 1.35, wind = 1.5 }
"""


def claim_text(frame_path: Path, case: str = "dead", digits: int = 5, variant: str = "") -> str:
    """A right claim for a case of a frame file: member ends and reactions by the first opinion, rounded."""
    from crosscheck import check

    frame = check.read(frame_path, variant)
    answer = check.ask(frame, (case,)).answers["slope-deflection"].cases[case]
    units = f"{frame.units.force}", f"{frame.units.force}{frame.units.length}"
    lines = [f"Load case: {case}", "", f"member,joint,axial ({units[0]}),shear ({units[0]}),moment ({units[1]})"]
    for m, member in enumerate(frame.members.values()):
        for end, joint in enumerate((member.joint_from, member.joint_to)):
            lines.append(",".join([member.name, joint, *(f"{v:.{digits}g}" for v in answer.ends[m, end])]))
    lines += ["", f"support,fx ({units[0]}),fy ({units[0]}),moment ({units[1]})"]
    for joint in frame.supports:
        row = answer.reactions[frame.joint_index[joint]]
        lines.append(",".join([joint, *(f"{v:.{digits}g}" for v in row)]))
    return "\n".join(lines) + "\n"


def write_shed(folder: Path, name: str = "shed", text: str = SHED, claim: bool = True) -> Path:
    """The frame and, beside it, a right claim on its dead load."""
    path = folder / f"{name}.toml"
    path.write_text(text, encoding="utf-8")
    if claim:
        (folder / f"{name}.claim.txt").write_text(claim_text(path), encoding="utf-8")
    return path
