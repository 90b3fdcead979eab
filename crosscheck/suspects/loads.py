"""Loads missing, doubled, reversed, in another direction, elsewhere; self weight; factors and cases mixed up.

All are sums of effects of single loads on the frame as it stands, each worked out once with the factorised matrix.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, replace
from functools import partial

import numpy as np

from crosscheck.frame.loads import case_factors
from crosscheck.frame.model import (
    Bools,
    Floats,
    Frame,
    JointCouple,
    JointForce,
    Lean,
    Load,
    Misfit,
    PointCouple,
    PointForce,
    SelfWeight,
    Settlement,
    Spread,
    Temperature,
)
from crosscheck.suspects.changes import Change, altered, scaled, with_factors, with_load
from crosscheck.suspects.screen import Screen
from crosscheck.suspects.suspect import Option, named

WHICH_WAY: dict[object, str] = {
    0.0: "to the right", 90.0: "up", 180.0: "to the left", 270.0: "down", "across": "across the member",
    "along": "along the member",
}  # fmt: skip
LEFT_OUT, TWICE, REVERSED, PART_LEFT_OUT, TURNED, PROJECTION, OTHER_END, WHOLE, ELSEWHERE, FACTOR = (
    0.1, 0.3, 0.2, 0.3, 0.5, 0.4, 0.5, 0.6, 0.7, 0.8,
)  # fmt: skip
TURNED_TOO = 0.5
"""What a fitted factor that also turns the load round costs beside."""
NEAREST = 8
"""Other members or joints that a load is tried on, in a frame with more than MANY of them."""
MANY = 40
KEEP = 80


@dataclass(frozen=True, slots=True)
class _Move:
    """Loads of a case replaced: by place in the case's list. where: load entries."""

    case: str
    index: dict[int, tuple[Load, ...]]
    where: tuple[str, ...]
    says: str
    cost: float


def load_options(screen: Screen) -> Iterator[Option]:
    """The load changes that leave least over."""
    frame = screen.frame
    moves = [move for case in frame.cases for move in _moves(frame, case)]
    if not moves:
        return
    sample = screen.sample
    if sample is not None:
        rough = sample.left(_deltas(sample, moves))
        moves = [moves[k] for k in np.argsort(rough)[: 3 * KEEP].tolist()]
    deltas = _deltas(screen, moves)
    for k in np.argsort(screen.left(deltas))[:KEEP].tolist():
        move = moves[k]
        change = Change(partial(with_load, case=move.case, index=move.index), loads_only=True)
        yield Option("load", move.where, move.says, change, move.cost, deltas[:, k].copy())
    yield from _factors_of_entries(screen)


def _deltas(screen: Screen, moves: list[_Move]) -> Floats:
    """(n, k) by the effects of every load that the moves take away or bring."""
    frame = screen.frame
    column: dict[Load, int] = {}
    simple: list[Load] = []

    def of(load: Load) -> list[tuple[int, float]]:
        if isinstance(load, SelfWeight):
            return [c for piece in _weights(frame, load) for c in of(piece)]
        if load not in column:
            column[load] = len(simple)
            simple.append(load)
        return [(column[load], 1.0)]

    rows, columns, data = [], [], []
    for k, move in enumerate(moves):
        for place, new in move.index.items():
            old = frame.cases[move.case].loads[place]
            terms = [(c, -f) for c, f in of(old)] + [cf for load in new for cf in of(load)]
            rows += [c for c, _ in terms]
            columns += [k] * len(terms)
            data += [f for _, f in terms]
    from scipy.sparse import csc_matrix

    recipe = csc_matrix((data, (rows, columns)), shape=(len(simple), len(moves)))
    out = np.asarray((recipe.T @ screen.load_deltas(simple).T).T)
    factors = np.stack([screen.factors[move.case] for move in moves], axis=1)
    return np.asarray(out * factors)


def _weights(frame: Frame, load: SelfWeight) -> list[Load]:
    """Self weight as line loads on the members."""
    t = frame.member_table
    w = load.factor * t.own_weight
    return [
        Spread(load.entry, name, float(w[m]), float(w[m]), 270.0, 0.0, float(t.length[m]))
        for m, name in enumerate(frame.members)
    ]


# --- what may have happened to the loads of a case ---


