"""What stiffness ratios and sizes cost in digits, against exact rational solutions: README, Limits of precision.

The law held here: an opinion of ours that speaks is right to the tolerance between opinions (1e-8 of scale) however badly
conditioned the frame; a frame without a warning costs ours no more than 1e-11 and the library no more than its tolerance.
`python -m tests.test_exact_limits` prints the table that the README sums up.
"""

from __future__ import annotations

import io
from collections.abc import Callable

import numpy as np
import pytest

from crosscheck.answer import Answer, Silent
from crosscheck.check import ask
from crosscheck.compare.tolerance import LIBRARY, OWN
from crosscheck.frame.kinematics import study
from crosscheck.frame.model import Frame
from crosscheck.frame.reader import read_frame_text
from crosscheck.opinions import library, moment_distribution, slope_deflection
from crosscheck.report.terminal import opinions_report
from crosscheck.review.spread import warnings
from tests.agreement import apart
from tests.exact import Exact

SPOKEN, UNWARNED = OWN.floor, 1e-11

HEAD = """
units = "kN m"
[materials.m]
E = 1
[sections.a]
I = {Ia!r}
A = {Aa!r}
[sections.b]
I = {Ib!r}
A = {Ab!r}
[analysis]
axial = "{axial}"
"""


def _head(Ia: float = 1.0, Aa: float = 100.0, Ib: float = 1.0, Ab: float = 100.0, axial: str = "elastic") -> str:  # noqa: N803
    return HEAD.format(Ia=Ia, Aa=Aa, Ib=Ib, Ab=Ab, axial=axial)


def portal(head: str, height: float = 4.0, feet: str = 'A = "fixed"\nD = "fixed"', spring: str = "") -> str:
    return head + f"""
[joints]
A = [0, 0]
B = [0, {height!r}]
C = [6, {height!r}]
D = [6, 0]
[members]
"A-B" = {{ section = "a", material = "m"{spring} }}
"B-C" = {{ section = "b", material = "m" }}
"D-C" = {{ section = "a", material = "m" }}
[supports]
{feet}
[loads.q]
apply = [{{ member = "B-C", uniform = 12, direction = "down" }}, {{ joint = "B", force = 15, direction = "right" }}]
"""


def toggle(power: int, axial: str, ends: str = "") -> str:
    """Two bars nearly in line, with sides (t^2 - 1, 2 t, t^2 + 1) and a rise of about 10^power of their length."""
    t = round(2 * 10**-power)
    size = 2.0 ** -np.round(np.log2(t * t))
    x, y = float((t * t - 1) * size), float(2 * t * size)
    return _head(axial=axial) + f"""
[joints]
A = [0, 0]
B = [{x!r}, {y!r}]
C = [{2 * x!r}, 0]
[members]
"A-B" = {{ section = "a", material = "m"{ends} }}
"B-C" = {{ section = "a", material = "m"{ends} }}
[supports]
A = "pinned"
C = "pinned"
[loads.q]
apply = [{{ joint = "B", force = 1, direction = "down" }}]
"""


def tower(storeys: int, axial: str) -> str:
    """One bay: a wind load and a loaded beam at every level."""
    joints, members, loads = ["L0 = [0, 0]", "R0 = [6, 0]"], [], []
    for i in range(1, storeys + 1):
        joints += [f"L{i} = [0, {3 * i}]", f"R{i} = [6, {3 * i}]"]
        members += [f'"{a}{i - 1}-{a}{i}" = {{ section = "a", material = "m" }}' for a in "LR"]
        members.append(f'"L{i}-R{i}" = {{ section = "b", material = "m" }}')
        loads.append(f'{{ joint = "L{i}", force = 1, direction = "right" }}')
        loads.append(f'{{ member = "L{i}-R{i}", uniform = 5, direction = "down" }}')
    lines = ["[joints]", *joints, "[members]", *members, '[supports]\nL0 = "fixed"\nR0 = "fixed"', "[loads.q]"]
    return _head(Aa=1000.0, Ib=2.0, Ab=1000.0, axial=axial) + "\n".join([*lines, f"apply = [{', '.join(loads)}]"])


def mast(pieces: int) -> str:
    """A cantilever made of many members, loaded across at its tip: the worst of sizes, for all its length is one lever."""
    joints = [f"L{i} = [0, {3 * i}]" for i in range(pieces + 1)]
    members = [f'"L{i}-L{i + 1}" = {{ section = "a", material = "m" }}' for i in range(pieces)]
    lines = ["[joints]", *joints, "[members]", *members, '[supports]\nL0 = "fixed"', "[loads.q]"]
    return _head() + "\n".join([*lines, f'apply = [{{ joint = "L{pieces}", force = 1, direction = "right" }}]'])


def _rotation_feet(k: float) -> str:
    return "\n".join(f'{j} = {{ x = "held", y = "held", rotation = {k!r} }}' for j in "AD")


def _sway_spring(k: float) -> str:
    return f'A = {{ x = {k!r}, y = "held", rotation = "free" }}\nD = {{ x = "free", y = "held", rotation = "free" }}'


