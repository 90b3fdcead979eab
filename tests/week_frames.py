"""Random frames of the checking week: random frames (tests/random_frames.py) to which its grammar is added, the same for
the same seed.

Each week feature is drawn on its own with the probability in WEEK; what is drawn stays unless the frame's own study
refuses it (a tie that parts a settlement, an axially rigid one-way member), or ties and rigid members all but contradict
each other (joints tied along a rigid member that is level but for a ten-thousandth: beyond the README's limits of
precision, where slope-deflection abstains): then the same seed is drawn again. A frame keeps its one-way parts only
where it can stand without all of them, so that a settled state is known to exist.
"""

from __future__ import annotations

import json
import tomllib
from dataclasses import replace
from functools import lru_cache
from random import Random
from typing import Any

import numpy as np

from crosscheck.frame.kinematics import SINGULAR, AxialRedundancy, study
from crosscheck.frame.model import Frame
from crosscheck.frame.reader import read_frame_text
from crosscheck.problems import UnusableInput
from tests.random_frames import random_frame_text

WEEK = {
    "profile": 0.5, "taper": 0.5, "tapered piece": 0.3, "state": 0.6, "state of springs": 0.5, "lean": 0.4,
    "lean in a case": 0.2, "pattern": 0.35, "exclusive": 0.25, "envelope": 0.4, "tie": 0.35, "skew tie": 0.15,
    "rigid member": 0.35, "one-way member": 0.35, "one-way support": 0.2,
}  # fmt: skip
"""Probability that a frame has a week feature."""
Data = dict[str, Any]
NEARLY = 1e-3
"""Length for length: how independent what ties and rigid members forbid must be."""


@lru_cache(maxsize=32)
def week_frame(seed: int) -> Frame:
    return read_frame_text(week_text(seed))


def week_text(seed: int) -> str:
    """The frame file of a seed: the first of its draws that can be used."""
    for attempt in range(60):
        text = written(_drawn(seed, attempt))
        try:
            frame = read_frame_text(text)
            if frame.one_way:
                # Rods and props out, the frame must stand: then a settled state exists.
                out = frozenset((s.joint, axis) for s in frame.supports.values() for axis in "xy"
                                if getattr(s, f"{axis}_only"))  # fmt: skip
                study(replace(frame, out_members=frozenset(m for m in frame.members if frame.members[m].only),
                              out_supports=out))  # fmt: skip
            for name in frame.names:
                study(frame.under(name))
        except UnusableInput:
            continue
        if not _all_but_redundant(frame):
            return text
    raise AssertionError(f"seed {seed} makes no usable frame")


def _all_but_redundant(frame: Frame) -> bool:
    """Whether what ties and rigid members forbid is independent by less than NEARLY: neither redundant nor sound."""
    redundancy = AxialRedundancy(frame)
    if not redundancy.any:
        return False
    values = np.linalg.svd(redundancy.free.toarray(), compute_uv=False)
    return bool(((values > SINGULAR * values.max(initial=0.0)) & (values < NEARLY)).any())


def week_features(frame: Frame) -> set[str]:
    """What of the week's grammar a frame uses."""
    pieces = [p for m in frame.members.values() for p in m.pieces]
    has = {
        "stepped": any(p.first == p.last for p in pieces), "tapered": any(p.first != p.last for p in pieces),
        "state of stiffness": any(c.stiffness for c in frame.combinations.values()),
        "lean": any(c.lean for c in frame.combinations.values()),
        "lean in a case": any(type(load).__name__ == "Lean" for c in frame.cases.values() for load in c.loads),
        "pattern": bool(frame.patterns), "either-or": bool(frame.exclusive), "envelope": bool(frame.envelopes),
        "tie": bool(frame.ties), "one member rigid": any(m.axial for m in frame.members.values()),
        "one-way member": any(m.only for m in frame.members.values()),
        "one-way support": any(s.x_only or s.y_only for s in frame.supports.values()),
    }  # fmt: skip
    return {name for name, there in has.items() if there}


