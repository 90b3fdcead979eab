"""Closing a reading's open choices: signs, units, the way members run, and the case, by what fits the opinions.

Nothing is explained away: one choice holds for a whole quantity, a choice that is not the plain one counts only if at least
three values fix it, and where no choice fits the claim disagrees in all of them.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass, field, replace

import numpy as np

from crosscheck.answer import AXIAL, Answer
from crosscheck.claims.reading import Entry, Reading
from crosscheck.compare.claimed import ClaimedValue, ClosedClaim
from crosscheck.compare.enveloped import as_of, candidates, name_of, parted_name, prepared, silent_part, unaudited
from crosscheck.compare.fit import Choice, Fitted, Fitter
from crosscheck.compare.fit_conventions import Batch, distance, placed
from crosscheck.compare.fit_signs import Senses, narrowed, plain_where_loads_turn, senses
from crosscheck.compare.fit_stations import with_stations
from crosscheck.compare.fit_values import EnvelopeReference, Reference
from crosscheck.compare.fit_variants import open_moment, variants
from crosscheck.compare.tolerance import Tolerance
from crosscheck.frame.model import Frame
from crosscheck.frame.units import FORCE, LENGTH, MOMENT, Dimension, unit_name

FIXED_BY = 3
"""Values above tolerance that must fix a choice."""
_NO_CASE = 1_000_000
"""Counts for the values that do not fit where no case is found at all."""
_EXTREME = {"max": 1, "min": -1, "size": 0}


def close(
    reading: Reading, frame: Frame, answers: Mapping[str, Answer], case: str | None, tolerance: Tolerance
) -> ClosedClaim:
    """The claim in the frame's own units, signs and names, or the reasons why it cannot be judged.

    case: the one asked for by name; it is given to values whose case the paste leaves open, and others are left out.
    """
    closer = _Closer(reading, frame, answers, tolerance)
    if not answers:
        return closer.result((), [], ["no opinion speaks for this frame"])
    entries, notes = _of_case(reading, case)
    ways: list[tuple[int, ClosedClaim]] = []
    ways_said: list[str] = []
    open_moments = any(open_moment(e) for e in entries)
    for tried, said in variants(entries, frame, reading.face):
        closed = _close_case(closer, tried, [*notes, said] if said else notes, case)
        # At least three values must speak against the plain way where another is taken.
        if closer.sure(closed) and not (ways and ways[0][0] < FIXED_BY):
            return closed
        ways.append((sum(closer.bad[n] for n in closed.cases) if closed.cases else _NO_CASE, closed))
        ways_said.append(said.removesuffix(", by fit"))
    if open_moments:
        return _without_open_moments(closer, entries, notes, case)
    if any(e.comma_open for e in entries):
        reason = "commas may stand before decimals or before thousands; print one number with both marks, or with a point"
        return closer.result((), notes, [reason])
    plain, best = ways[0], min(ways, key=lambda way: way[0])
    if best[1].cases and best[0] == 0 < plain[0] < FIXED_BY:
        few = f"{plain[0]} value{'' if plain[0] == 1 else 's'}"
        tells = "tells" if plain[0] == 1 else "tell"
        reason = f"it fits where {ways_said[ways.index(best)]}, but only {few} {tells} that; state it"
        return closer.result(plain[1].cases, notes, [reason])
    # Another way than the plain one must explain at least three values, and most of what does not fit.
    return best[1] if best[1].cases and plain[0] - best[0] >= FIXED_BY and 2 * best[0] < plain[0] else plain[1]


def _without_open_moments(closer: _Closer, entries: list[Entry], notes: list[str], case: str | None) -> ClosedClaim:
    """Judged on everything else: moments at joints fit neither as reactions nor surely as those of members."""
    left = [e for e in entries if not open_moment(e)]
    reason = (
        'it is not said whether the moments at joints are reactions or those of members; '
        'write "reactions" above them, or name the member'
    )
    if not left:
        return closer.result((), notes, [reason])
    closed = _close_case(closer, left, notes, case)
    return replace(closed, undecided=(*closed.undecided, reason))


def _close_case(closer: _Closer, entries: list[Entry], notes: list[str], case: str | None) -> ClosedClaim:
    frame, answers = closer.frame, closer.answers
    if case is not None:
        entries = [as_of(e, case) for e in entries]
    if parted := parted_name(entries, frame):
        meant = frame.meant(parted)
        opened = [replace(e, case=None) if e.case == parted else e for e in entries]
        closed = _by_fit(closer, opened, list(meant), [*notes, f"{parted} became {len(meant)} combinations"])
        assert closed is not None
        return closed
    if all(name_of(e) is not None for e in entries):
        return closer.close(entries, notes)
    if len(frame.names) == 1 and not frame.several:
        return closer.close([as_of(e, name_of(e) or frame.names[0]) for e in entries], notes)
    singles, several = candidates(entries, frame, answers)
    if not singles and not several:
        reason = "the claim gives greatest and least values of several cases, and the frame has no envelope; state one"
        return closer.result((), notes, [reason])
    if singles and several:
        closed = _by_fit(closer, entries, singles, notes, told=False)
        if closed is not None:
            return closed
    closed = _by_fit(closer, entries, several or singles, notes)
    assert closed is not None
    return closed


def _of_case(reading: Reading, case: str | None) -> tuple[list[Entry], list[str]]:
    """Entries of the case asked for; with none asked for, all."""
    if case is None:
        return list(reading.entries), []
    entries = [e for e in reading.entries if name_of(e) in (None, case)]
    left = len(reading.entries) - len(entries)
    return entries, [f"{left} values of other cases are left out"] if left else []


def _by_fit(
    closer: _Closer, entries: list[Entry], names: list[str], notes: list[str], told: bool = True
) -> ClosedClaim | None:
    """The one case that the values without a case fit; undecided where none or several do. told: whether that is said
    where none does, or None given."""
    tried = {n: closer.close([as_of(e, name_of(e) or n) for e in entries], notes) for n in names}
    known = {*closer.result((), [], []).undecided}  # what is undecided in the reading itself, whichever case is meant
    fitting = [n for n, closed in tried.items() if not closer.bad[n] and known.issuperset(closed.undecided)]
    if len(fitting) == 1:
        name = fitting[0]
        said = f'the claim names no case; "{name}" is the only one of {len(names)} that it fits'
        return replace(tried[name], notes=(said, *tried[name].notes))
    if not fitting and not told:
        return None
    why = "fits none of them" if not fitting else f"fits {' and '.join(fitting)}"
    known_names = (*closer.frame.names, *closer.frame.several)
    reason = f"the claim names no load case and {why}; say which with --case ({', '.join(known_names)})"
    return closer.result((), notes, [reason])


@dataclass(slots=True)
class _Closer:
    reading: Reading
    frame: Frame
    answers: Mapping[str, Answer]
    tolerance: Tolerance
    bad: dict[str, int] = field(default_factory=dict)
    _references: dict[str, Reference] = field(default_factory=dict)

    def sure(self, closed: ClosedClaim) -> bool:
        """Does everything fit, and is nothing open but what the reading itself leaves open?"""
        known = {*self.result((), [], []).undecided}
        return bool(closed.cases) and not any(self.bad[n] for n in closed.cases) and known.issuperset(closed.undecided)

    def close(self, entries: list[Entry], notes: Iterable[str]) -> ClosedClaim:
        """Every entry has its case by now. Counts in `bad` the values that fit no choice."""
        notes = list(notes)
        known = (*self.frame.names, *self.frame.several)
        named, judged = {e.case for e in entries}, {name_of(e) for e in entries}
        every, cases = (tuple(n for n in known if n in some) for some in (named, judged))
        missing = {n: part for n in every if (part := silent_part(self.frame, self.answers, n))}
        undecided = [f"no opinion speaks for {p}{f' of {n}' if n != p else ''}" for n, p in missing.items()]
        silent, every = [*missing], tuple(n for n in every if n not in missing)
        entries, loose = prepared([e for e in entries if e.case not in silent], self.frame)
        undecided += loose
        entries, varying = self._of_whole_members(entries)
        undecided += varying
        entries = with_stations(entries, self.frame)
        batches = _batches(entries, self.frame, every)
        fitter = Fitter(self.frame.units, [self._reference(n) for n in every], self.tolerance)
        fitted = [narrowed(f, self.reading.signs) for f in fitter.fit(batches)]
        plain_where_loads_turn(fitted, self.reading.signs)
        meant = senses(fitted, self.reading.signs)
        open_choices = _open(fitted, meant)
        sure_to_fail = any(not f.taken.fits for f in fitted if id(f) not in open_choices)
        for name in cases:
            self.bad[name] = sum(int(f.taken.bad.sum()) for f in fitted)
        if sure_to_fail:
            notes += [f"{why}; it disagrees whichever is meant" for why in open_choices.values()]
        else:
            undecided += open_choices.values()
        values: list[ClaimedValue] = []
        for f in fitted:
            if id(f) not in open_choices or sure_to_fail:
                values += self._values(f, entries, every, meant)
        closed = self.result(cases, notes, undecided)
        closed = replace(closed, notes=(*closed.notes, *unaudited(cases, self.frame)))
        return replace(
            closed,
            values=tuple(sorted(values, key=lambda v: v.line)),
            units=_units_said(fitted, entries, self.frame),
            signs={key: meant.words(f) for key, f in _by_key(fitted)},
            fits={key: _fits(f) for key, f in _by_key(fitted)},
            reversed_load=meant.reversed_load,
        )

    def _of_whole_members(self, entries: list[Entry]) -> tuple[list[Entry], list[str]]:
        """Without the axial forces of whole members along which ours varies by more than the tolerance."""
        out, varying = [], []
        for e in entries:
            if e.whole and any(self._varies(str(e.member), part) for part in self._reference(str(e.case)).parts):
                varying.append(str(e.member))
            else:
                out.append(e)
        if not varying:
            return entries, []
        members = f"{', '.join(varying[:5])}{' ...' if len(varying) > 5 else ''}"
        reason = f"it is not said where along {members} the axial force is, which varies there; name the joint or the end"
        return out, [reason]

    def _varies(self, member: str, part: Reference) -> bool:
        """Does the axial force along a member differ by more than half the tolerance of a claim?"""
        m = self.frame.member_index[member]
        least, greatest = part.extremes[m, :, AXIAL]
        return bool(greatest - least > 0.5 * self.tolerance.relative * part.member_scale("axial")[m])

    def _reference(self, name: str) -> Reference | EnvelopeReference:
        if name in self.frame.several:
            return EnvelopeReference(tuple(self._single(n) for n in self.frame.meant(name)))
        return self._single(name)

    def _single(self, name: str) -> Reference:
        if name not in self._references:
            self._references[name] = Reference(self.frame, self.answers, name)
        return self._references[name]

    def result(self, cases: tuple[str, ...], notes: list[str], undecided: list[str]) -> ClosedClaim:
        r = self.reading
        unknown = [
            f'load case "{label}" is not one of the frame\'s ({", ".join((*self.frame.names, *self.frame.several))}); '
            "say which it is in a reading file, or with --case"
            for label in r.unknown_cases
        ]
        return ClosedClaim(
            file=r.file, sha256=r.sha256, rows=r.rows, cases=cases, values=(),
            notes=(*r.notes, *notes), not_understood=r.not_understood, foreign=r.foreign,
            undecided=tuple(dict.fromkeys([*r.undecided, *unknown, *undecided])),
        )  # fmt: skip

    def _values(self, fitted: Fitted, entries: list[Entry], cases: tuple[str, ...], meant: Senses) -> list[ClaimedValue]:
        """The batch in the frame's own units and signs."""
        batch, choice = fitted.batch, meant.shown(fitted)
        sign, joints, at = _to_frame(batch, choice, self.frame)
        factor = np.where(np.isnan(batch.factor), choice.unit.factor if choice.unit else 1.0, batch.factor)
        value, half = batch.value * factor * sign, batch.half * factor
        value = np.where(batch.unsigned, np.abs(value) * choice.side, value)
        out = []
        for k, index in enumerate(batch.entry.tolist()):
            e = entries[index]
            kind = "span" if e.cut is not None else batch.kind
            out.append(
                ClaimedValue(
                    case=cases[int(batch.case[k])],
                    kind=kind,  # type: ignore[arg-type]
                    quantity=batch.quantity,  # type: ignore[arg-type]
                    member=e.member,
                    joint=joints[k],
                    at=at[k],
                    value=float(value[k]),
                    half_digit=float(half[k]),
                    line=e.line,
                    printed=e.number.printed,
                    extreme=_turned(e.extreme, float(sign[k])),  # type: ignore[arg-type]
                    governs=e.governs,
                    beside=e.beside or "",
                )  # fmt: skip
            )
        return out