def _moves(frame: Frame, case: str) -> Iterator[_Move]:
    loads = frame.cases[case].loads
    entries: dict[int, list[int]] = {}
    for k, load in enumerate(loads):
        if not isinstance(load, Lean):  # it is no load of its own: it follows the others
            entries.setdefault(load.entry, []).append(k)
    for entry, places in entries.items():
        where = (f"{case}[{entry}]",)
        what = _what(frame, [loads[k] for k in places])
        yield _Move(case, dict.fromkeys(places, ()), where, f"{what} was left out", LEFT_OUT)
        yield _Move(case, {k: (loads[k], loads[k]) for k in places}, where, f"{what} was in twice", TWICE)
        yield _Move(case, {k: (scaled(loads[k], -1.0),) for k in places}, where, f"{what} was reversed", REVERSED)
        for variant, says, cost in _variants_of_entry([loads[k] for k in places]):
            yield _Move(case, dict(zip(places, variant, strict=True)), where, f"{what} {says}", cost)
        if len(places) > 1:
            for k in places:
                one = _what(frame, [loads[k]])
                yield _Move(case, {k: ()}, where, f"{one} was left out of its entry", PART_LEFT_OUT)
        for k in places:
            yield from _elsewhere(frame, case, k, where)
    if len(entries) > 1:
        every = tuple(f"{case}[{e}]" for e in entries)
        turned: dict[int, tuple[Load, ...]] = {k: (scaled(q, -1.0),) for k, q in enumerate(loads)}
        yield _Move(case, turned, every, f"all loads of {case} were reversed", REVERSED)
        yield _Move(case, dict.fromkeys(range(len(loads)), ()), every, f"all loads of {case} were left out", LEFT_OUT + 0.3)


def _what(frame: Frame, loads: list[Load]) -> str:
    kind = {
        JointForce: "the force", JointCouple: "the couple", Settlement: "the settlement", PointForce: "the force",
        PointCouple: "the couple", Spread: "the spread load", Temperature: "the temperature", Misfit: "the misfit",
        SelfWeight: "self weight",
    }[type(loads[0])]  # fmt: skip
    places = [getattr(q, "member", getattr(q, "joint", "")) for q in loads]
    if isinstance(loads[0], SelfWeight):
        return kind
    table = "member" if hasattr(loads[0], "member") else "joint"
    names = [named(frame, table, p) for p in dict.fromkeys(places)]
    return f"{kind} on {', '.join(names[:4])}{' and others' if len(names) > 4 else ''}"


def _variants_of_entry(loads: list[Load]) -> Iterator[tuple[list[tuple[Load, ...]], str, float]]:
    """The same change to every load of an entry: direction, projection, position."""
    first = loads[0]
    if isinstance(first, (JointForce, PointForce, Spread)):
        for direction, word in WHICH_WAY.items():
            if isinstance(first, JointForce) and isinstance(direction, str):
                continue
            if direction != first.direction and not _opposite(direction, first.direction):
                yield [(altered(q, direction=direction),) for q in loads], f"acted {word}", TURNED
    if isinstance(first, Spread) and not isinstance(first.direction, str):
        turned: list[tuple[Load, ...]] = [(altered(q, projection=not first.projection),) for q in loads]
        yield turned, f"was taken per {'length' if first.projection else 'projection'}", PROJECTION
    if isinstance(first, Temperature) and first.mean and first.difference:
        both = [q for q in loads if isinstance(q, Temperature)]
        yield [(altered(q, mean=0.0),) for q in both], "had no mean rise", TURNED
        yield [(altered(q, difference=0.0),) for q in both], "had no difference", TURNED
    if isinstance(first, Settlement):
        for axis in ("x", "y", "rotation"):
            if getattr(first, axis):
                yield [(altered(q, **{axis: 0.0}),) for q in loads], f"had no {axis} part", TURNED


def _opposite(one: object, other: object) -> bool:
    return isinstance(one, float) and isinstance(other, float) and abs((one - other) % 360) == 180


def _elsewhere(frame: Frame, case: str, k: int, where: tuple[str, ...]) -> Iterator[_Move]:
    """One load measured from the other end, over the whole member, on another member or joint."""
    load = frame.cases[case].loads[k]
    what = _what(frame, [load])
    for new, says, cost in _positions(frame, load):
        yield _Move(case, {k: (new,)}, where, f"{what} {says}", cost)
    if isinstance(load, (JointForce, JointCouple)):
        for joint in _near_joints(frame, load.joint):
            says = f"{what} was on {named(frame, 'joint', joint)}"
            yield _Move(case, {k: (replace(load, joint=joint),)}, where, says, ELSEWHERE)
    elif hasattr(load, "member"):
        for member in _near_members(frame, load.member):
            says = f"{what} was on {named(frame, 'member', member)}"
            yield _Move(case, {k: (_on_member(frame, load, member),)}, where, says, ELSEWHERE)


