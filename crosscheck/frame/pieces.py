"""Stepped and tapered members: `profile` and `taper` of a member's table, turned into pieces.

    profile = [["deep", "15%"], ["light", "85%"], ["deep", "100%"]]      # the section up to that distance
    profile = [[["deep", "light"], "15%"], ["light", "100%"]]            # a pair of sections makes a taper of that piece
    taper = ["deep", "light"]                                            # the whole member, joint to joint
"""

from __future__ import annotations

import math
from collections.abc import Mapping

from crosscheck.frame.fields import A_LENGTH, UNUSABLE, Checker, Table, shown
from crosscheck.frame.locate import Path
from crosscheck.frame.model import Piece, Section
from crosscheck.frame.parts import Known

WHOLE = 1e-9
"""Share of the length by which the last piece may miss the far joint by rounding."""
SUCH_AS = 'profile = [["deep", "15%"], ["light", "100%"]]'


def read_pieces(check: Checker, table: Table, path: Path, known: Known, length: float) -> tuple[Piece, ...]:
    """The pieces that a member's `profile` or `taper` makes over its length; none where it has neither."""
    stated = [key for key in ("section", "profile", "taper") if key in table]
    if len(stated) > 1:
        check.note((*path, stated[-1]), f"{' and '.join(stated)} both stated", "give one of section, profile, taper")
        return ()
    if "taper" in table:
        pair = _pair(check, table["taper"], (*path, "taper"), known)
        return (Piece(*pair, 1.0),) if pair else ()
    return _profile(check, table["profile"], (*path, "profile"), known, length) if "profile" in table else ()


def _pair(check: Checker, value: object, path: Path, known: Known) -> tuple[str, str] | None:
    if not isinstance(value, list) or len(value) != 2:
        check.note(path, f"{shown(value)} is not two sections", 'give the two ends\' sections, ["deep", "light"]')
        return None
    first, last = (check.name(name, known.sections, "section", (*path, k)) for k, name in enumerate(value))
    return first, last


def _profile(check: Checker, value: object, path: Path, known: Known, length: float) -> tuple[Piece, ...]:
    if not isinstance(value, list) or not value:
        check.note(path, f"{shown(value)} is not a list of pieces", f"give {SUCH_AS}")
        return ()
    pieces: list[Piece] = []
    for k, entry in enumerate(value):
        piece = _piece(check, entry, (*path, k), known, length)
        if piece is None:
            return ()
        if pieces and piece.until <= pieces[-1].until:
            says = f"the piece ends at {shown(entry[1])}, not beyond the one before it"
            check.note((*path, k), says, "give pieces in their order from the first joint, each with its far end")
            return ()
        pieces.append(piece)
    return _to_the_end(check, pieces, path)


def _piece(check: Checker, entry: object, path: Path, known: Known, length: float) -> Piece | None:
    if not isinstance(entry, list) or len(entry) != 2:
        check.note(path, f"{shown(entry)} is not a piece", 'give a section and the distance it reaches, ["deep", "15%"]')
        return None
    if isinstance(entry[0], list):
        pair = _pair(check, entry[0], (*path, 0), known)
        if pair is None:
            return None
    else:
        name = check.name(entry[0], known.sections, "section", (*path, 0))
        pair = name, name
    until = _share(check, entry[1], (*path, 1), length)
    if until <= 0 or until > 1 + WHOLE:
        says = f"{shown(entry[1])} does not lie on the member"
        check.note((*path, 1), says + (f", whose length is {length:.6g}" if math.isfinite(length) else ""),
                   'give a distance from its first joint, such as "15%"')  # fmt: skip
        return None
    return Piece(*pair, min(until, 1.0))


def _share(check: Checker, value: object, path: Path, length: float) -> float:
    """A distance as a share of the length: "15%", or a length from the first joint. NaN passes silently."""
    if isinstance(value, str) and value.rstrip().endswith("%"):
        return check.percentage(value, path)
    return check.number(value, A_LENGTH, path) / (length or UNUSABLE)


def _to_the_end(check: Checker, pieces: list[Piece], path: Path) -> tuple[Piece, ...]:
    """The pieces, the last of which must reach the far joint."""
    last = pieces[-1]
    if last.until < 1 - WHOLE:
        says = f"the profile ends at {100 * last.until:.6g}% of the length"
        check.note(path, says, 'let the last piece reach "100%"')
        return ()
    return (*pieces[:-1], Piece(last.first, last.last, 1.0 if last.until == last.until else last.until))


def longest(pieces: tuple[Piece, ...]) -> str:
    """Name of the section that stands for the whole member where one must: that of its longest piece."""
    starts = (0.0, *(piece.until for piece in pieces))
    return max(zip(pieces, starts, strict=False), key=lambda pair: pair[0].until - pair[1])[0].first


def unfit(piece: Piece, sections: Mapping[str, Section]) -> tuple[str, str]:
    """Why a piece makes no taper, and what would be right; empty texts where it does, or is none."""
    first, last = sections.get(piece.first), sections.get(piece.last)
    if first is None or last is None or first is last:
        return "", ""
    for section in (first, last):
        if section.depth is None:
            return f'section "{section.name}" has no depth, which a taper needs', "give depth"
    same = (first.I, first.A, first.shear_area) == (last.I, last.A, last.shear_area)
    if first.depth == last.depth and not same:
        says = f'sections "{first.name}" and "{last.name}" are equally deep: no power of depth leads from one to the other'
        return says, "give their depths, or use a profile of steps"
    return "", ""
