"""The idealisation's effect: axial deformation, shear deformation and order, each changed alone and set side by side.

A checker sees so how much of a difference between two analyses is method. By the first opinion alone: the opinions are
compared elsewhere.
"""

from __future__ import annotations

import importlib
from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np

from crosscheck.answer import Answer, CaseAnswer
from crosscheck.check import OPINIONS
from crosscheck.frame.kinematics import study
from crosscheck.frame.model import Floats, Frame
from crosscheck.frame.needs import with_analysis
from crosscheck.problems import UnusableInput


@dataclass(frozen=True, slots=True)
class Variant:
    """One idealisation: what it changes ("as stated" for none), its answers, and why it has none."""

    title: str
    cases: Mapping[str, CaseAnswer]
    why_not: str = ""


@dataclass(frozen=True, slots=True)
class KeyValue:
    """One value under every variant: where the stated idealisation has its greatest; NaN where a variant gives none.

    most: largest change of any value of its kind in the case, by variant, as a share of the greatest.
    """

    case: str
    quantity: str
    place: str
    values: tuple[float, ...]
    most: tuple[float, ...]


def variants(frame: Frame, names: Sequence[str] | None = None) -> list[Variant]:
    """The frame as stated, then with each of axial, shear and order the other way."""
    a = frame.analysis
    axial = "rigid" if a.axial == "elastic" else "elastic"
    shear = "elastic" if a.shear == "rigid" else "rigid"
    order = 2 if a.order == 1 else 1
    return [
        _variant(frame, "as stated", names),
        _variant(frame, f"axial {axial}", names, axial=axial),
        _variant(frame, f"shear {shear}", names, shear=shear),
        _variant(frame, f"order {order}", names, order=order),
    ]


def _variant(
    frame: Frame, title: str, names: Sequence[str] | None, axial: str | None = None, shear: str | None = None,
    order: int | None = None,
) -> Variant:  # fmt: skip
    try:
        changed = with_analysis(frame, axial, shear, order) if axial or shear or order else frame
        said = importlib.import_module(OPINIONS["slope-deflection"]).opine(changed, study(changed), names)
    except UnusableInput as error:
        return Variant(title, {}, error.problems[0].says)
    if not isinstance(said, Answer):
        return Variant(title, {}, said.why)
    return Variant(title, said.cases, "; ".join(f"{case}: {why}" for case, why in said.silent.items()))


def key_values(frame: Frame, found: Sequence[Variant]) -> list[KeyValue]:
    """For each case the greatest end moment, displacement and reaction of the first variant, under every variant."""
    members, joints = list(frame.members.values()), list(frame.joints)
    out = []
    for case, stated in found[0].cases.items():
        others = [v.cases.get(case) for v in found]
        ends = [None if c is None else c.ends[:, :, 2] for c in others]
        moves = [None if c is None else c.joints[:, :2] for c in others]
        pulls = [None if c is None else c.reactions[:, :2] for c in others]
        m, end = _greatest(stated.ends[:, :, 2])
        joint = members[m].joint_to if end else members[m].joint_from
        out.append(_key(case, "end moment", f"{members[m].name} at {joint}", ends, (m, end)))
        j, axis = _greatest(stated.joints[:, :2])
        out.append(_key(case, ("dx", "dy")[axis], f"joint {joints[j]}", moves, (j, axis)))
        j, axis = _greatest(stated.reactions[:, :2])
        out.append(_key(case, ("fx", "fy")[axis], f"support {joints[j]}", pulls, (j, axis)))
    return out


def _greatest(values: Floats) -> tuple[int, int]:
    row, column = np.unravel_index(int(np.argmax(np.abs(np.nan_to_num(values)))), values.shape)
    return int(row), int(column)


def _key(
    case: str, quantity: str, place: str, tables: Sequence[Floats | None], at: tuple[int, int]
) -> KeyValue:
    stated = tables[0]
    assert stated is not None
    peak = _peak(stated)
    values, most = [], []
    for table in tables:
        values.append(float("nan") if table is None else float(table[at]))
        change = float("nan") if table is None else _peak(table - stated)
        most.append(change / peak if peak > 0 else 0.0)
    return KeyValue(case, quantity, place, tuple(values), tuple(most))


def _peak(values: Floats) -> float:
    return float(np.abs(np.nan_to_num(values)).max(initial=0.0))