def _turned(extreme: str | None, sign: float) -> str | None:
    """A largest value printed with the sign reversed is a smallest one."""
    return {"max": "min", "min": "max"}.get(extreme, extreme) if extreme and sign < 0 else extreme


# -- entries to arrays


def _batches(entries: list[Entry], frame: Frame, cases: tuple[str, ...]) -> list[Batch]:
    """Entries by kind and quantity: what one convention and one unit must hold for."""
    groups: dict[tuple[str, str, str, bool], list[int]] = {}
    for k, e in enumerate(entries):
        groups.setdefault((e.kind, e.quantity, e.sense, e.kind == "extreme" and e.joint is not None), []).append(k)
    return [_batch(key[0], key[1], where, entries, frame, cases) for key, where in groups.items()]


def _batch(kind: str, quantity: str, where: list[int], entries: list[Entry], frame: Frame, cases: tuple[str, ...]) -> Batch:
    mine = [entries[k] for k in where]
    spoken = {n: k for k, n in enumerate(cases)}
    at = [(_at(e, e.at, frame), _at(e, e.at_half, frame)) for e in mine]

    def ints(values: Iterable[int | None]) -> np.ndarray:
        return np.array([-1 if v is None else v for v in values], dtype=np.int64)

    return Batch(
        kind=kind, quantity=quantity, cases=cases,
        case=ints(spoken[str(e.case)] for e in mine),
        member=ints(frame.member_index[e.member] if e.member else None for e in mine),
        joint=ints(frame.joint_index[e.joint] if e.joint else None for e in mine),
        end=ints(e.end for e in mine), place=ints(e.place for e in mine), run=ints(e.run for e in mine),
        at=np.array([x for x, _ in at]), at_half=np.array([half for _, half in at]),
        at_share=np.array([e.at_share for e in mine]),
        extreme=ints(_EXTREME.get(e.extreme or "size", 0) for e in mine),
        cut=np.array([np.nan if e.cut is None else e.cut for e in mine]),
        origin=np.array([np.nan if e.origin is None else e.origin for e in mine]),
        governs=ints(frame.names.index(e.governs) if e.governs in frame.names else None for e in mine),
        unsigned=np.array([e.sense == "size" or e.extreme == "size" for e in mine]), said=mine[0].sense == "said",
        value=np.array([e.number.value for e in mine]), half=np.array([e.number.half for e in mine]),
        factor=np.array([_factor(e, frame) for e in mine]), entry=np.array(where, dtype=np.int64),
    )  # fmt: skip