def _length(frame: Frame, member: str) -> float:
    return float(frame.member_table.length[frame.member_index[member]])


def _positions(frame: Frame, load: Load) -> Iterator[tuple[Load, str, float]]:
    if isinstance(load, (PointForce, PointCouple)):
        length = _length(frame, load.member)
        yield replace(load, at=length - load.at), "was measured from the other end", OTHER_END
        if not np.isclose(load.at, length / 2):
            yield replace(load, at=length / 2), "was at midspan", ELSEWHERE
    if isinstance(load, Spread):
        length = _length(frame, load.member)
        mirrored = replace(
            load, first=load.last, last=load.first, start=max(length - load.end, 0.0), end=length - load.start
        )
        if not _same_spread(mirrored, load):
            yield mirrored, "was measured from the other end", OTHER_END
        if load.first != load.last:
            yield replace(load, first=load.last, last=load.first), "rose towards the other end", OTHER_END
            mean = (load.first + load.last) / 2
            yield replace(load, first=mean, last=mean), "was taken as uniform with its mean", ELSEWHERE
        if load.start > 1e-9 * length or load.end < length * (1 - 1e-9):
            yield replace(load, start=0.0, end=length), "was spread over the whole member", WHOLE


def _same_spread(a: Spread, b: Spread) -> bool:
    return bool(np.allclose([a.first, a.last, a.start, a.end], [b.first, b.last, b.start, b.end], rtol=1e-9, atol=1e-12))


def _near_members(frame: Frame, member: str) -> list[str]:
    names = list(frame.members)
    if len(names) <= MANY:
        return [n for n in names if n != member]
    middle = frame.xy[frame.member_table.ends].mean(axis=1)
    away = np.hypot(*(middle - middle[frame.member_index[member]]).T)
    return [names[k] for k in np.argsort(away)[1 : NEAREST + 1].tolist()]


def _near_joints(frame: Frame, joint: str) -> list[str]:
    names = list(frame.joints)
    if len(names) <= MANY:
        return [n for n in names if n != joint]
    away = np.hypot(*(frame.xy - frame.xy[frame.joint_index[joint]]).T)
    return [names[k] for k in np.argsort(away)[1 : NEAREST + 1].tolist()]


def _on_member(frame: Frame, load: Load, member: str) -> Load:
    """The load on another member, at the same distances where they fit on it, the whole length for the whole."""
    old, new = _length(frame, load.member), _length(frame, member)  # type: ignore[union-attr]
    if isinstance(load, Spread):
        whole = load.start <= 1e-9 * old and load.end >= old * (1 - 1e-9)
        end = new if whole else min(load.end, new)
        start = min(load.start, 0.5 * end)
        return replace(load, member=member, start=start, end=end)
    if isinstance(load, (PointForce, PointCouple)):
        return replace(load, member=member, at=min(load.at, new))
    return altered(load, member=member)


# --- factors ---


def _factors_of_entries(screen: Screen) -> Iterator[Option]:
    """A load entry taken with another intensity: the factor that fits best."""
    frame = screen.frame
    moves = []
    for case in frame.cases:
        entries: dict[int, list[int]] = {}
        for k, load in enumerate(frame.cases[case].loads):
            if not isinstance(load, Lean):
                entries.setdefault(load.entry, []).append(k)
        for entry, places in entries.items():
            moves.append(_Move(case, dict.fromkeys(places, ()), (f"{case}[{entry}]",), "", FACTOR))
    gone = _deltas(screen, moves)
    w2 = screen.weight[:, None] ** 2
    size = (w2 * gone**2).sum(axis=0)
    share = (w2 * gone * screen.residual[:, None]).sum(axis=0) / np.where(size > 0, size, 1.0)
    for k, move in enumerate(moves):
        factor = float(1.0 - share[k])
        if size[k] == 0 or not np.isfinite(factor):
            continue
        tidy = float(f"{factor:.2g}")
        exact = screen.left((1 - tidy) * gone[:, [k]])[0] <= max(
            1.2 * screen.left((1 - factor) * gone[:, [k]])[0], len(screen.residual)
        )
        used = tidy if exact else factor
        if used in (0.0, 1.0, 2.0, -1.0):
            continue
        loads = frame.cases[move.case].loads
        index: dict[int, tuple[Load, ...]] = {p: (scaled(loads[p], used),) for p in move.index}
        says = f"{_what(frame, [loads[p] for p in move.index])} was {used:.4g} times as large"
        change = Change(partial(with_load, case=move.case, index=index), loads_only=True)
        cost = move.cost + (TURNED_TOO if used < 0 else 0.0)
        yield Option("load", move.where, says, change, cost, (1 - used) * gone[:, k], fitted=1)


