"""Changes that reach the whole frame, few enough to solve again for each: idealisation, zones, turned supports."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import replace
from functools import partial
from typing import Any

from crosscheck.frame.model import HELD, Frame, Temperature
from crosscheck.suspects.changes import (
    Change,
    usable,
    with_analysis,
    with_load,
    with_support,
)
from crosscheck.suspects.suspect import Option, named
from crosscheck.suspects.zones import zone_options

IDEALISED, ANGLE = 0.3, 0.6


def whole_options(frame: Frame) -> Iterator[Option]:
    """The fixed ones; in second order, where another solution is slow, the idealisation alone."""
    yield from _idealisations(frame)
    if frame.analysis.order == 2:
        return
    yield from zone_options(frame)
    yield from _angles(frame)


# --- idealisation ---


ORDERS = {1: "the analysis was of second order", 2: "the analysis was of first order"}


def other_order(frame: Frame) -> Iterator[Option]:
    """First order for second and the other way round: tried late, because second order is slow to solve."""
    order = frame.analysis.order
    change = partial(_analysed, fields={"order": 3 - order})
    if usable(change(frame)):
        yield Option("idealisation", (), ORDERS[order], Change(change), IDEALISED)


def _idealisations(frame: Frame) -> Iterator[Option]:
    axial, shear = frame.analysis.axial, frame.analysis.shear
    new_axial, new_shear = ("rigid" if axial == "elastic" else "elastic"), ("rigid" if shear == "elastic" else "elastic")
    says_axial = "members were axially rigid" if axial == "elastic" else "members could stretch (axially elastic)"
    says_shear = "shear deformation was left out" if shear == "elastic" else "shear deformation was counted"
    for fields, says, cost in (
        ({"axial": new_axial}, says_axial, IDEALISED), ({"shear": new_shear}, says_shear, IDEALISED),
        ({"axial": new_axial, "shear": new_shear}, f"{says_axial} and {says_shear}", IDEALISED + 0.5),
    ):  # fmt: skip
        change = partial(_analysed, fields=fields)
        if usable(change(frame)):
            yield Option("idealisation", (), says, Change(change), cost)


def _analysed(frame: Frame, fields: Mapping[str, Any]) -> Frame:
    whole: dict[str, Any] = dict(fields)
    return with_analysis(frame, **whole)


def _angles(frame: Frame) -> Iterator[Option]:
    """A turned support taken as square, or turned the other way."""
    for joint, s in frame.supports.items():
        if (s.x, s.y) == (HELD, HELD) or s.x == s.y:
            continue
        label = named(frame, "joint", joint)
        angles = ((0.0, "was not turned"), (-s.angle, "was turned the other way"), (s.angle + 90, "was turned by 90 more"))
        for angle, says in angles:
            if abs(angle - s.angle) > 1e-9:
                change = Change(partial(with_support, joint=joint, support=replace(s, angle=angle)))
                yield Option("support", (label,), f"the support at {label} {says}", change, ANGLE)


def temperature_options(frame: Frame) -> Iterator[Option]:
    """A temperature difference between the wrong faces."""
    for case, loads in frame.cases.items():
        for k, load in enumerate(loads.loads):
            if isinstance(load, Temperature) and load.difference and load.mean:
                new = replace(load, difference=-load.difference)
                change = Change(partial(with_load, case=case, index={k: (new,)}), loads_only=True)
                says = f"the temperature difference of {load.member} was taken the other way round"
                yield Option("load", (f"{case}[{load.entry}]",), says, change, ANGLE)
