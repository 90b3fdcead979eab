"""The opinions on frames of 36 to 50,000 members, against a bare sparse solution, each other, and the library.

Run by `python -m tests.benchmarks.bench_size`. All times are processor time, from a Frame of which nothing is worked out
to the complete answer; the study of the frame, which every opinion needs, is counted. Bare scipy is `splu` on the same
elastic matrix, ready made, factor and one solution, with the best of its orderings.
"""

from __future__ import annotations

from collections.abc import Callable
from math import log

import numpy as np
from scipy.sparse.linalg import splu

from crosscheck.answer import Answer
from crosscheck.frame.kinematics import study
from crosscheck.frame.model import HELD, Frame
from crosscheck.opinions import moment_distribution, slope_deflection
from crosscheck.opinions.slope_deflection.system import System
from tests.benchmarks.frames import SIZES, fresh, regular, rigid
from tests.benchmarks.timing import HEAD, Row, in_turn, show

BARE, GROWTH, RIGID, DISTRIBUTION, FULL, LEANEST = 3.0, 1.0, 3.0, 10.0, 60.0, 5.0
TWENTY = 0.6
ORDERINGS = ("MMD_AT_PLUS_A", "MMD_ATA", "COLAMD")
SHARED = 984
"""Members at which slope-deflection meets moment distribution and the library; growth is measured from here."""
LARGE, LARGEST = 10_100, 49_952


def answered(module: object, frame: Frame) -> Answer:
    """From a frame of which nothing is worked out to its complete answer."""
    frame = fresh(frame)
    said = module.opine(frame, study(frame))  # type: ignore[attr-defined]
    assert isinstance(said, Answer), said
    assert len(said.cases) == len(frame.names)
    return said


def bare(frame: Frame, ordering: str) -> Callable[[], object]:
    """Factor and one solution of the frame's elastic matrix; the matrix is made beforehand."""
    matrix = System(frame).matrix
    right = np.random.default_rng(0).standard_normal(matrix.shape[0])
    options = {"options": {"SymmetricMode": True}, "diag_pivot_thresh": 0.0} if ordering == ORDERINGS[0] else {}
    return lambda: splu(matrix, permc_spec=ordering, **options).solve(right)


def rounds(members: int) -> int:
    return 15 if members < 1000 else 7 if members < 20_000 else 2


def sizes() -> list[Row]:
    """Slope-deflection against bare scipy at every size, axially rigid against elastic, and the growth of both."""
    rows, times = [], {}
    for members in SIZES:
        frame = regular(members)
        orderings = ORDERINGS if members <= LARGE else ORDERINGS[:1]  # the others take minutes there, and lose already
        acts: dict[str, Callable[[], object]] = {o: bare(frame, o) for o in orderings}
        acts["elastic"] = lambda frame=frame: answered(slope_deflection, frame)  # type: ignore[misc]
        acts["rigid"] = lambda frame=rigid(frame): answered(slope_deflection, frame)  # type: ignore[misc]  # noqa: B008
        took = in_turn(acts, rounds(members))
        least = min(took[o] for o in orderings)
        times[members] = took["elastic"], least
        limit = BARE if members == LARGE else None
        rows.append(Row(f"1  slope-deflection, {members:,} members / bare scipy", took["elastic"], least, limit))
        rows.append(Row(f"1  axially rigid / elastic, {members:,} members", took["rigid"], took["elastic"], RIGID))
    mine, other = (times[LARGEST][k] / times[SHARED][k] for k in (0, 1))
    what = f"1  growth {SHARED:,} to {LARGEST:,} members, times / bare scipy's"
    power = log(LARGEST / SHARED)
    print(f"   (powers of the size: {log(mine) / power:.2f} and {log(other) / power:.2f})", flush=True)
    return [*rows, Row(what, mine, other, GROWTH, unit="x")]