FAMILIES: dict[str, tuple[Callable[[int], str], range]] = {
    "EI and EA of the beam 10^k times the columns'": (
        lambda k: portal(_head(Ib=10.0**k, Ab=100 * 10.0**k)), range(-16, 17, 2)),
    "EI alone of the beam 10^k times the columns'": (lambda k: portal(_head(Ib=10.0**k)), range(-16, 17, 2)),
    "the same, axially rigid": (lambda k: portal(_head(Ib=10.0**k, axial="rigid")), range(-16, 17, 2)),
    "EA L^2 / EI about 10^k": (lambda k: portal(_head(Aa=10.0**k, Ab=10.0**k)), range(0, 17, 2)),
    "columns 10^k times the beam's length": (lambda k: portal(_head(), height=4 * 10.0**k), range(-8, 1)),
    "the same, axially rigid, columns short": (
        lambda k: portal(_head(axial="rigid"), height=4 * 10.0**k), range(-8, 1)),
    "rotation springs at the feet, 10^k EI/L": (lambda k: portal(_head(), feet=_rotation_feet(10.0**k)), range(-16, 17, 4)),
    "one spring against sway, 10^k EI/L^3": (lambda k: portal(_head(), feet=_sway_spring(10.0**k)), range(-16, 17, 2)),
    "a semi-rigid end, 10^k EI/L": (lambda k: portal(_head(), spring=f", spring_to = {10.0**k!r}"), range(-16, 17, 4)),
    "two hinged bars nearly in line, rise 10^k": (lambda k: toggle(k, "elastic", ', hinge = "both"'), range(-7, 0)),
    "the same, stiff-jointed": (lambda k: toggle(k, "elastic"), range(-7, 0)),
    "the same, stiff-jointed and axially rigid": (lambda k: toggle(k, "rigid"), range(-7, 0)),
}  # fmt: skip
"""What is varied: the frame for a power of ten, and the powers tried."""
CASES = [(family, k) for family, (_, powers) in FAMILIES.items() for k in powers]


def _shares(frame: Frame) -> dict[str, float | None]:
    """How far from the exact solution each opinion is, as a share of scale; None where it is silent."""
    exact, studied = Exact(frame), study(frame)
    shares: dict[str, float | None] = {}
    for opinion in (slope_deflection, moment_distribution, library):
        answer = opinion.opine(frame, studied)
        name = opinion.__name__.rpartition(".")[2]
        silent = isinstance(answer, Silent) or bool(answer.silent)
        shares[name] = None if silent else apart(frame, exact, answer, partial=opinion is library)[0]  # type: ignore[arg-type]
    return shares


@pytest.mark.parametrize(("family", "k"), CASES)
def test_who_speaks_is_right(family: str, k: int) -> None:
    frame = read_frame_text(FAMILIES[family][0](k))
    shares = _shares(frame)
    ours = [s for name, s in shares.items() if name != "library" and s is not None]
    assert max(ours, default=0.0) <= SPOKEN, shares
    if warnings(frame):
        return
    assert max(ours, default=0.0) <= UNWARNED, shares
    assert (shares["library"] or 0.0) <= LIBRARY.floor, shares
    assert ours, "one of ours speaks on every frame within the limits"


@pytest.mark.parametrize("axial", ["elastic", "rigid"])
@pytest.mark.parametrize("storeys", [5, 20, 40])
def test_size_costs_nothing(storeys: int, axial: str) -> None:
    frame = read_frame_text(tower(storeys, axial))
    shares = _shares(frame) if storeys <= 5 else _shares_of_ours(frame)
    assert max(s for s in shares.values() if s is not None) <= UNWARNED, shares


def _shares_of_ours(frame: Frame) -> dict[str, float | None]:
    exact, studied = Exact(frame), study(frame)
    answers = [opinion.opine(frame, studied) for opinion in (slope_deflection, moment_distribution)]
    return {a.opinion: apart(frame, exact, a)[0] for a in answers if isinstance(a, Answer)}


def test_a_mast_of_many_members() -> None:
    frame = read_frame_text(mast(100))
    shares = _shares_of_ours(frame)
    assert len(shares) == 2 and max(s for s in shares.values() if s is not None) <= UNWARNED


def test_a_check_says_where_a_frame_is_beyond_the_limits() -> None:
    """Members named, in the result, in what is printed; nothing is said of an ordinary frame."""
    from rich.console import Console

    wide, plain = (read_frame_text(portal(_head(Ib=i, Ab=100 * i))) for i in (1e12, 1.0))
    found = ask(wide)
    assert "from A-B to B-C" in found.warnings[0] and "10^14" in found.warnings[0]
    console = Console(width=200, record=True, file=io.StringIO())
    console.print(opinions_report(found))
    assert "Limits of precision" in console.export_text()
    assert ask(plain).warnings == ()


def test_an_opinion_that_does_not_settle_says_so() -> None:
    """Where the matrix is singular in 16 digits, and where corrections no longer help: no number, and why."""
    soft = ask(read_frame_text(portal(_head(), feet=_sway_spring(1e-16))))
    assert "16 digits" in soft.silent["slope-deflection"].why
    flat = ask(read_frame_text(toggle(-5, "rigid")))
    assert "did not settle" in flat.answers["slope-deflection"].silent["q"]
    assert soft.verdict == flat.verdict == "undecided"


def _table() -> None:
    for family, (make, powers) in FAMILIES.items():
        for k in powers:
            frame = read_frame_text(make(k))
            shares = " ".join(f"{n} {'silent' if s is None else f'{s:.0e}':>6}" for n, s in _shares(frame).items())
            print(f"{family:48} k = {k:3}  {shares}  {'warned' if warnings(frame) else ''}")


if __name__ == "__main__":
    _table()
