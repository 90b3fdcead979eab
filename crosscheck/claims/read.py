"""Reading a claim: text to a Reading, stage by stage (decode, lines, tables, columns, values), keeping the trace."""

from __future__ import annotations

import hashlib
import re
from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field, replace
from math import hypot, isnan
from pathlib import Path

from crosscheck.claims.decode import lines_of, read_source, refuse
from crosscheck.claims.echo import Echo, Piece, echo_facts, in_our_names, learn, pieces_stated
from crosscheck.claims.enveloping import governing, once, with_governing
from crosscheck.claims.grid import Grid, grid_of
from crosscheck.claims.meaning import LAST_WORDS, START_WORDS, Meaning, Role, column, dimension_of, meaning_of
from crosscheck.claims.names import MemberHit, Names, plain, without_prefix
from crosscheck.claims.numbers import Number, commas_are_decimal, is_blank, parse_number
from crosscheck.claims.readfile import checked
from crosscheck.claims.reading import EchoFact, Entry, FrameNames, Kind, LineTrace, Reading, ReadingOptions, TableRead
from crosscheck.claims.scan import RawTable, Scan, cells_of, is_number, scan
from crosscheck.claims.sentences import entries_told, speaks_of_results
from crosscheck.claims.stated import Stated, stated_in, states_face, with_options
from crosscheck.claims.which import Which, which_of
from crosscheck.claims.words import Size, unit_of
from crosscheck.frame.units import Dimension

MOST_TRACED = 2000
"""Lines not understood that are kept: more of them say no more."""


def read_claim(path_or_dash: str | Path | None, frame_names: FrameNames, options: ReadingOptions | None = None) -> Reading:
    """Reads the claim in a file, or "-" for standard input. Raises UnusableInput where it cannot be opened or decoded, or
    holds no results at all."""
    options = options or ReadingOptions()
    if path_or_dash is None:  # values in words alone
        return read_claim_text("", frame_names, options)
    file, digest, text = read_source(path_or_dash, options.sheet)
    return _read(text, frame_names, options, file, digest)


def read_claim_text(text: str, frame_names: FrameNames, options: ReadingOptions | None = None, file: str = "") -> Reading:
    """Reads a claim that is already text. Raises UnusableInput where it holds no results at all."""
    digest = hashlib.sha256(text.encode("utf-8", errors="replace")).hexdigest()
    return _read(text, frame_names, options or ReadingOptions(), file, digest)


def _read(text: str, frame_names: FrameNames, options: ReadingOptions, file: str, digest: str) -> Reading:
    options = checked(options, frame_names)
    names = Names(frame_names, options.members, options.joints, options.cases)
    scanned = scan(lines_of(text), names)
    stated = with_options(stated_in(scanned), options)
    reader = _Reader(names, options, stated, scanned)
    read = [reader.understood(raw) for raw in scanned.tables if raw.rows]
    reader.learn(read)
    reader.learn_by_joints(read)
    reader.strange = _strange(read, names)
    if reader.strange:
        some = ", ".join(f'"{label}"' for label in reader.strange[:3])
        reader.undecided.append(
            f"none of the names it prints ({some} ...) is one of the frame's; is it a claim of this frame? If it is, "
            "a reading file says which members and joints they are"
        )
    reader.commas = any(commas_are_decimal(_numbers(grid)) for _, grid, _ in read)
    for raw, grid, meaning in read:
        reader.table(raw, grid, meaning)
    for line, sentence, case in scanned.sentences:
        reader.sentence(line, sentence, case)
    reader.unread_words()
    for sentence in options.values:
        reader.value(sentence, file)
    if not reader.entries and reader.untold:
        reader.undecided.append(reader.untold[0])
    if reader.left_inside:
        whole = ", ".join(sorted(reader.left_inside))
        reader.notes.append(f"values inside {whole} are not compared: it is not said where its parts meet")
    reader.notes += reader.envelope_notes()
    if not reader.entries and not reader.foreign and not reader.undecided and not scanned.unknown_cases:
        refuse(file or "claim", *_nothing(scanned, reader))
    return Reading(
        file=file,
        sha256=digest,
        entries=tuple(reader.entries),
        tables=tuple(reader.tables),
        trace=tuple(scanned.trace[k] for k in sorted(scanned.trace)),
        rows=len({e.line for e in reader.entries} | {line for line, _, _ in reader.foreign}),
        not_understood=tuple(reader.odd[:MOST_TRACED]),
        foreign=tuple(reader.foreign),
        signs=stated.signs,
        notes=tuple(reader.notes),
        undecided=tuple(dict.fromkeys([*reader.undecided, *reader.unread_said()])),
        echo=tuple(reader.echo),
        unknown_cases=tuple(scanned.unknown_cases),
        expect=scanned.expect,
        face=options.face if options.face is not None else states_face(scanned),
    )