def _at(e: Entry, at: float | None, frame: Frame) -> float:
    """A distance of the entry in the frame's length, or as a share of its member's."""
    if at is None:
        return 0.0
    return at if e.at_unit is None or e.at_share else at * e.at_unit.factor / frame.units.metre


def _factor(e: Entry, frame: Frame) -> float:
    """What one of the stated unit is in the frame's units; NaN where none is stated."""
    if e.unit is None:
        return np.nan
    d: Dimension = e.unit.dimension
    return float(e.unit.factor / frame.units.newton**d.force / frame.units.metre**d.length)


# -- what is still open, and what is said of it


def _open(fitted: list[Fitted], meant: Senses) -> dict[int, str]:
    """Batches whose choice is not fixed, and what would settle it."""
    out: dict[int, str] = {}
    for f in fitted:
        if f.taken.fits:
            why = meant.unfixed.get(id(f), "") or _form_unfixed(f) or _unit_unfixed(f, fitted)
        else:
            why = "" if meant.stated(f) else _signs_at_odds(f)
        if why:
            out[id(f)] = why
    total = sum(int(f.taken.telling.sum()) for f in fitted)
    if total and total < FIXED_BY and not out:
        for f in fitted:
            if f.taken.fits and f.taken.telling.any() and not _same_whichever(f) and not meant.stated(f):
                what = f"too few values ({total}) to tell the sign of {f.batch.quantity}"
                out[id(f)] = f"{what}; state it with signs in a reading file"
    return out


