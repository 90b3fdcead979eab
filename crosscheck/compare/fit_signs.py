"""Signs of a whole claim: which plain sense turns explain those that fit, and how many values fix each.

Four turns explain most of the world's printouts: rotations anticlockwise positive, reactions on the supports instead of the
frame, y down, x to the left. Each turns several quantities at once, so their values count together; a sign that no turn
explains needs its own three values. Nothing turned is the README's convention and needs no more than three values in all.
"""

from __future__ import annotations

import re
from collections.abc import Mapping
from dataclasses import dataclass, field, replace
from itertools import product

from crosscheck.compare.fit import Choice, Fitted

FIXED_BY = 3
TURNS = ("turn", "support", "down", "left")
TURN_WORDS = {
    "turn": "rotations and couples are anticlockwise positive", "support": "reactions act on the supports",
    "down": "y is positive downward", "left": "x is positive to the left",
}  # fmt: skip
_TURNED_BY: dict[tuple[str, str], tuple[str, ...]] = {
    ("end", "moment"): ("turn",),
    ("reaction", "fx"): ("support", "left"), ("reaction", "fy"): ("support", "down"),
    ("reaction", "moment"): ("support", "turn"),
    ("displacement", "dx"): ("left",), ("displacement", "dy"): ("down",), ("displacement", "rotation"): ("turn",),
}  # fmt: skip
GROUPS = {"end": "member forces", "span": "member forces", "extreme": "member forces", "reaction": "reactions",
          "displacement": "displacements"}  # fmt: skip


@dataclass(slots=True)
class Senses:
    """turns: those taken. unfixed: by id of a fitted batch, why its sign is not fixed. base: choices to show instead."""

    turns: frozenset[str] = frozenset()
    unfixed: dict[int, str] = field(default_factory=dict)
    reversed_load: bool = False
    base: dict[int, Choice] = field(default_factory=dict)
    stated_ids: frozenset[int] = frozenset()

    def shown(self, f: Fitted) -> Choice:
        return self.base.get(id(f), f.taken)

    def stated(self, f: Fitted) -> bool:
        return id(f) in self.stated_ids

    def words(self, f: Fitted) -> str:
        if f.batch.unsigned.all():
            return "sizes alone"
        c = self.shown(f).convention
        if f.batch.kind != "reaction":
            return c.words
        on = "support" if "support" in self.turns else "frame"
        sign = -c.sign if on == "support" else c.sign
        positive, negative = {
            "fx": ("right", "left"), "fy": ("up", "down"), "moment": ("clockwise", "anticlockwise"),
        }[f.batch.quantity]  # fmt: skip
        return f"on the {on}, {positive if sign > 0 else negative} positive"


def narrowed(f: Fitted, signs: Mapping[str, str]) -> Fitted:
    """Only the conventions that the paste or the user states, where it states any for this quantity."""
    form, sign, rule = _stated(f, signs)
    rules = {c.convention.rule for c in f.choices}
    rule = rule if rule in rules else None  # where directions do not matter, one rule stands for all
    kept = [
        c for c in f.choices
        if form in (None, c.convention.form) and sign in (None, c.convention.sign) and rule in (None, c.convention.rule)
    ]  # fmt: skip
    return Fitted(f.batch, kept, min(kept, key=lambda c: c.rank)) if kept else f


def plain_where_loads_turn(fitted: list[Fitted], signs: Mapping[str, str]) -> None:
    """Where nothing fits and both member forces and reactions (or displacements) come nearest with their signs reversed, a
    load that acts the other way is likelier than so many conventions at once: the plain signs are taken, so that the
    differences and the suspects are seen in them. The verdict is the same (Fitter: no choice fits)."""
    loose = [f for f in fitted if not f.taken.fits and not f.batch.said and _stated(f, signs)[1] is None]
    if any(f.taken.fits and f.taken.telling.any() and f.taken.convention.sign < 0 for f in fitted):
        return
    turned = [f for f in loose if f.taken.convention.sign < 0]
    inner = any(f.batch.quantity in ("axial", "shear") for f in turned)
    outer = any(f.batch.quantity in ("fx", "fy", "dx", "dy") for f in turned)
    if inner and outer:
        for f in turned:
            f.taken = _opposite(f) or f.taken


_RULES = {"as the frame": "frame", "reversed": "reversed", "rightward": "rightward", "leftward": "leftward",
          "downward": "downward"}  # fmt: skip
_NEGATIVE = re.compile(r"support|ground|foundation|revers|compress|down|left|negative|anti|hogging")


def _stated(f: Fitted, signs: Mapping[str, str]) -> tuple[str | None, int | None, str | None]:
    """(form, sign, rule of direction) as stated, None for what is not."""
    kind, quantity = f.batch.kind, f.batch.quantity
    rule = _RULES.get(signs.get("members", ""))
    if kind in ("reaction", "displacement"):
        return None, _joint_sign(kind, quantity, signs), None
    said = signs.get(quantity, "")
    if not said or (kind != "end" and "clockwise" in said):  # "clockwise" says nothing of values along a member
        return None, None, rule
    sign = -1 if _NEGATIVE.search(said) else 1
    if kind != "end":
        return None, sign, rule
    if quantity == "moment":
        return "internal" if re.search("sagging|hogging", said) else "action", sign, rule
    return "action" if "action" in said else "internal", sign, rule


def _joint_sign(kind: str, quantity: str, signs: Mapping[str, str]) -> int | None:
    """Sign of a reaction or displacement: of its own direction and, for reactions, of what it acts on."""
    own = signs.get("reaction moment" if (kind, quantity) == ("reaction", "moment") else quantity)
    if own is None and quantity in ("fy", "dy"):
        own = signs.get("vertical")
    on = signs.get("reactions") if kind == "reaction" else None
    if own is None and (on is None or quantity == "moment"):
        return None
    return (-1 if own and _NEGATIVE.search(own) else 1) * (-1 if on and _NEGATIVE.search(on) else 1)