def _strange(read: list[_Table], names: Names) -> list[str]:
    """The names of members and joints that the tables of results print, where the frame has none of them."""
    labels: dict[str, None] = {}
    for raw, grid, meaning in read:
        if meaning.kind.startswith("echo"):
            continue
        if any(raw.blocks):
            return []
        of = [k for k, r in enumerate(meaning.roles) if r.name in ("member", "joint", "start joint", "end joint")]
        cells = [row[k] for row in grid.rows for k in of] if meaning.kind else [_first_word(text) for _, text in raw.rows]
        labels |= dict.fromkeys(c for c in cells if not is_blank(c))
    known = any(names.member(c) or names.joint(c) for c in labels)
    return [] if known or len(labels) < 2 else list(labels)


def _first_word(text: str) -> str:
    """What of a row of a table that cannot be understood may be a name."""
    return next((c.text for c in cells_of(text)[1] if c.text and not is_number(c.text)), "")


def _nothing(scanned: Scan, reader: _Reader) -> tuple[str, str]:
    rows = sum(len(t.rows) for t in scanned.tables)
    why = f": {reader.odd[0][2]}" if reader.odd else ""
    nothing = f"no results were recognised{why}" if why else "it holds no results"
    return (
        f"no results were recognised in its {rows} rows of numbers{why}" if rows else nothing,
        "give a table with heads such as Member, End, N, V, M, or say what the columns are with --columns",
    )


def _numbers(grid: Grid) -> Iterator[list[str]]:
    """The numbers of each column."""
    return ([c for c in column(grid, k) if is_number(c)] for k in range(len(grid.heads)))


@dataclass(slots=True)
class _Place:
    """Where a row's values belong, as far as the row says."""

    member: MemberHit | None = None
    joint: str | None = None
    end: int | None = None
    place: int | None = None
    case: str | None = None
    at: Number | None = None
    which: Which | None = None


@dataclass(slots=True)
class _Carried:
    """Cells that a row may leave empty because the row above says it."""

    member: str = ""
    case: str = ""
    start: str = ""
    last: str = ""
    pair: dict[str, str] = field(default_factory=dict)
    """Of the rows "max" and "min" of one place."""


class _Misread(Exception):
    """A row that cannot be used; `foreign` where it speaks of what the frame lacks."""

    def __init__(self, why: str, foreign: bool = False) -> None:
        super().__init__(why)
        self.foreign = foreign


_Table = tuple[RawTable, Grid, Meaning]


def _runs(piece: Piece) -> int:
    """Which way a part runs, from what is known of its two ends."""
    if piece.start < piece.end or piece.start == 0.0 or (isnan(piece.start) and piece.end > 0):
        return 1
    return -1 if piece.start > piece.end or piece.end == 0.0 or piece.start > 0 else 1