def _same_whichever(f: Fitted) -> bool:
    return all(c.fits for c in f.choices)


def _form_unfixed(f: Fitted) -> str:
    """Another kind of convention that fewer than three values speak against. The plain kind needs none, and members that
    run as in the frame need none against other directions."""
    plain, mine = f.choices[0].convention, f.taken.convention
    for other in f.choices:
        c = other.convention
        rival = (mine.form != plain.form and c.form != mine.form) or (mine.rule != plain.rule and c.rule == plain.rule)
        against = int((other.bad & other.telling).sum())
        if rival and not other.fits and against < FIXED_BY:
            return (
                f"only {against} value{'' if against == 1 else 's'} of {f.batch.quantity} "
                f'tell{"s" if against == 1 else ""} "{mine.words}" from "{c.words}"; '
                "state which with signs in a reading file"
            )
    return ""


def _unit_unfixed(f: Fitted, fitted: list[Fitted]) -> str:
    """A unit that is not the frame's own needs three values that it fits, of all that share it."""
    unit = f.taken.unit
    if unit is None or unit.own or not _open_and_telling(f):
        return ""
    telling = sum(_open_and_telling(g) for g in fitted if g.taken.unit and g.taken.unit.text == unit.text)
    if telling >= FIXED_BY:
        return ""
    return f"{f.batch.quantity} fits in {unit.text}, but too few values ({telling}) fix that; state it with --units"