# --- drawing


def _drawn(seed: int, attempt: int) -> Data:
    r = Random(f"week {seed} {attempt}")
    data: Data = tomllib.loads(random_frame_text(seed))
    drawn = {name for name, chance in sorted(WEEK.items()) if r.random() < chance}
    _sections(r, data, drawn)
    _members(r, data, drawn)
    _ties(r, data, drawn)
    if "one-way support" in drawn:
        _one_way_support(r, data)
    _loads(r, data, drawn)
    return data


def _sections(r: Random, data: Data, drawn: set[str]) -> None:
    """A deeper fellow for every section: I, A and shear area by powers of the depth such as sections have."""
    for name, section in list(data["sections"].items()):
        depth, powers = r.uniform(1.2, 2.5), {"I": r.uniform(2.0, 3.0), "A": r.uniform(0.0, 1.0), "shear_area": 1.0}
        fellow = {key: _times(value, depth ** powers.get(key, 1.0)) for key, value in section.items()}
        data["sections"][f"{name} deep"] = fellow


def _times(value: float | str, factor: float) -> float | str:
    if isinstance(value, str):
        number, _, unit = value.partition(" ")
        return f"{float(number) * factor!r} {unit}"
    return value * factor


def _members(r: Random, data: Data, drawn: set[str]) -> None:
    elastic = all("A" in section for section in data["sections"].values())
    if elastic and {"rigid member", "one-way member"} & drawn:
        data.setdefault("analysis", {})["axial"] = "elastic"
    for member in data["members"].values():
        light, deep = member["section"], f"{member['section']} deep"
        kind = r.choice(["profile", "taper", "tapered piece", "", ""])
        if kind in drawn and member.get("hinge") != "both":
            del member["section"]
            if kind == "taper":
                member["taper"] = r.choice([[light, deep], [deep, light]])
            elif kind == "profile":
                a, b = sorted((r.uniform(5, 45), r.uniform(55, 95)))
                member["profile"] = [[deep, f"{a!r}%"], [light, f"{b!r}%"], [r.choice([light, deep]), "100%"]]
            else:
                a = r.uniform(10, 40)
                member["profile"] = [[[deep, light], f"{a!r}%"], [light, f"{100 - a!r}%"], [[light, deep], "100%"]]
        elif "rigid member" in drawn and elastic and r.random() < 0.3:
            member["axial"] = "rigid"
        if "one-way member" in drawn and member.get("hinge") == "both" and elastic and "axial" not in member:
            member["only"] = r.choice(["tension", "compression"])
    if "one-way member" in drawn and elastic:
        _rods(r, data)


def _rods(r: Random, data: Data) -> None:
    """One to three further rods between joints that nothing joins yet."""
    ends = {frozenset((m.get("from", name.partition("-")[0]), m.get("to", name.partition("-")[2])))
            for name, m in data["members"].items()}  # fmt: skip
    joints = [joint for joint in data["joints"] if joint != "alone"]
    pairs = [(a, b) for k, a in enumerate(joints) for b in joints[k + 1 :] if frozenset((a, b)) not in ends]
    for k, (a, b) in enumerate(r.sample(pairs, min(len(pairs), r.randint(1, 3)))):
        data["members"][f"rod {k + 1}"] = {
            "from": a, "to": b, "section": r.choice(list(data["sections"])), "material": r.choice(list(data["materials"])),
            "hinge": "both", "only": r.choice(["tension", "compression"]),
        }  # fmt: skip


def _ties(r: Random, data: Data, drawn: set[str]) -> None:
    free = [joint for joint in data["joints"] if joint not in data["supports"] and joint != "alone"]
    for feature, direction in (("tie", r.choice(["x", "y"])), ("skew tie", r.uniform(-80, 80))):
        if feature in drawn and len(free) >= 2:
            joints = r.sample(free, min(len(free), r.randint(2, 3)))
            data.setdefault("ties", {})[feature] = {"joints": joints, "direction": direction}


