"""What the library can speak for, as data: why it abstains from a frame, or from one of its cases."""

from __future__ import annotations

from collections.abc import Callable

from crosscheck.answer import Undetermined
from crosscheck.frame.loads import LoadTable
from crosscheck.frame.model import Frame

FRAME_LIMITS: tuple[tuple[Callable[[Frame, Undetermined], bool], str], ...] = (
    (lambda f, u: f.analysis.order != 1, "its second-order analysis is wrong for members that are not vertical"),
    (lambda f, u: f.analysis.shear != "rigid", "it knows no shear deformation"),
    (lambda f, u: bool((f.member_table.zone > 0.0).any()), "it knows no rigid end zones"),
    (lambda f, u: bool(f.member_table.varying.any()), "it is not given stepped or tapered members"),
    (lambda f, u: f.one_way, "it is not given one-way members or supports"),
    (lambda f, u: bool(f.ties), "it knows no joints that are tied to move together"),
    (
        lambda f, u: bool(f.member_table.rigid.any() and not f.member_table.rigid.all()),
        "it is not given axially rigid members among elastic ones",
    ),
    (
        lambda f, u: bool(u.axial.any()),
        "axially rigid members leave axial forces undetermined, for which it would give an arbitrary split",
    ),
    (lambda f, u: not f.members, "there are no members"),
)
"""(applies, reason) for a whole frame."""

CASE_LIMITS: tuple[tuple[Callable[[LoadTable], bool], str], ...] = (
    (lambda t: bool(t.settlement.any()), "it knows no settlement of supports"),
    (lambda t: bool(t.mean.any() or t.difference.any()), "it knows no temperature"),
    (lambda t: bool(t.misfit.any()), "it knows no misfit"),
)
"""(applies, reason) for one case or combination."""


def frame_reason(frame: Frame, undetermined: Undetermined) -> str:
    """Why it abstains from the frame, or ""."""
    return "; ".join(why for applies, why in FRAME_LIMITS if applies(frame, undetermined))


def case_reason(table: LoadTable) -> str:
    """Why it abstains from the case, or ""."""
    return "; ".join(why for applies, why in CASE_LIMITS if applies(table))
