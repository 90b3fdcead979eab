"""Regular frames of any size for the benchmarks: every beam under a spread load, every floor pushed."""

from __future__ import annotations

from dataclasses import replace

from crosscheck.frame.model import (
    HELD,
    Frame,
    Joint,
    JointForce,
    LoadCase,
    Material,
    Member,
    Section,
    Spread,
    Support,
    Units,
)

SIZES = {36: (4, 4), 420: (10, 20), 984: (20, 24), 2050: (20, 50), 10_100: (50, 100), 49_952: (111, 224)}
"""Members: bays and storeys."""


def regular(members: int, cases: int = 1) -> Frame:
    """The frame of so many members (a key of SIZES), with this many load cases of different size."""
    bays, storeys = SIZES[members]
    joints = {_at(i, k): Joint(_at(i, k), 6.0 * i, 3.5 * k) for k in range(storeys + 1) for i in range(bays + 1)}
    columns = [(_at(i, k), _at(i, k + 1), "column") for k in range(storeys) for i in range(bays + 1)]
    beams = [(_at(i, k), _at(i + 1, k), "beam") for k in range(1, storeys + 1) for i in range(bays)]
    table = {f"{a}-{b}": Member(f"{a}-{b}", a, b, section, "steel") for a, b, section in columns + beams}
    assert len(table) == members
    loaded = [f"{a}-{b}" for a, b, _ in beams]
    return Frame(
        title=f"{bays} bays by {storeys} storeys", units=Units("kN", "m", 1000.0, 1.0),
        materials={"steel": Material("steel", 210e6)},
        sections={"column": Section("column", 2e-4, 1e-2), "beam": Section("beam", 3e-4, 9e-3)},
        joints=joints, members=table,
        supports={_at(i, 0): Support(_at(i, 0), HELD, HELD, HELD) for i in range(bays + 1)},
        cases={f"case {n}": LoadCase(f"case {n}", _loads(loaded, storeys, 1.0 + 0.1 * n)) for n in range(cases)},
    )  # fmt: skip


def _at(i: int, k: int) -> str:
    return f"C{i}L{k}"


def _loads(beams: list[str], storeys: int, size: float) -> tuple[Spread | JointForce, ...]:
    spread = [Spread(k, name, size * (20 + k % 3), size * (20 + k % 3), 270.0, 0.0, 6.0) for k, name in enumerate(beams)]
    pushes = [JointForce(len(beams) + k, _at(0, k), 10.0 * size, 0.0) for k in range(1, storeys + 1)]
    return (*spread, *pushes)


def fresh(frame: Frame) -> Frame:
    """The same frame with nothing worked out yet."""
    return replace(frame)


def rigid(frame: Frame) -> Frame:
    """The same frame, axially rigid."""
    return replace(frame, analysis=replace(frame.analysis, axial="rigid"))