def _one_way_support(r: Random, data: Data) -> None:
    """A further support that can only push (or pull) up, at a joint without one."""
    free = [joint for joint in data["joints"] if joint not in data["supports"] and joint != "alone"]
    if free:
        data["supports"][r.choice(free)] = {r.choice("yyx"): r.choice(["push", "pull"])}


def _loads(r: Random, data: Data, drawn: set[str]) -> None:
    cases = list(data.get("loads", {}))
    if not cases:
        return
    combinations = data.setdefault("combinations", {})
    factors = {case: round(r.uniform(0.5, 1.6), 2) for case in cases}
    if "lean in a case" in drawn:
        data["loads"][cases[0]].setdefault("apply", []).append({"lean": r.choice(["0.4%", 0.01, -0.005])})
    if "pattern" in drawn:
        members = r.sample(list(data["members"]), min(len(data["members"]), 4))
        data["patterns"] = {r.choice(cases): {"spans": [[m] for m in members], "arrangements": r.choice(
            [["all", "alternate"], ["adjacent"], ["all", "alternate", "adjacent"]])}}  # fmt: skip
    if "exclusive" in drawn and len(cases) > 1:
        data["exclusive"] = [r.sample(cases, 2)]
    if "state" in drawn:
        data["stiffness"] = {"cracked": _state(r, data, drawn)}
        combinations["cracked one"] = {**factors, "stiffness": "cracked"}
    if "lean" in drawn:
        combinations["leaning one"] = {**factors, "lean": r.choice([0.005, -0.003, "1%"])}
    if "envelope" in drawn:
        combinations["plain one"] = factors
        data["envelopes"] = {"all of them": ["*one*"]}


def _state(r: Random, data: Data, drawn: set[str]) -> Data:
    state: Data = {}
    for section in r.sample(list(data["sections"]), 2):
        state[f"section {section}"] = {"I": r.uniform(0.25, 0.8), **({"A": 0.9} if r.random() < 0.3 else {})}
    member = r.choice(list(data["members"]))
    state[f"member {member}"] = {"I": r.uniform(0.3, 0.7), "E": r.uniform(0.4, 0.9)}
    if r.random() < 0.5:
        state[f"material {r.choice(list(data['materials']))}"] = {"E": r.uniform(0.3, 0.9)}
    if "state of springs" in drawn:
        for joint, support in data["supports"].items():
            springs = [k for k in ("x", "y", "rotation") if isinstance(support, dict) and _is_spring(support.get(k))]
            if springs:
                state[f"support {joint}"] = {key: r.uniform(0.3, 3.0) for key in springs}
    return state


def _is_spring(value: object) -> bool:
    return value is not None and value not in ("held", "free", "push", "pull")


# --- writing


def written(data: Data) -> str:
    """TOML of a frame's data: tables of tables, inline below."""
    head = [f"{_key(k)} = {_value(v)}" for k, v in data.items() if not isinstance(v, dict)]
    for key, table in data.items():
        if isinstance(table, dict):
            head += ["", f"[{_key(key)}]", *(f"{_key(k)} = {_value(v)}" for k, v in table.items())]
    return "\n".join(head) + "\n"


def _key(key: str) -> str:
    return json.dumps(key, ensure_ascii=False)


def _value(value: object) -> str:
    if isinstance(value, dict):
        return "{ " + ", ".join(f"{_key(k)} = {_value(v)}" for k, v in value.items()) + " }"
    if isinstance(value, list):
        return "[" + ", ".join(map(_value, value)) + "]"
    if isinstance(value, str):
        return json.dumps(value, ensure_ascii=False)
    return repr(value).lower() if isinstance(value, bool) else repr(value)