@dataclass(slots=True)
class _Reader:
    names: Names
    options: ReadingOptions
    stated: Stated
    scanned: Scan
    entries: list[Entry] = field(default_factory=list)
    tables: list[TableRead] = field(default_factory=list)
    odd: list[tuple[int, str, str]] = field(default_factory=list)
    unread: list[tuple[int, str]] = field(default_factory=list)
    foreign: list[tuple[int, str, str]] = field(default_factory=list)
    notes: list[str] = field(default_factory=list)
    undecided: list[str] = field(default_factory=list)
    echo: list[EchoFact] = field(default_factory=list)
    left_inside: set[str] = field(default_factory=set)
    strange: list[str] = field(default_factory=list)
    """The names that it prints, where none is the frame's."""
    untold: list[str] = field(default_factory=list)
    """Why values in words were not understood."""
    without_case: int = 0
    """Values that go with an extreme of another quantity, of a combination that is not named."""
    ungoverned: int = 0
    """Extremes whose governing combination has a name that the frame does not know."""
    commas: bool = False
    """Does any table of the paste show that its commas stand before decimals? A table that cannot tell follows it."""

    def understood(self, raw: RawTable) -> _Table:
        grid = grid_of(raw, self.names, self.options.columns)
        return raw, grid, with_governing(meaning_of(grid, raw, self.names), grid, self.names)

    def learn(self, read: list[_Table]) -> None:
        """Names from the other model's own input, and from the reading file's lists of elements."""
        echo = Echo()
        for _, grid, meaning in read:
            if meaning.kind.startswith("echo"):
                echo.facts += echo_facts(meaning.kind, grid, meaning)
        learn(echo, self.names)
        ends = {f.where: tuple(str(f.value).split("\t")) for f in echo.facts if f.what == "member ends"}
        hits = dict(echo.members)
        for label, p in (echo.pieces | pieces_stated(self.options.parts, self.names)).items():
            pair = ends.get(label)
            hits[label] = MemberHit(p.member, _runs(p), (p.start, p.end), (pair[0], pair[1]) if pair else None)
        self.names.learn(echo.joints, hits, echo.inner)
        self.echo, self.notes = in_our_names(echo, self.names), [*self.notes, *echo.notes]
        if hits or echo.joints:
            read[:] = [t if t[2].kind.startswith("echo") else self.understood(t[0]) for t in read]

    def learn_by_joints(self, read: list[_Table]) -> None:
        """Members that the paste only numbers, each told by both its joints in a table of member ends. Names that are not
        numbers are names: a member that the frame lacks stays one."""
        ends: dict[str, set[str]] = {}
        for _, grid, meaning in read:
            at = {r.name: k for k, r in enumerate(meaning.roles)}
            if meaning.kind != "end" or not {"member", "joint"} <= at.keys():
                continue
            label = ""
            for row in grid.rows:
                label = label if is_blank(row[at["member"]]) else row[at["member"]]
                if label and not is_blank(row[at["joint"]]):
                    ends.setdefault(label, set()).add(row[at["joint"]])
        numbers = all(without_prefix(label, "member").isdigit() for label in ends)
        if not ends or not numbers or any(self.names.member(label) for label in ends):
            return  # where some names are the frame's, the others are no other numbering
        hits = {}
        for label, joints in ends.items():
            pair = [self.names.joint(j) for j in sorted(joints)]
            hit = self.names.between(str(pair[0]), str(pair[1])) if len(pair) == 2 and all(pair) else None
            if hit is None:
                return
            hits[label] = replace(hit, run=0)
        if len({hit.name for hit in hits.values()}) < len(hits):
            return
        self.names.learn({}, hits, ())
        said = [f"{label} is {hit.name}" for label, hit in list(hits.items())[:4]] + ["..."] * (len(hits) > 4)
        self.notes.append(f"members have other numbers and are told by their joints: {', '.join(said)}")
        read[:] = [t if t[2].kind.startswith("echo") else self.understood(t[0]) for t in read]

    def table(self, raw: RawTable, grid: Grid, meaning: Meaning) -> None:
        """Reads one table into entries; what cannot be used is noted by line."""
        number = len(self.tables) + 1
        self.odd += grid.odd
        if meaning.kind and not meaning.kind.startswith("echo"):
            self.unread += [(line, why) for line, text, why in grid.odd if self._begins_with_a_name(text)]
        self._trace(grid.odd)
        columns = tuple((h.text, _says(r)) for h, r in zip(grid.heads, meaning.roles, strict=False))
        self.tables.append(TableRead(number, raw.heading, meaning.kind, columns, len(grid.rows), raw.rows[0][0], raw.case))
        if not meaning.kind:
            self._unused(raw, meaning)
        elif not meaning.kind.startswith("echo"):
            if meaning.why:
                self.undecided.append(f"table {number}: {meaning.why}")
            self._keep(_in_order(list(self._rows(number, raw, grid, meaning))), raw)

    def _begins_with_a_name(self, text: str) -> bool:
        first = next((c.text for c in cells_of(text)[1] if c.text), "")
        return self.names.member(first) is not None or self.names.joint(first) is not None

    def unread_said(self) -> list[str]:
        """Results that stand there and cannot be read keep a claim from agreeing; in a table that nobody can read
        they say nothing."""
        if not self.unread or not self.entries:
            return []
        line, why = self.unread[0]
        many = f"{len(self.unread)} results" if len(self.unread) > 1 else "a result"
        return [f"{many} could not be read (line {line}: {why}); correct what is printed, or leave it out"]

    def envelope_notes(self) -> Iterator[str]:
        """What of an envelope's table is not compared."""
        if n := self.without_case:
            values = f"{n} values that go" if n > 1 else "a value that goes"
            yield f"{values} with an extreme of another quantity: not compared, the combination is not named"
        if n := self.ungoverned:
            which = f"{n} governing combinations" if n > 1 else "a governing combination"
            yield f"{which} not compared: the frame has no such name; say which is meant under [cases] of a reading file"

    def _keep(self, entries: list[Entry], raw: RawTable) -> None:
        """Entries of a table; end values whose end nothing tells are not understood."""
        entries = self._of_bars(entries)
        lost = {e.line for e in entries if e.kind == "end" and e.end is None and e.place is None}
        self.entries += [e for e in entries if e.line not in lost]
        rows = [(line, text, "which end of the member is not said") for line, text in raw.rows if line in lost]
        self.odd += rows
        self._trace(rows)
        if rows:
            self.undecided.append(
                f"{len(rows)} rows from line {rows[0][0]} do not say which end of the member they are for; "
                "name the joint or the end, or say what the columns are with --columns"
            )

    def _of_bars(self, entries: list[Entry]) -> list[Entry]:
        """One axial force a member, as tables of bar forces have it: all of a bar has one force but for loads along it."""
        places = [(e.case, e.member, e.extreme) for e in entries]
        open_ones = all(e.kind == "end" and e.quantity == "axial" and e.end is None and e.place is None for e in entries)
        if not entries or not open_ones or len(set(places)) < len(places):
            return entries
        return [replace(e, kind="span", at=0.5, at_share=True, run=1, whole=True) for e in entries]

    def sentence(self, line: int, text: str, case: str | None) -> None:
        """Values in words on a line of the paste."""
        entries, odd = entries_told(text, line, len(self.tables) + 1, self.names)
        self.entries += [replace(e, case=e.case or case) for e in entries]
        self.untold += [part.why for part in odd]
        self.unread += [(line, part.why) for part in odd if part.result]
        rows = [(line, text.strip()[:200], part.why) for part in odd]
        self.odd += rows
        self._trace(rows)

    def unread_words(self) -> None:
        """Headings, remarks and heads of no rows that hold a value in words which nothing has read."""
        idle = {line for table in self.scanned.tables if not table.rows for line, _ in table.heads}
        rows = [
            (line, trace.text.strip(), "a value in words that is not understood")
            for line, trace in sorted(self.scanned.trace.items())
            if line in idle or trace.taken_for in ("heading", "remark") and not trace.why
            if speaks_of_results(trace.text)
        ]
        self.odd += rows
        self._trace(rows)

    def value(self, text: str, file: str) -> None:
        """A value given by the user in words. Raises UnusableInput where it is not understood."""
        entries, odd = entries_told(text, 0, len(self.tables) + 1, self.names)
        if odd or not entries:
            refuse(
                "", f'--value "{text}" is not understood{": " + odd[0].why if odd else ""}',
                'write it like "B1-C1 max 412 kNm", with names of the frame',
            )  # fmt: skip
        self.entries += entries

    def _unused(self, raw: RawTable, meaning: Meaning) -> None:
        rows = [(line, text, meaning.why) for line, text in raw.rows]
        self.odd += rows
        self._trace(rows)
        busy = [text for _, text in raw.rows if sum(is_number(c.text) for c in cells_of(text)[1]) >= 2]
        if not self.strange and (raw.heads or len(busy) >= 2):
            self.undecided.append(
                f"the table at line {raw.rows[0][0]} cannot be understood ({meaning.why}); "
                "say what its columns are with --columns"
            )

    def _trace(self, rows: list[tuple[int, str, str]]) -> None:
        for line, text, why in rows:
            self.scanned.trace[line] = LineTrace(line, text[:200], "not understood", why)

    def _rows(self, number: int, raw: RawTable, grid: Grid, meaning: Meaning) -> Iterator[Entry]:
        values = [k for k, r in enumerate(meaning.roles) if r.name in ("value", "station")]
        comma = commas_are_decimal(column(grid, k) for k in values)
        unsure = comma is None and not self.commas
        comma = True if comma is None else comma
        carried = _Carried()
        for row, line, kept in zip(grid.rows, grid.lines, grid.kept, strict=True):
            text = raw.rows[kept][1]
            try:
                place = self._place(row, meaning, carried, raw, raw.blocks[kept], bool(comma))
                for entry in self._entries(number, line, text, row, meaning, place, bool(comma)):
                    yield replace(entry, comma_open=True) if unsure else entry
            except _Misread as why:
                (self.foreign if why.foreign else self.odd).append((line, text.strip()[:200], str(why)))
                self._trace([(line, text, str(why))])

    # -- where the row's values belong

    def _place(
        self, row: list[str], meaning: Meaning, carried: _Carried, raw: RawTable, block: MemberHit | None, comma: bool
    ) -> _Place:
        cells = {r.name: row[k] for k, r in enumerate(meaning.roles) if r.name not in ("", "value", "governs")}
        cells = once(cells, carried.pair, cells.get("member", ""))
        place = _Place(case=self._case(cells, carried, raw), which=which_of(cells.get("which", "")))
        if meaning.kind in ("reaction", "displacement"):
            place.joint = self._joint(cells.get("joint", ""))
            return place
        place.member = self._member(cells, carried, block)
        if meaning.kind == "end":
            self._end(place, cells)
        if "station" in cells:
            place.at = self._station(cells["station"], comma)
        return place

    def _case(self, cells: Mapping[str, str], carried: _Carried, raw: RawTable) -> str | None:
        if "case" not in cells:
            if raw.case_label and raw.case is None:
                if raw.case_label not in self.scanned.unknown_cases:
                    self.scanned.unknown_cases.append(raw.case_label)
                raise _Misread(f'load case "{raw.case_label}" is not one of the frame')
            return raw.case
        carried.case = cells["case"] or carried.case
        if not carried.case:
            return raw.case
        name = self.names.case(carried.case)
        if name is None:
            if carried.case not in self.scanned.unknown_cases:
                self.scanned.unknown_cases.append(carried.case)
            raise _Misread(f'load case "{carried.case}" is not one of the frame')
        return name

    def _joint(self, label: str) -> str:
        if is_blank(label):
            raise _Misread("no joint is named")
        name = self.names.joint(label)
        if name is None and self.names.is_inner(label):
            raise _Misread(f'"{label}" is no joint of the frame: it only divides a member')
        if name is None:
            raise _Misread(f'the frame has no joint "{label}"', foreign=True)
        return name

    def _member(self, cells: Mapping[str, str], carried: _Carried, block: MemberHit | None) -> MemberHit:
        label = cells.get("member", "")
        if not is_blank(label) and label != carried.member:
            carried.member, carried.start, carried.last = label, "", ""
        carried.start = cells.get("start joint", "") or carried.start
        carried.last = cells.get("end joint", "") or carried.last
        hit = self.names.member(carried.member) if carried.member else block
        if carried.start and carried.last:
            return self._between(hit, carried)
        if hit is None:
            if carried.member:
                raise _Misread(f'the frame has no member "{carried.member}"', foreign=True)
            raise _Misread("no member is named")
        return hit

    def _between(self, hit: MemberHit | None, carried: _Carried) -> MemberHit:
        """The member of a row that names both its joints; they say which way it runs."""
        first, last = self.names.joint(carried.start), self.names.joint(carried.last)
        ends = self.names.frame.members[hit.name] if hit else None
        if ends and (first, last) in (ends, ends[::-1]):
            assert hit
            return MemberHit(hit.name, 1 if (first, last) == ends else -1)
        found = self.names.between(first, last) if first and last else None
        if found is None or (hit and carried.member):
            label = carried.member or f"{carried.start}-{carried.last}"
            raise _Misread(f'the frame has no member "{label}" from {carried.start} to {carried.last}', foreign=True)
        return found

    def _end(self, place: _Place, cells: Mapping[str, str]) -> None:
        assert place.member
        first, last = self.names.frame.members[place.member.name]
        for label in (cells.get("joint", ""), cells.get("end", "")):
            if is_blank(label):
                continue
            if place.member.ends and plain(label) in (ends := [plain(e) for e in place.member.ends]):
                place.place = ends.index(plain(label))
                continue
            joint = self.names.joint(label)
            if joint in (first, last):
                place.joint, place.end = joint, 0 if joint == first else 1
            elif plain(label) in START_WORDS | LAST_WORDS:
                place.place = 0 if plain(label) in START_WORDS else 1
            else:
                raise _Misread(f'"{label}" is not an end of member {place.member.name}', foreign=True)

    @staticmethod
    def _station(label: str, comma: bool) -> Number:
        number = parse_number(label, comma)
        if number is None:
            raise _Misread(f'"{label}" is not a distance')
        return number

    # -- its values

    def _entries(
        self, table: int, line: int, text: str, row: list[str], meaning: Meaning, place: _Place, comma: bool
    ) -> Iterator[Entry]:
        station = next((r for r in meaning.roles if r.name == "station"), None)
        for k, role in enumerate(meaning.roles):
            if role.name != "value" or is_blank(row[k]):
                continue
            number = parse_number(row[k], comma)
            unit = role.unit or self.stated.unit(role.quantity)
            pulls = _pulls(number, row, k, meaning) if number is not None and role.quantity == "axial" else 0
            if number is not None and pulls:
                number = replace(number, value=pulls * abs(number.value), tail=_PULLS.sub("", number.tail))
            if number is not None and number.tail:
                stuck = unit_of(number.tail)
                number, unit = (number, stuck) if stuck and _suits(stuck, role.quantity) else (None, unit)
            if number is None:
                why = f'"{row[k]}" is not a number'
                self.odd.append((line, text.strip()[:200], why))
                self.unread.append((line, why))
                self._trace([(line, text, why)])
                continue
            entry = self._entry(table, line, role, number, unit, meaning, place, station)
            if entry is not None:
                entry = self._enveloped(entry, row, k, meaning, place)
            if entry is not None:
                yield replace(entry, sense="said") if pulls else entry

    def _enveloped(self, entry: Entry, row: list[str], k: int, meaning: Meaning, place: _Place) -> Entry | None:
        """The entry as an envelope's extreme, where its row or column says it is one, with what governs it; a value that
        goes with another quantity's extreme is one of the combination that governs that."""
        which = place.which
        if which is None and not meaning.roles[k].which:
            return entry
        own = which is None or which.is_of(entry.quantity)
        values = sum(r.name == "value" for r in meaning.roles)
        if not own:
            named = next((row[j] for j, r in enumerate(meaning.roles) if r.name == "governs"), "")
            case = self.names.case(named) if named else None
            if case not in self.names.frame.cases or entry.kind == "extreme":
                self.without_case += 1
                return None
            return replace(entry, case=case, along=True, beside=place.case)
        label = governing(row, meaning.roles, k, values == 1 or bool(which and which.noun))
        name = self.names.case(label) if label else None
        self.ungoverned += bool(label) and not is_blank(label) and name is None
        bound = meaning.roles[k].which or (which.which if which else "")
        return replace(entry, extreme=bound or None, governs=name or "")

    def _entry(
        self, table: int, line: int, role: Role, number: Number, unit: Size | None, meaning: Meaning, place: _Place,
        station: Role | None,
    ) -> Entry | None:  # fmt: skip
        kind: Kind = "end" if meaning.kind == "ends" else role.kind or meaning.kind  # type: ignore[assignment]
        hit = place.member
        if hit is None:
            return Entry(table, line, kind, role.quantity, number, unit, joint=place.joint, case=place.case, axes=role.axes)
        if kind == "end":
            spot = role.end if role.end is not None else place.place
            end, spot, run = _joined(place.end, spot, hit.run) if hit.part is None else (None, spot, hit.run)
            joint = None if end is None else self.names.frame.members[hit.name][end]
            entry = Entry(
                table, line, kind, role.quantity, number, unit, hit.name, joint, end, spot, run, case=place.case,
                axes=role.axes,
            )  # fmt: skip
            return entry if hit.part is None else self._of_part(entry, spot, hit)
        if kind == "extreme" and hit.part is not None:
            raise _Misread("the largest value of a part of a member is not that of the member")
        if kind == "extreme":
            which = role.which or (place.which.which if place.which else "size")
            return Entry(
                table, line, kind, role.quantity, number, unit, hit.name, run=hit.run, case=place.case, extreme=which,
                axes=role.axes,
            )  # fmt: skip
        assert place.at is not None and station is not None
        at_unit = station.unit or (None if station.share else self.stated.unit("station"))
        percent = 0.01 if station.share and "%" in (place.at.tail + str(station.unit)) else 1.0
        start, stop = hit.part or (None, None)
        if start is not None and stop is not None and (isnan(start) or isnan(stop)):
            raise _Misread("it is not said where in its member this part lies")
        return Entry(
            table, line, kind, role.quantity, number, unit, hit.name, run=hit.run, case=place.case, axes=role.axes,
            at=place.at.value * percent, at_half=place.at.half * percent, at_unit=at_unit, at_share=station.share,
            origin=start, reach=None if start is None or stop is None else abs(stop - start),
        )  # fmt: skip

    def _of_part(self, entry: Entry, spot: int | None, hit: MemberHit) -> Entry | None:
        """An end value of a part: of the member's own end, or of a place inside it."""
        if spot is None or hit.part is None:
            raise _Misread("which end of the part is not said")
        at = hit.part[spot]
        if isnan(at):
            self.left_inside.add(hit.name)
            return None
        entry = replace(entry, place=spot)
        first, last = self.names.frame.members[hit.name]
        (x0, y0), (x1, y1) = self.names.frame.xy[first], self.names.frame.xy[last]
        length = hypot(x1 - x0, y1 - y0)
        if at in (0.0, length) or abs(at - length) <= 1e-9 * length:
            end = 0 if at == 0.0 else 1
            return replace(entry, end=end, joint=(first, last)[end])
        return replace(entry, end=spot if hit.run > 0 else 1 - spot, cut=at)