# --- load cases and combinations ---

FACTOR_OUT, FACTORED_TWICE, CASE_OUT, ALL_ONE, OTHER_FACTOR = 0.2, 0.3, 0.4, 0.4, 0.9


def factor_changes(frame: Frame, name: str) -> Iterator[tuple[dict[str, float], str, float]]:
    """Other factors for a claimed case or combination, in words."""
    if name in frame.combinations:
        factors = frame.combinations[name].factors
        for case, f in factors.items():
            if f != 1.0:
                yield {**factors, case: 1.0}, f"the factor {f:g} on {case} was left out of {name}", FACTOR_OUT
                yield {**factors, case: f * f}, f"{case} was factored twice in {name}", FACTORED_TWICE
                yield {**factors, case: -f}, f"{case} had the other sign in {name}", OTHER_FACTOR
            yield {c: g for c, g in factors.items() if c != case}, f"{case} was left out of {name}", CASE_OUT
        if any(f != 1.0 for f in factors.values()):
            yield dict.fromkeys(factors, 1.0), f"no factor was applied in {name}", ALL_ONE
            yield {c: f * f for c, f in factors.items()}, f"loads factored already were factored again in {name}", 0.2
        return
    known = {f for c in frame.combinations.values() for case, f in c.factors.items() if case == name and f != 1.0}
    for f in sorted(known):
        yield {name: f}, f"the loads of {name} were factored by {f:g} already", FACTORED_TWICE


def case_options(screen: Screen) -> Iterator[Option]:
    """Factors left out or applied twice, and factors that fit, for every claimed case."""
    seen, rows = screen.seen, screen.rows
    wanted = {c for n in seen.names for c in case_factors(screen.frame, n)}
    if not wanted:
        return
    answer = screen.base.answer(sorted(wanted))
    alone = {case: seen.read(answer, (case,) * len(seen.names))[rows] for case in wanted}
    for k, name in enumerate(seen.names):
        part = screen.case == k
        now = case_factors(screen.frame, name)
        for factors, says, cost in (*factor_changes(screen.frame, name), *_fitted_factors(screen, part, alone, now, name)):
            change = Change(partial(with_factors, name=name, factors=factors), loads_only=True)
            delta = np.zeros(len(rows))
            for case, old in now.items():
                delta[part] += (factors.get(case, 0.0) - old) * alone[case][part]
            yield Option("load case", (), says, change, cost, delta, fitted=int(cost >= OTHER_FACTOR))


def _fitted_factors(
    screen: Screen, part: Bools, alone: dict[str, Floats], now: dict[str, float], name: str
) -> list[tuple[dict[str, float], str, float]]:
    """The factor on each case that fits best, and one on the whole."""
    w, r = screen.weight[part], screen.residual[part]
    out = []
    for case in now:
        y = alone[case][part] * w
        if not np.isfinite(y).all() or not (y @ y):
            continue
        f = float(f"{now[case] + float(y @ (r * w)) / float(y @ y):.3g}")
        if f != now[case]:
            out.append(({**now, case: f}, f"{case} had the factor {f:g} in {name}", OTHER_FACTOR))
    whole = sum((f * alone[case][part] for case, f in now.items()), np.zeros(int(part.sum()))) * w
    if len(now) > 1 and whole @ whole:
        f = float(f"{1 + float(whole @ (r * w)) / float(whole @ whole):.3g}")
        out.append(({c: f * g for c, g in now.items()}, f"all of {name} was {f:g} times as large", OTHER_FACTOR))
    return out


def every_load_option(frame: Frame) -> Iterator[Change]:
    """Each load change that is weighed, for those who would try them one by one."""
    for case in frame.cases:
        for move in _moves(frame, case):
            yield Change(partial(with_load, case=move.case, index=move.index), loads_only=True)