def distribution() -> list[Row]:
    """Moment distribution against slope-deflection, elastic and rigid."""
    rows = []
    for members in (36, SHARED, LARGE):
        for name, frame in (("elastic", regular(members)), ("axially rigid", rigid(regular(members)))):
            took = in_turn(
                {
                    "mine": lambda frame=frame: answered(moment_distribution, frame),  # type: ignore[misc]
                    "other": lambda frame=frame: answered(slope_deflection, frame),  # type: ignore[misc]
                },
                rounds(members),
            )
            limit = DISTRIBUTION if members == SHARED else None
            what = f"2  moment distribution / slope-deflection, {members:,} members, {name}"
            rows.append(Row(what, took["mine"], took["other"], limit))
    return rows


def many_cases() -> list[Row]:
    """Twenty load cases are one factorisation: against twenty times one case. What remains is reading the loads."""
    one, twenty = regular(LARGE), regular(LARGE, cases=20)
    rows = []
    for module in (slope_deflection, moment_distribution):
        took = in_turn(
            {
                "mine": lambda module=module: answered(module, twenty),  # type: ignore[misc]
                "other": lambda module=module: answered(module, one),  # type: ignore[misc]
            },
            3,
        )
        what = f"   20 load cases / 20 times one, {LARGE:,} members, {module.NAME}"
        rows.append(Row(what, took["mine"], 20 * took["other"], TWENTY))
    return rows


# --- the library


def built(frame: Frame) -> object:
    """The frame in the library's own words: elements, supports, loads."""
    from anastruct import SystemElements

    system = SystemElements()
    t, xy = frame.member_table, frame.xy.tolist()
    for (i, j), stiff, bend in zip(t.ends.tolist(), (t.E * t.A).tolist(), (t.E * t.I).tolist(), strict=True):
        system.add_element([xy[i], xy[j]], EA=stiff, EI=bend)
    number = {tuple(node.vertex.coordinates): n for n, node in system.node_map.items()}
    for name, support in frame.supports.items():
        assert support.rotation == HELD
        joint = frame.joints[name]
        system.add_support_fixed(number[joint.x, joint.y])
    for load in frame.cases["case 0"].loads:
        if hasattr(load, "member"):
            system.q_load(-load.first, frame.member_index[load.member] + 1, direction="y")
        else:
            joint = frame.joints[load.joint]
            system.point_load(number[joint.x, joint.y], Fx=load.force)
    return system


def solved_in_full(frame: Frame) -> object:
    """Its documented way: build, `solve()`, results of every element."""
    system = built(frame)
    system.solve()  # type: ignore[attr-defined]
    return system.get_element_results(element_id=0)  # type: ignore[attr-defined]


def solved_leanly(frame: Frame) -> list[object]:
    """Its leanest way: build, `solve(naked=True)`, end actions read from the elements' vectors."""
    system = built(frame)
    system.solve(naked=True)  # type: ignore[attr-defined]
    elements = system.element_map.values()  # type: ignore[attr-defined]
    return [e.element_force_vector + e.element_primary_force_vector for e in elements]


def library() -> list[Row]:
    """The library against slope-deflection, the same frame and loads, and its own limit of size."""
    frame = regular(SHARED)
    assert_same(frame)
    took = in_turn(
        {
            "full": lambda: solved_in_full(frame),
            "lean": lambda: solved_leanly(frame),
            "ours": lambda: answered(slope_deflection, frame),
        },
        3,
    )
    what = f"3  the library's {{}} / slope-deflection, {SHARED:,} members"
    return [
        Row(what.format("documented full solution"), took["full"], took["ours"], FULL, least=True),
        Row(what.format("leanest route"), took["lean"], took["ours"], LEANEST, least=True),
    ]


def assert_same(frame: Frame) -> None:
    """What is timed must be the same problem: end moments by both to 1e-5 of the largest."""
    ours = answered(slope_deflection, frame).cases["case 0"].ends[:, :, 2]
    theirs = np.array(solved_leanly(frame))[:, [2, 5]] * -1.0  # counter-clockwise, its y downwards
    apart = float(np.minimum(np.abs(ours - theirs), np.abs(ours + theirs)).max() / np.abs(ours).max())
    assert apart < 1e-5, apart


def main() -> int:
    print(HEAD)
    return max(show(part()) for part in (sizes, distribution, many_cases, library))


if __name__ == "__main__":
    raise SystemExit(main())