_PULLS = re.compile(r"\s*\(?\b(?:(?P<pulls>t|tens(?:ion|ile)?)|c|comp(?:ression|ressive)?)\b\.?\)?$", re.IGNORECASE)
"""Tension or compression said by a letter or a word: "188.7 (C)", or T and C in a column of their own."""


def _pulls(number: Number, row: list[str], k: int, meaning: Meaning) -> int:
    """+1 where a letter says tension, -1 compression, 0 where none does.

    A T behind a number is tonnes unless the head states a unit."""
    stuck = _PULLS.match(number.tail) if meaning.roles[k].unit or number.tail.strip("()").upper() == "C" else None
    beside = (_PULLS.fullmatch(c) for c, r in zip(row, meaning.roles, strict=True) if not r.name and c)
    found = stuck or next((m for m in beside if m), None)
    return 0 if found is None else 1 if found.group("pulls") else -1


def _suits(unit: Size, quantity: str) -> bool:
    return unit.dimension == dimension_of(quantity) or (quantity == "rotation" and unit.dimension == Dimension())


def _joined(end: int | None, place: int | None, run: int) -> tuple[int | None, int | None, int]:
    """The frame's end, the paste's and the run, each from the others where the paste says two of them."""
    if run and end is None and place is not None:
        return (place if run > 0 else 1 - place), place, run
    if run and place is None and end is not None:
        return end, (end if run > 0 else 1 - end), run
    if not run and end is not None and place is not None:
        return end, place, 1 if end == place else -1
    return end, place, run


def _in_order(entries: list[Entry]) -> list[Entry]:
    """End rows that leave open which way members run: the row that comes first may be the start. Rows that name no end
    at all are start and end by their order."""
    if not entries or entries[0].kind != "end" or all(e.place is not None for e in entries):
        return entries
    lines: dict[tuple[str | None, str | None], list[int]] = {}
    for e in entries:
        seen = lines.setdefault((e.case, e.member), [])
        if e.line not in seen:
            seen.append(e.line)
    if any(len(seen) != 2 for seen in lines.values()):
        return entries
    return [e if e.place is not None else replace(e, place=lines[e.case, e.member].index(e.line)) for e in entries]


def _says(role: Role) -> str:
    """A role in words, for --show-reading."""
    parts = [role.which, role.quantity or role.name]
    if role.end is not None:
        parts.append(("at the start", "at the end")[role.end])
    if role.unit:
        parts.append(f"in {role.unit.text}")
    return " ".join(p for p in parts if p) or "not used"


__all__ = ["read_claim", "read_claim_text"]
