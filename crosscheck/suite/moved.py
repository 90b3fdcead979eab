"""What moved: today's values against those on record, or one record against another."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, replace

from crosscheck.check import Opinions
from crosscheck.compare.differences import Difference, Place, worst_first
from crosscheck.compare.tolerance import RECORD, Scales, allowed
from crosscheck.suite.record import QUANTITIES, Entry, Record, Rows, agreed_tables

Tables = Mapping[str, Rows]
Envelopes = Mapping[str, tuple[str, ...]]
SINCE, BETWEEN = ("now", "on record"), ("here", "there")
"""What the two sides are called: of a frame and its record, of two records."""


@dataclass(frozen=True, slots=True)
class Moved:
    """differences: worst first, of compared values. envelopes: which are over other names, a sentence each; unknown:
    envelopes of the frame that the record does not speak of."""

    differences: tuple[Difference, ...]
    compared: int
    envelopes: tuple[str, ...] = ()
    unknown: tuple[str, ...] = ()

    @property
    def any(self) -> bool:
        return bool(self.differences or self.envelopes)

    @property
    def says(self) -> str:
        """How many values hold or moved, and what became of envelopes."""
        count = len(self.differences)
        said = f"{count:,} of {self.compared:,} values moved" if count else f"{self.compared:,} values hold"
        unknown = (f"envelope {name} is not on record" for name in self.unknown)
        return "; ".join((said, *self.envelopes, *unknown))


def against_record(result: Opinions, record: Record) -> Moved:
    """What moved since the values went on record."""
    frame, on_record = result.frame, record.now
    values = {name: agreed_tables(result, name) for name in result.names}
    scales = {name: result.judgements[name].scales for name in result.names}
    known = {name: frame.envelopes[name].names for name in result.envelopes if name in on_record.envelopes}
    unknown = tuple(name for name in result.envelopes if name not in known)
    found = _compared(Entry({}, values, known), on_record, SINCE, scales)
    return replace(found, unknown=unknown)


def between_records(here: Record, there: Record) -> Moved:
    """What differs between the values that hold in two records, whose frames are not solved again."""
    return _compared(here.now, there.now, BETWEEN, {})


def _compared(ours: Entry, theirs: Entry, names: tuple[str, str], scales: Mapping[str, Scales]) -> Moved:
    """scales: of cases by name; those of a case not among them follow from its values."""
    found: list[Difference] = []
    compared = 0
    for case in _all(ours.values, theirs.values):
        a, b = ours.values.get(case, {}), theirs.values.get(case, {})
        differences, count = _compare_tables(case, a, b, scales.get(case) or _scales_of(a, b), names)
        found += differences
        compared += count
    says = []
    for name in _all(ours.envelopes, theirs.envelopes):
        if change := _other_names(ours.envelopes.get(name, ()), theirs.envelopes.get(name, ()), names):
            says.append(f"envelope {name}: {change}")
            differences, count = _extremes_moved(name, ours, theirs, names)
            found += differences
            compared += count
    return Moved(tuple(worst_first(found)), compared, tuple(says))


def _all(ours: Mapping[str, object], theirs: Mapping[str, object]) -> list[str]:
    return [*ours, *(name for name in theirs if name not in ours)]


# --- values of one case


def _compare_tables(
    case: str, ours: Tables, theirs: Tables, scales: Scales, names: tuple[str, str]
) -> tuple[list[Difference], int]:
    """Differences of two sets of tables of one case by the tolerance for records, and how many values were compared."""
    found: list[Difference] = []
    compared = 0
    for table, quantities in QUANTITIES.items():
        mine, other = ours.get(table, {}), theirs.get(table, {})
        for key in _all(mine, other):
            for k, quantity in enumerate(quantities):
                a = mine[key][k] if key in mine else None
                b = other[key][k] if key in other else None
                if a is None and b is None:
                    continue
                compared += 1
                found += _apart(_place(case, table, key, quantity), a, b, scales.of(quantity), names)
    return found, compared


def _apart(place: Place, a: float | None, b: float | None, scale: float, names: tuple[str, str]) -> list[Difference]:
    values = {names[0]: a, names[1]: b}
    if a is None or b is None:
        return [Difference(place, values, float("inf"), 0.0, note="only one of the two gives a value")]
    may = float(allowed(a, b, RECORD, scale))
    apart = abs(a - b)
    return [] if apart <= may else [Difference(place, values, apart, may)]


def _place(case: str, table: str, key: str, quantity: str) -> Place:
    if table == "ends":
        member, _, joint = key.rpartition(" at ")
        return Place(case, "member_ends", quantity, member=member, joint=joint)
    return Place(case, "joints" if table == "joints" else "reactions", quantity, joint=key)


def _scales_of(*sides: Tables) -> Scales:
    """Scales of a case, or of several, from values alone."""

    def largest(table: str, columns: tuple[int, ...]) -> float:
        rows = [row for side in sides for row in side.get(table, {}).values()]
        return max((abs(row[c] or 0.0) for row in rows for c in columns), default=0.0)

    forces = max(largest("ends", (0, 1)), largest("reactions", (0, 1)))
    moments = max(largest("ends", (2,)), largest("reactions", (2,)))
    return Scales(forces, moments, largest("joints", (0, 1)), largest("joints", (2,)))


# --- envelopes


def _other_names(ours: Sequence[str], theirs: Sequence[str], names: tuple[str, str]) -> str:
    """Which names an envelope is over on one side only, in words; "" where it is over the same on both."""
    alone = ((names[0], [n for n in ours if n not in theirs]), (names[1], [n for n in theirs if n not in ours]))
    return ", ".join(f"over {', '.join(some)} {side} only" for side, some in alone if some)


def _extremes_moved(name: str, ours: Entry, theirs: Entry, names: tuple[str, str]) -> tuple[list[Difference], int]:
    """Greatest and least values of an envelope that is over other names, with what governs them. (Of one over the same
    names they move only where a value of these does.)"""
    sides = [[e.values[n] for n in e.envelopes.get(name, ()) if n in e.values] for e in (ours, theirs)]
    if not all(sides):
        return [], 0
    scales = _scales_of(*(tables for side in sides for tables in side))
    mine, other = (_extremes(e, name) for e in (ours, theirs))
    found: list[Difference] = []
    both = [place for place in mine if place in other]
    for place in both:
        (a, by), (b, its) = mine[place], other[place]
        governs = f"{by} governs {names[0]}, {its} {names[1]}"
        found += [replace(d, note=governs) for d in _apart(place, a, b, scales.of(place.quantity), names)]
    return found, len(both)


def _extremes(entry: Entry, name: str) -> dict[Place, tuple[float, str]]:
    """The greatest and least value at each place, with the name that governs, the first of equals."""
    out: dict[Place, tuple[float, str]] = {}
    for of in entry.envelopes[name]:
        for place, value in _values(name, entry.values.get(of, {})):
            for extreme, sign in (("max", 1.0), ("min", -1.0)):
                key = replace(place, extreme=extreme)
                if key not in out or sign * value > sign * out[key][0]:
                    out[key] = value, of
    return out


def _values(name: str, tables: Tables) -> Iterator[tuple[Place, float]]:
    for table, quantities in QUANTITIES.items():
        for key, row in tables.get(table, {}).items():
            for quantity, value in zip(quantities, row, strict=True):
                if value is not None:
                    yield _place(name, table, key, quantity), value
