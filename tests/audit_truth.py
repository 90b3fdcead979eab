"""A dense truth solver for the audit's tests, by transfer of state along each member: no stiffness, no fixed-end table.

Unknowns are the joint displacements, the state at each member's start and the rotation of every hinge; equations are
that every member arrives at its far joint, that every joint balances and that no hinge carries moment. Solved densely
by least squares, with what the null space touches reported as undetermined. Slow and plain: small frames only.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, replace

import numpy as np

from crosscheck.answer import CaseAnswer, Undetermined
from crosscheck.frame.loads import LoadTable, load_table
from crosscheck.frame.model import (
    FREE,
    HELD,
    Analysis,
    Frame,
    Joint,
    JointCouple,
    JointForce,
    Load,
    LoadCase,
    Material,
    Member,
    Misfit,
    PointCouple,
    PointForce,
    Section,
    SelfWeight,
    Settlement,
    Spread,
    Support,
    Temperature,
    Units,
)

U, V, T, N, S, M = range(6)


@dataclass
class Truth:
    values: CaseAnswer
    undetermined: Undetermined


class Unsolvable(Exception):
    """A mechanism, or an imposed deformation that the frame cannot follow."""


def _member_transfer(frame: Frame, loads: LoadTable, m: int) -> tuple[np.ndarray, np.ndarray, list[np.ndarray]]:
    """State at the far joint as an affine map of the state at the near one, (6, 9): 6 states, 2 hinge turns, 1.

    Also the rows (9,) of the moment at each hinge. State u, v, rotation (clockwise), axial, shear, sagging moment.
    """
    t = frame.member_table
    length, z1, z2 = t.length[m], t.zone[m, 0], t.zone[m, 1]
    face1, face2 = z1, length - z2
    EI = t.E[m] * t.I[m]
    ea = 0.0 if frame.analysis.axial == "rigid" else 1 / (t.E[m] * t.A[m])
    ga = 0.0 if frame.analysis.shear == "rigid" else 1 / (t.G[m] * t.shear_area[m])
    curve = t.alpha[m] * loads.difference[m] / t.depth[m] if loads.difference[m] else 0.0
    warm = t.alpha[m] * loads.mean[m] if loads.mean[m] else 0.0
    points = [k for k in range(len(loads.point_member)) if loads.point_member[k] == m]
    lines = [k for k in range(len(loads.line_member)) if loads.line_member[k] == m]
    marks = {0.0, face1, face2, length}
    marks |= {float(loads.point_at[k]) for k in points}
    marks |= {float(x) for k in lines for x in (loads.line_start[k], loads.line_end[k])}
    stops = sorted(marks)
    state = np.zeros((6, 9))
    state[:, :6] = np.eye(6)
    hinges = []

    def connect(end: int) -> None:
        turn = t.turn[m, end]
        if turn == FREE:
            hinges.append(state[M].copy())
            state[T, 6 + end] += 1.0
        elif turn != HELD:
            state[T] -= state[M] / turn

    def jump(x: float) -> None:
        for k in points:
            if loads.point_at[k] == x:
                state[N, 8] -= loads.point_along[k]
                state[S, 8] += loads.point_across[k]
                state[M, 8] += loads.point_couple[k]

    for k, x in enumerate(stops):
        if x == face2 and face2 != face1:
            jump(x)
            connect(1)
        elif x == face1:
            connect(0)
            jump(x)
            state[U, 8] += loads.misfit[m]
        else:
            jump(x)
        if x == stops[-1]:
            break
        step = stops[k + 1] - x
        flexible = x >= face1 and stops[k + 1] <= face2
        wx, kx, wy, ky = 0.0, 0.0, 0.0, 0.0
        for q in lines:
            a, b = loads.line_start[q], loads.line_end[q]
            if a <= x and stops[k + 1] <= b:
                for axis, pair in enumerate((loads.line_along[q], loads.line_across[q])):
                    slope = (pair[1] - pair[0]) / (b - a)
                    if axis == 0:
                        wx, kx = wx + pair[0] + slope * (x - a), kx + slope
                    else:
                        wy, ky = wy + pair[0] + slope * (x - a), ky + slope
        state = _advance(state, step, flexible, (wx, kx, wy, ky), EI, ea, ga, curve, warm)
    return state, np.array([]), hinges


def _advance(state, step, flexible, load, EI, ea, ga, curve, warm):
    h = step
    wx, kx, wy, ky = load
    one = np.zeros(9)
    one[8] = 1.0
    y = state.copy()
    y[N] = state[N] - one * (wx * h + kx * h**2 / 2)
    y[S] = state[S] + one * (wy * h + ky * h**2 / 2)
    y[M] = state[M] + state[S] * h + one * (wy * h**2 / 2 + ky * h**3 / 6)
    y[V] = state[V] - state[T] * h
    if flexible:
        area = state[M] * h + state[S] * h**2 / 2 + one * (wy * h**3 / 6 + ky * h**4 / 24)
        second = state[M] * h**2 / 2 + state[S] * h**3 / 6 + one * (wy * h**4 / 24 + ky * h**5 / 120)
        y[T] = state[T] - area / EI - one * curve * h
        y[V] += second / EI + one * curve * h**2 / 2
        y[V] -= ga * (state[S] * h + one * (wy * h**2 / 2 + ky * h**3 / 6))
        y[U] = state[U] + ea * (state[N] * h - one * (wx * h**2 / 2 + kx * h**3 / 6)) + one * warm * h
    return y


def solve(frame: Frame, name: str) -> Truth:
    """The first-order solution of one case."""
    loads = load_table(frame, name)
    t, s = frame.member_table, frame.support_table
    m, j = len(t.length), len(frame.joints)
    size = 3 * j + 3 * m + 2 * m
    typical = float(np.mean(t.length))
    stiff = float(np.mean(t.E * t.I)) / typical**2
    column = np.ones(size)
    column[: 3 * j] = np.tile([typical, typical, 1.0], j) * 1e-2
    column[3 * j : 3 * j + 3 * m] = np.tile([1.0, 1.0, typical], m) * stiff * 1e-2
    column[3 * j + 3 * m :] = 1e-2
    rows, rhs, weight = [], [], []
    balance = np.zeros((j, 3, size))
    outside = loads.joint.copy()
    ends_rows = np.zeros((m, 2, 3, size))
    ends_const = np.zeros((m, 2, 3))
    for k in range(m):
        a, b = t.ends[k]
        c, d = t.cos[k], t.sin[k]
        state, _, hinges = _member_transfer(frame, loads, k)
        start = np.zeros((6, size))
        start[U, 3 * a], start[U, 3 * a + 1] = c, d
        start[V, 3 * a], start[V, 3 * a + 1] = -d, c
        start[T, 3 * a + 2] = 1.0
        for q in range(3):
            start[N + q, 3 * j + 3 * k + q] = 1.0
        lift = np.zeros((9, size))
        lift[:6] = start
        lift[6, 3 * j + 3 * m + 2 * k] = lift[7, 3 * j + 3 * m + 2 * k + 1] = 1.0
        far, const = state[:, :8] @ lift[:8], state[:, 8]
        arrive = np.zeros((3, size))
        arrive[0, 3 * b], arrive[0, 3 * b + 1] = c, d
        arrive[1, 3 * b], arrive[1, 3 * b + 1] = -d, c
        arrive[2, 3 * b + 2] = 1.0
        for q in range(3):
            rows.append(far[q] - arrive[q])
            rhs.append(-const[q])
            weight.append(1.0 if q == 2 else 1 / typical)
        for h in hinges:
            rows.append(h[:8] @ lift[:8])
            rhs.append(-h[8])
            weight.append(1 / (stiff * typical))
        for end in range(2):
            if t.turn[k, end] != FREE:
                fix = np.zeros(size)
                fix[3 * j + 3 * m + 2 * k + end] = 1.0
                rows.append(fix)
                rhs.append(0.0)
                weight.append(1.0)
        near = start[3:]
        ends_rows[k, 0] = near
        ends_rows[k, 1] = np.array([far[N], -far[S], -far[M]])
        ends_const[k, 1] = np.array([const[N], -const[S], -const[M]])
        for end, joint, pull in ((0, a, -1.0), (1, b, 1.0)):
            r, q = ends_rows[k, end], ends_const[k, end]
            turn = np.array([[pull * c, -d, 0], [pull * d, c, 0], [0, 0, 1.0]])
            balance[joint] -= turn @ r
            outside[joint] -= turn @ q
    axes = np.zeros((j, 3, 3))
    for k in range(j):
        axes[k] = [[s.cos[k], s.sin[k], 0], [-s.sin[k], s.cos[k], 0], [0, 0, 1]]
        for q in range(3):
            stiffness = s.stiffness[k, q]
            along = np.zeros(size)
            along[3 * k : 3 * k + 3] = axes[k, q]
            if stiffness == HELD:
                rows.append(along)
                rhs.append(loads.settlement[k, q])
                weight.append(1.0 if q == 2 else 1 / typical)
            else:
                rows.append(axes[k, q] @ balance[k] - stiffness * along)
                rhs.append(-axes[k, q] @ outside[k] - stiffness * loads.settlement[k, q])
                weight.append(1 / (stiff * (typical if q == 2 else 1.0)))
    w = np.array(weight)
    A = np.array(rows) * w[:, None] * column
    y = np.array(rhs) * w
    A_norm = 1 / np.maximum(np.abs(A).max(axis=1), 1e-300)
    A, y = A * A_norm[:, None], y * A_norm
    left, values, right = np.linalg.svd(A, full_matrices=True)
    rank = int((values > 1e-11 * values[0]).sum())
    null = right[rank:].T
    x = right[:rank].T @ ((left[:, :rank].T @ y) / values[:rank])
    for _ in range(2):
        x += right[:rank].T @ ((left[:, :rank].T @ (y - A @ x)) / values[:rank])
    if np.abs(A @ x - y).max() > 1e-9 * max(np.abs(y).max(), 1e-300):
        raise Unsolvable("imposed deformation that cannot be followed, or a mechanism under load")
    loose = (np.abs(null).max(axis=1) > 1e-7) if null.shape[1] else np.zeros(size, dtype=bool)
    if loose[: 3 * j].reshape(j, 3)[:, :2].any():
        raise Unsolvable("a mechanism")
    x = x * column
    nullx = null * column[:, None]
    joints = x[: 3 * j].reshape(j, 3).copy()
    unknown_joints = loose[: 3 * j].reshape(j, 3)
    joints[unknown_joints] = np.nan
    ends = ends_rows @ x + ends_const
    ends_loose = _touched(ends_rows, nullx, stiff, typical)
    reactions = -(balance @ x + outside)
    reactions_loose = _touched(balance, nullx, stiff, typical)
    ends[ends_loose] = np.nan
    reactions[reactions_loose] = np.nan
    unsupported = (s.stiffness == FREE).all(axis=1)
    reactions[unsupported] = 0.0
    values_ = CaseAnswer(ends, joints, reactions)
    return Truth(values_, Undetermined(ends_loose[:, 0, 0], unknown_joints, reactions_loose))


def _touched(rows: np.ndarray, null: np.ndarray, stiff: float, typical: float) -> np.ndarray:
    if not null.shape[1]:
        return np.zeros(rows.shape[:-1], dtype=bool)
    size = np.abs(rows @ null).max(axis=-1)
    return size > 1e-7 * 1e-2 * stiff * np.array([1.0, 1.0, typical])


# ------------------------------------------------------------------------------------------------ random frames


def random_frame(rng: np.random.Generator, axial: str | None = None, shear: str | None = None) -> Frame:
    """A random stable frame of every feature, with one case "p" and its truth solvable; redrawn until it is."""
    while True:
        frame = _draw(rng, axial or rng.choice(["elastic", "rigid"]), shear or rng.choice(["rigid", "elastic"]))
        try:
            solve(frame, "p")
        except Unsolvable:
            continue
        return frame


def _draw(rng: np.random.Generator, axial: str, shear: str) -> Frame:
    bays, storeys = int(rng.integers(1, 4)), int(rng.integers(1, 4))
    E = 2.1e8
    span = 10 ** rng.uniform(0.3, 0.9)
    ratio = 10 ** rng.uniform(1.5, 6.0)
    sections = {}
    for name in ("a", "b", "c"):
        inertia = 10 ** rng.uniform(-5, -3.5)
        area = ratio * inertia / span**2
        sections[name] = Section(name, inertia, area, area * 0.4, 0.3)
    materials = {"steel": Material("steel", E, 8.1e7, 1.2e-5, 77.0)}
    joints, members, supports = {}, {}, {}

    def joint(i: int, k: int) -> str:
        return f"{'ABCDEF'[i]}{k}"

    for i in range(bays + 1):
        for k in range(storeys + 1):
            shift = rng.normal(0, 0.08, 2) * span * (rng.random() < 0.4)
            joints[joint(i, k)] = Joint(joint(i, k), i * span + shift[0], k * 0.7 * span + shift[1] * (k > 0))
    pairs = [(joint(i, k), joint(i, k + 1)) for i in range(bays + 1) for k in range(storeys)]
    pairs += [(joint(i, k), joint(i + 1, k)) for i in range(bays) for k in range(1, storeys + 1)]
    pairs += [(joint(i, k), joint(i + 1, k + 1)) for i in range(bays) for k in range(storeys) if rng.random() < 0.12]
    for a, b in pairs:
        if rng.random() < 0.3:
            a, b = b, a
        members[f"{a}-{b}"] = _member(rng, a, b, joints)
    for i in range(bays + 1):
        supports[joint(i, 0)] = _support(rng, joint(i, 0))
    analysis = Analysis(axial=axial, axial_stated=True, shear=shear)  # type: ignore[arg-type]
    return Frame(
        title="random", units=Units("kN", "m", 1000.0, 1.0), materials=materials, sections=sections, joints=joints,
        members=members, supports=supports,
        cases={"p": LoadCase("p", tuple(_loads(rng, joints, members, supports, axial)))}, analysis=analysis,
    )  # fmt: skip


def _member(rng: np.random.Generator, a: str, b: str, joints: dict[str, Joint]) -> Member:
    length = math.hypot(joints[a].x - joints[b].x, joints[a].y - joints[b].y)

    def turn() -> float:
        r = rng.random()
        return FREE if r < 0.1 else 10 ** rng.uniform(3, 5) if r < 0.2 else HELD

    def zone() -> float:
        return float(rng.uniform(0.02, 0.1) * length) if rng.random() < 0.15 else 0.0

    section = str(rng.choice(["a", "b", "c"]))
    return Member(f"{a}-{b}", a, b, section, "steel", turn(), turn(), zone(), zone())


def _support(rng: np.random.Generator, joint: str) -> Support:
    r = rng.random()
    if r < 0.4:
        return Support(joint, HELD, HELD, HELD)
    if r < 0.6:
        return Support(joint, HELD, HELD, FREE)
    angle = float(rng.choice([0.0, 30.0, 90.0, -20.0]))
    if r < 0.7:
        return Support(joint, FREE, HELD, FREE, angle)
    kinds = [HELD, 10 ** rng.uniform(3, 5), 10 ** rng.uniform(3, 5)]
    return Support(joint, *(float(rng.choice(kinds)) for _ in range(3)), angle)


def _loads(rng, joints, members, supports, axial) -> list[Load]:
    loads: list[Load] = []
    names = list(members)

    def length(m: str) -> float:
        a, b = joints[members[m].joint_from], joints[members[m].joint_to]
        return math.hypot(a.x - b.x, a.y - b.y)

    def direction():
        return rng.choice(np.array(["across", "along", 270.0, 0.0, 33.0], dtype=object))

    for entry in range(int(rng.integers(2, 7))):
        m = str(rng.choice(names))
        size = length(m)
        kind = rng.integers(0, 8)
        if kind == 0:
            place, angle = str(rng.choice(list(joints))), float(rng.uniform(0, 360))
            loads.append(JointForce(entry, place, rng.normal() * 20, angle))
        elif kind == 1:
            rigid = [m for m in members.values() if m.turn_from == HELD]
            if rigid:
                loads.append(JointCouple(entry, str(rng.choice([m.joint_from for m in rigid])), rng.normal() * 20))
        elif kind == 2:
            at = float(rng.choice([0.0, size, rng.uniform(0, size), members[m].rigid_from]))
            loads.append(PointForce(entry, m, rng.normal() * 20, direction(), at))
        elif kind == 3:
            at = float(rng.choice([0.0, size, rng.uniform(0, size), members[m].rigid_from]))
            loads.append(PointCouple(entry, m, rng.normal() * 20, at))
        elif kind == 4:
            loads.append(SelfWeight(entry, 1.0))
        elif kind == 5 and axial == "elastic":
            loads.append(Temperature(entry, m, rng.normal() * 20, rng.normal() * 20))
        elif kind == 5:
            loads.append(Temperature(entry, m, 0.0, rng.normal() * 20))
        elif kind == 6 and axial == "elastic":
            loads.append(Misfit(entry, m, rng.normal() * 1e-3))
        elif kind == 7:
            s = supports[str(rng.choice(list(supports)))]
            move = [rng.normal() * 1e-3 if k != FREE else 0.0 for k in (s.x, s.y, s.rotation)]
            loads.append(Settlement(entry, s.joint, *move))
        a, b = sorted(rng.uniform(0, size, 2))
        if b - a < 0.1 * size:
            a, b = 0.0, size
        way = direction()
        projection = bool(rng.random() < 0.2) and not isinstance(way, str)
        loads.append(Spread(entry, m, rng.normal() * 10, rng.normal() * 10, way, a, b, projection))
    return loads


def rounded(values: CaseAnswer, digits: int) -> tuple[CaseAnswer, CaseAnswer]:
    """Every value to so many significant digits, and half a unit of the last."""

    def one(a: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        size = np.where(np.isnan(a) | (np.abs(a) < 1e-12), 1.0, np.abs(a))
        unit = 10.0 ** (np.floor(np.log10(size)) - digits + 1)
        return np.round(a / unit) * unit, unit / 2

    parts = [one(a) for a in (values.ends, values.joints, values.reactions)]
    return CaseAnswer(*(p[0] for p in parts)), CaseAnswer(*(p[1] for p in parts))


def with_member(frame: Frame, name: str, **changes: object) -> Frame:
    """The frame with one member changed."""
    members = dict(frame.members)
    members[name] = replace(members[name], **changes)  # type: ignore[arg-type]
    return replace(frame, members=members)


def with_support(frame: Frame, name: str, **changes: object) -> Frame:
    """The frame with one support changed."""
    supports = dict(frame.supports)
    supports[name] = replace(supports[name], **changes)  # type: ignore[arg-type]
    return replace(frame, supports=supports)


def with_section(frame: Frame, name: str, **changes: object) -> Frame:
    """The frame with one section changed."""
    sections = dict(frame.sections)
    sections[name] = replace(sections[name], **changes)  # type: ignore[arg-type]
    return replace(frame, sections=sections)