def _open_and_telling(f: Fitted) -> int:
    return int((f.taken.telling & ~f.taken.bad & np.isnan(f.batch.factor)).sum())


def _signs_at_odds(f: Fitted) -> str:
    """All sizes right and several members with the other sign: the convention is not understood, which is not an error
    of one member."""
    batch, bad = f.batch, f.taken.bad
    if batch.kind in ("reaction", "displacement") or f.taken.sizes_bad.any():
        return ""
    members = set(batch.member[f.taken.telling].tolist())
    turned = set(batch.member[bad].tolist())
    if len(turned) < 2 or 4 * len(turned) <= len(members):
        return ""
    return (
        f"every size of {batch.quantity} is right, but {len(turned)} of {len(members)} members need another sign than the "
        "rest; state the sign convention, or which way members run, in a reading file"
    )


def _fits(f: Fitted) -> tuple[int, int]:
    """How many of the values that can tell a sign fit, and how many there are."""
    telling = f.taken.telling
    return int((telling & ~f.taken.bad).sum()), int(telling.sum())


def _to_frame(batch: Batch, choice: Choice, frame: Frame) -> tuple[np.ndarray, list[str | None], list[float | None]]:
    """(n,) factor that turns a printed value's sign into the frame's, joints, and distances from the `from` joint."""
    names = list(frame.joints)
    c = choice.convention
    sign = np.full(len(batch.value), float(c.sign))
    if batch.kind in ("reaction", "displacement"):
        return sign, [names[j] for j in batch.joint.tolist()], [None] * len(sign)
    end, place, r = placed(batch, frame, c.rule)
    if batch.kind == "end":
        joints = [names[j] for j in frame.member_table.ends[batch.member, end].tolist()]
        if batch.quantity == "shear":
            sign = sign * r
        if c.form == ("action" if batch.quantity == "axial" else "internal"):
            at_start = -1 if batch.quantity == "axial" else 1
            sign = sign * np.where(place == 0, at_start, -at_start)
        inside = ~np.isnan(batch.cut)
        if batch.quantity != "axial":  # where a part ends, its actions are values along the member, reversed at its end
            sign = np.where(inside & (end == 1), -sign, sign)
        named = [None if cut else j for j, cut in zip(joints, inside.tolist(), strict=True)]
        return sign, named, [x if cut else None for x, cut in zip(batch.cut.tolist(), inside.tolist(), strict=True)]
    if batch.quantity in ("moment", "across"):
        sign = sign * r
    at = distance(batch, frame, r).tolist() if batch.kind == "span" else [None] * len(sign)
    return sign, [names[j] if j >= 0 else None for j in batch.joint.tolist()], at


def _units_said(fitted: list[Fitted], entries: list[Entry], frame: Frame) -> dict[str, str]:
    out: dict[str, str] = {}
    for key, f in _by_key(fitted):
        stated = {str(e.unit.text) for k in f.batch.entry.tolist() if (e := entries[k]).unit}
        found = f.taken.unit.text if f.taken.unit and np.isnan(f.batch.factor).any() else ""
        how = "assumed" if f.taken.unit and f.taken.unit.own else "by fit"
        said = [*sorted(stated), *([f"{found} ({how})"] if found else [])]
        out[key] = ", ".join(said) or unit_name(frame.units, _dimension(f.batch.quantity))
    return out


def _dimension(quantity: str) -> Dimension:
    if quantity in ("axial", "shear", "fx", "fy"):
        return FORCE
    return MOMENT if quantity == "moment" else LENGTH


def _by_key(fitted: list[Fitted]) -> list[tuple[str, Fitted]]:
    """Batches by what reports call them: the quantity, with its kind where an earlier one has that name."""
    out: dict[str, Fitted] = {}
    for f in fitted:
        out[f.batch.quantity if f.batch.quantity not in out else f"{f.batch.kind} {f.batch.quantity}"] = f
    return list(out.items())