def senses(fitted: list[Fitted], signs: Mapping[str, str]) -> Senses:
    """Explains the signs taken by as few turns as can be, and counts what fixes each."""
    stated = frozenset(id(f) for f in fitted if f.batch.said or _stated(f, signs)[1] is not None)
    sure = {id(f): s for f in fitted if (s := _sign(f)) is not None}
    turns, cost = _explained(fitted, sure)
    out = Senses(turns, _unfixed(fitted, sure, turns, stated), stated_ids=stated)
    for f in fitted:
        if id(f) in sure and _turned_by(f) and id(f) not in stated | out.unfixed.keys() and _against(f) < FIXED_BY:
            other = sure | {id(f): -sure[id(f)]}
            flipped, less = _explained(fitted, other)
            if less[0] <= cost[0] and id(f) not in _unfixed(fitted, other, flipped, stated):
                out.unfixed[id(f)] = _too_few(f)
    return _with_reversed_load(fitted, sure, out)


def _explained(fitted: list[Fitted], sure: Mapping[int, int]) -> tuple[frozenset[str], tuple[int, int]]:
    """The fewest turns that explain the signs, and what they cost."""
    every = [dict(zip(TURNS, flags, strict=True)) for flags in product((False, True), repeat=4)]
    cost, _, best = min((_cost(fitted, sure, flags), k, flags) for k, flags in enumerate(every))
    return frozenset(t for t, on in best.items() if on), cost


def _unfixed(
    fitted: list[Fitted], sure: Mapping[int, int], turns: frozenset[str], stated: frozenset[int]
) -> dict[int, str]:
    """Why the sign of a batch is not fixed, by its id: the turn that explains it, or its own sign, has too few values."""
    out: dict[int, str] = {}
    odd = [f for f in fitted if id(f) in sure and sure[id(f)] != _predicted(f, turns)]
    for turn in sorted(turns):
        touched = [f for f in fitted if id(f) in sure and f not in odd and turn in _turned_by(f)]
        if sum(_against(f) for f in touched) < FIXED_BY and not any(id(f) in stated for f in touched):
            for f in touched:
                out[id(f)] = f"too few values fix that {TURN_WORDS[turn]}; state it with signs in a reading file"
    return out | {id(f): _too_few(f) for f in odd if _against(f) < FIXED_BY and id(f) not in stated}


def _too_few(f: Fitted) -> str:
    what = "reaction moment" if (f.batch.kind, f.batch.quantity) == ("reaction", "moment") else f.batch.quantity
    return f"too few values fix the sign of {what} beside the other signs of the claim; state it in a reading file"


def _turned_by(f: Fitted) -> tuple[str, ...]:
    if f.batch.kind == "end" and f.batch.quantity == "moment" and f.taken.convention.form != "action":
        return ()
    return _TURNED_BY.get((f.batch.kind, f.batch.quantity), ())


def _predicted(f: Fitted, turns: frozenset[str]) -> int:
    return -1 if sum(t in turns for t in _turned_by(f)) % 2 else 1


def _cost(fitted: list[Fitted], sure: Mapping[int, int], flags: Mapping[str, bool]) -> tuple[int, int]:
    turns = frozenset(t for t, on in flags.items() if on)
    odd = sum(sure[id(f)] != _predicted(f, turns) for f in fitted if id(f) in sure and _turned_by(f))
    return 2 * odd + len(turns), len(turns)


def _sign(f: Fitted) -> int | None:
    """The sign taken, or None where both signs do as well."""
    other = _opposite(f)
    if other is None or (other.fits and f.taken.fits):
        return None
    return f.taken.convention.sign


def _opposite(f: Fitted) -> Choice | None:
    c = f.taken.convention
    return next(
        (o for o in f.choices if (o.convention.form, o.convention.rule, o.convention.sign) == (c.form, c.rule, -c.sign)),
        None,
    )


def _against(f: Fitted) -> int:
    """Values that the opposite sign would make bad and the one taken does not."""
    other = _opposite(f)
    return 0 if other is None else int((other.bad & other.telling & ~f.taken.bad).sum())


def _with_reversed_load(fitted: list[Fitted], sure: Mapping[int, int], out: Senses) -> Senses:
    """Member forces, reactions and displacements all reversed: no convention turns all of these."""
    straight = ("axial", "shear", "fx", "fy", "dx", "dy", "across")
    signs: dict[str, set[int]] = {}
    turning: set[int] = set()
    for f in fitted:
        if id(f) not in sure:
            continue
        if f.batch.quantity in straight:
            signs.setdefault(GROUPS[f.batch.kind], set()).add(sure[id(f)])
        elif f.batch.kind in ("end", "reaction", "displacement") and f.taken.convention.form != "internal":
            turning.add(sure[id(f)])
        else:
            signs.setdefault(GROUPS[f.batch.kind], set()).add(sure[id(f)])
    if "member forces" not in signs:
        moments = {sure[id(f)] for f in fitted if id(f) in sure and GROUPS[f.batch.kind] == "member forces"}
        signs["member forces"] = moments
    groups = ("member forces", "reactions", "displacements")
    all_reversed = all(signs.get(g) == {-1} for g in groups) and len(turning) <= 1
    if not all_reversed or any(id(f) in out.stated_ids for f in fitted):
        return out
    base: dict[int, Choice] = {}
    for f in fitted:
        if id(f) in sure and (other := _opposite(f)) is not None and (f.batch.quantity in straight or turning == {-1}):
            base[id(f)] = other
    return replace(out, reversed_load=True, base=base, unfixed={}, turns=frozenset())
