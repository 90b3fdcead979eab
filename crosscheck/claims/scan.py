"""Third stage: lines to tables. Each line is taken for a head, a row, a heading, a rule, a total or a remark.

Nothing is compared or named here beyond what tells a heading ("Load case: dead") from a row.
"""

from __future__ import annotations

import re
from dataclasses import dataclass, field
from functools import lru_cache

from crosscheck.claims.names import MemberHit, Names, plain, without_prefix
from crosscheck.claims.numbers import is_blank, parse_number
from crosscheck.claims.reading import LineTrace
from crosscheck.claims.sentences import looks_told
from crosscheck.claims.split import PULLS, Cell, Separator, is_rule, join_units, separator_of, split, wide_cells
from crosscheck.claims.which import which_of
from crosscheck.claims.words import RESULT_NOUNS, head_of, is_header_word, unit_of

LONGEST_HEADING = 300
LONGEST_LINE = 20_000
"""Characters: a longer line is no row of a table, and reading it must not take long."""
_CASE = re.compile(
    r"(?:load\s*(?:case|combination|comb\w*)|lc|l/c|case|combination|comb(?:o|ination)?|loading|results? for|load"
    r"|envelopes?(?:\s+(?:of|for))?)\b"
    r"(?:\s*(?:no|nr|number|name)\b\.?)?[\s:#=.\u2013-]*(.+)",
    re.IGNORECASE,
)
_CASE_LABEL = re.compile(r"\W*(?:load\s*(?:case|combination|comb)|lc|case|comb(?:o|ination)?)\b\W*\w", re.IGNORECASE)
_OF_ENVELOPE = re.compile(r"(\S+)\s+envelopes?\b", re.IGNORECASE)
_ENVELOPE_LABEL = re.compile(r"\W*envelope\W+([^\W_]\S*)\W*", re.IGNORECASE)
_MEMBER = re.compile(r"(?:members?|memb|mbr|beams?|elements?|elem|bars?|rods?|columns?)\b[\s:#=.]*(\S.*)", re.IGNORECASE)
_TOTAL = re.compile(
    r"(?:sum|totals?|sigma|\u03a3|\u2211|sub-?total|resultant|average|mean|applied|check)\b|[\u03a3\u2211]", re.I
)
_ABOUT_A_MEMBER = re.compile(r"\b(?:from|to|length|section|between)\b|\bl\s*=", re.IGNORECASE)
_AFTER_NAME = re.compile(r"[,(;]|\s(?:from|length|section)\b|\sl\s*=", re.IGNORECASE)
_TITLE = re.compile(
    r"\b(?:forces|reactions|displacements|moments|results|rotations|deflections|actions|translations|values|coordinates"
    r"|summary|properties|table)\b",
    re.IGNORECASE,
)
_UNITS_SENTENCE = re.compile(
    r"^\W*(?:all\s+)?units?\b|\b(?:forces?|moments?|displacements?|deflections?|rotations?|lengths?|reactions?|values|results)\s+"
    r"(?:are\s+)?(?:given\s+)?in\s+\S",
    re.IGNORECASE,
)
_TELLING = re.compile(
    r"case|comb|lc|load|result|unit|positive|negative|kn|kip|\bin\b|mm|reaction|displ|force|moment|member|joint|node",
    re.IGNORECASE,
)
_DASHES = frozenset("-\u2013\u2212")
_DIGIT = re.compile(r"\d")
_WORDS = re.compile(r"[\s,;:.()]+")
_NAME_PARTS = re.compile(r"[\s,;()]+")
_SPOILT = re.compile(r"\d|\*\*|##|^#|^[+-]?(?:inf|infinity|overflow)$", re.IGNORECASE)
"""What is left of a number that was printed too wide, divided by zero or mistyped."""
_MISTYPED = re.compile(r"[+\-\u2212]?\d*[.,]?\d")
"""What a mistyped number begins with."""
_DATE = re.compile(
    r"\b\d{1,4}[-/.]\d{1,2}[-/.]\d{1,4}\b|\b\d{1,2}:\d{2}\b|\bpage\b|\bsheet\b|\bprinted\b|\bversion\b|\brev(?:ision)?\b"
    r"|\bdate\b|\bproject\b|\bjob\b|\bcopyright\b|\bfile\b|https?:|\bdtype\b|\bname:|\[\d+ rows x \d+ columns\]",
    re.IGNORECASE,
)


@dataclass(slots=True)
class RawTable:
    """Lines that belong together. heads and rows: (line number, text); members: block name by row, as hit."""

    heads: list[tuple[int, str]]
    heading: str = ""
    rows: list[tuple[int, str]] = field(default_factory=list)
    blocks: list[MemberHit | None] = field(default_factory=list)
    case: str | None = None
    case_label: str = ""


@dataclass(slots=True)
class Scan:
    """What the lines were taken for."""

    tables: list[RawTable] = field(default_factory=list)
    trace: dict[int, LineTrace] = field(default_factory=dict)
    headings: list[tuple[int, str]] = field(default_factory=list)
    remarks: list[tuple[int, str]] = field(default_factory=list)
    sentences: list[tuple[int, str, str | None]] = field(default_factory=list)
    """Lines with values in words, and the case whose heading they stand under."""
    unknown_cases: list[str] = field(default_factory=list)
    expect: str = ""


@lru_cache(maxsize=256)  # a line is asked for once as itself, and again as the row above the next
def cells_of(line: str) -> tuple[Separator, list[Cell]]:
    """The line's separator and cells; units put to their numbers."""
    separator = separator_of(line)
    cells = split(line, separator)
    return separator, (join_units(cells) if separator == "blank" else cells)


def _names_columns(cells: list[str]) -> bool:
    """Are most of the cells known as heads, and is a result among them?"""
    cells = [c for c in cells if c.lower().strip(".:") not in ("no", "nr", "number")]  # of "Member no."
    known = [h for c in cells if is_header_word(c) and (h := head_of(c))]
    if len(known) < 2:
        return False
    units = sum(unit_of(c.strip("[](){}")) is not None for c in cells)
    results = any(h.noun in RESULT_NOUNS or h.noun in ("x", "E", "I", "A") or h.which for h in known)
    return len(known) + units >= 0.6 * len(cells) and (results or len(known) == len(cells))


def _is_envelope_label(text: str) -> bool:
    """ "Envelope SLS": one word that is none of a table's own names the envelope."""
    found = _ENVELOPE_LABEL.fullmatch(text)
    return bool(found) and not is_header_word(found.group(1)) and not _TITLE.search(found.group(1))  # type: ignore[union-attr]


def _end_numbers(filled: list[str]) -> int:
    """How many cells are a 1 or 2 behind a result's symbol ("N 1"): ends of members in a head."""
    pairs = zip(filled, filled[1:], strict=False)
    return sum(b in ("1", "2") and head_of(a).noun in RESULT_NOUNS for a, b in pairs)


def _with_prefixes(words: list[str]) -> list[str]:
    """Words such as "Member" or "Node" put to the names behind them, and pairs such as "B - A" together."""
    out: list[str] = []
    for word in words:
        if out and (word in _DASHES or out[-1][-1:] in _DASHES or _is_prefix(out[-1])):
            out[-1] = f"{out[-1]} {word}"
        else:
            out.append(word)
    return out


def _is_prefix(word: str) -> bool:
    return any(without_prefix(f"{word} x", kind) == "x" for kind in ("member", "joint"))


@lru_cache(maxsize=64)
def _joins(head: str) -> bool:
    """Do the heads say which joints members join, and nothing of results?"""
    separator, cells = cells_of(head)
    texts = [c.text for c in cells if c.text]
    wide = [c.text for c in wide_cells(head)]
    heads = [head_of(t) for t in (wide if separator == "blank" and len(wide) > 2 else texts)]
    nouns, ends = {h.noun for h in heads}, {h.end for h in heads}
    return "member" in nouns and {0, 1} <= ends and not nouns & {*RESULT_NOUNS, "case", "station", "which", "x"}


def is_prose(text: str) -> bool:
    """A line of many words and no figures that says nothing of columns, cases, units or signs."""
    if len(text) < 25 or "\t" in text or "|" in text or _DIGIT.search(text) or _TELLING.search(text):
        return False
    words = _WORDS.split(text.lower())
    return len(words) > 5 and sum(map(is_header_word, words)) < 2


def is_number(text: str) -> bool:
    """A number, alone or with a unit stuck to it."""
    read = parse_number(text) or parse_number(text, decimal_comma=True)
    return read is not None and (not read.tail or unit_of(read.tail) is not None or read.tail.upper() in PULLS)


def scan(lines: list[str], names: Names) -> Scan:
    """Takes each line for what it is."""
    return _Scanner(names).run(lines)


class _Scanner:
    def __init__(self, names: Names) -> None:
        self.names = names
        known = (*names.frame.cases, *names.frame.envelopes)
        self.case_words = frozenset(w for name in known for w in _NAME_PARTS.split(name.casefold()) if w)
        self.out = Scan()
        self.table: RawTable | None = None
        self.heading: list[str] = []
        self.case: str | None = None
        self.case_label = ""
        self.block: MemberHit | None = None

    def run(self, lines: list[str]) -> Scan:
        for number, text in enumerate(lines, 1):
            taken, why = self._take(number, text)
            if taken:
                self.out.trace[number] = LineTrace(number, text[:200], taken, why)
        return self.out

    def _take(self, number: int, text: str) -> tuple[str, str]:
        if not text.strip():
            return "", ""
        if len(text) > LONGEST_LINE:
            return "remark", "too long for a line of a table"
        body = self._without_hash(text)
        if is_rule(text) or not body.strip():
            return "rule", ""
        if body.strip().lower().startswith("expect:"):
            self.out.expect = body.strip()[7:].strip()
            return "expect", ""
        if body is not text and body.rstrip().endswith((".", "!", "?")):
            return "note", ""  # a sentence is neither a heading nor a head
        if is_prose(body):
            return "remark", ""
        separator, cells = cells_of(body)
        filled = [c.text for c in cells if c.text]
        numbers = sum(is_number(t) for t in filled)
        return (
            self._sentence(number, body, filled)
            or self._mistyped_row(number, body, filled, numbers)
            or self._joining_row(number, body, filled, separator)
            or self._head(number, body, filled, numbers, separator)
            or self._heading_of_case(number, body, filled, numbers)
            or self._heading_of_member(body, filled, numbers)
            or self._row(number, body, filled, numbers)
            or self._heading(number, body)
        )

    @staticmethod
    def _without_hash(text: str) -> str:
        """Headings may be written as remarks ("# case: dead") or as titles ("## Reactions")."""
        return text.lstrip().lstrip("#").lstrip() if text.lstrip().startswith("#") else text

    # -- heads

    def _head(
        self, number: int, text: str, filled: list[str], numbers: int, separator: Separator
    ) -> tuple[str, str] | None:
        if self._is_units(filled) and self._head_is_open():
            assert self.table
            self.table.heads.append((number, text))
            return "head", "units"
        if separator == "blank" and numbers:
            filled = text.split()
            numbers = sum(is_number(t) for t in filled)
        if numbers > _end_numbers(filled) or not self._says_columns(text, filled, separator):
            return None
        if (label := self._case_in(text)) and self.names.case(label):
            return None  # "Load case: sway_right" is no head, though "right" and "case" are words of heads
        if self._head_is_open() and len(self.table.heads) < 3:  # type: ignore[union-attr]
            assert self.table
            self.table.heads.append((number, text))
            return "head", "second line"
        if self.table and self.table.rows and self._repeats(text, self.table):
            self.heading = []
            return "head", "repeated"
        if self.table is not None and self.table.rows and self.table.blocks[-1] is self.block:
            self.block = None  # the heading of a member holds for the table below it
        self.table = self._fresh([(number, text)], " / ".join(self.heading))
        self.heading = []
        return "head", ""

    def _repeats(self, text: str, table: RawTable) -> bool:
        """The head of the page before, under no heading that was not there before."""
        same = plain(text) in {plain(t) for _, t in table.heads}
        return same and all(h in table.heading for h in self.heading)

    def _fresh(self, heads: list[tuple[int, str]], heading: str) -> RawTable:
        table = RawTable(heads, heading, case=self.case, case_label=self.case_label)
        self.out.tables.append(table)
        return table

    def _head_is_open(self) -> bool:
        return self.table is not None and bool(self.table.heads) and not self.table.rows and not self.heading

    @staticmethod
    def _is_units(filled: list[str]) -> bool:
        bare = [t.strip("[](){}") for t in filled]
        known = sum(unit_of(t) is not None or t in ("-", "") for t in bare)
        return len(bare) > 0 and known == len(bare) and any(unit_of(t) for t in bare)

    @staticmethod
    def _says_columns(text: str, filled: list[str], separator: Separator) -> bool:
        if separator == "blank" and _TITLE.search(text) and len(wide_cells(text)) == 1:
            return False
        if _UNITS_SENTENCE.search(text):
            return False
        if separator != "blank" and len(filled) > 1 and _Scanner._is_units(filled[1:]):
            return False  # "Member end forces, kN m" is a title with its units
        if _names_columns([t for t in filled if not is_number(t)]):
            return True
        return separator == "blank" and _names_columns([c.text for c in wide_cells(text)])

    # -- headings

    def _heading_of_case(self, number: int, text: str, filled: list[str], numbers: int) -> tuple[str, str] | None:
        if numbers > 1 and len(filled) > 3 or numbers and self._under_cases(text, filled):
            return None
        if numbers and any(which_of(t) or self._knows(t) for t in filled[:4]) and self._as_wide_as_heads(text, filled):
            return None  # a row whose last cell names what governs
        label = self._case_in(text)
        if label is None:
            return None
        name = self._resolve_case(label)
        if name is None and (len(label) > 30 or not (_CASE_LABEL.match(text.strip()) or _is_envelope_label(text))):
            return None
        if name is None and numbers and self.table is not None and self._fits(filled):
            return None
        self.case, self.case_label = name, label
        self._carry_on(number, text)
        return "heading", f"case {name}" if name else f'case "{label}" is not one of the frame'

    def _case_in(self, text: str) -> str | None:
        """The case that a heading names, or None where it names none."""
        if len(text) > LONGEST_HEADING:
            return None
        tidy = " ".join(text.replace("\t", " ").strip().strip("*|[](){}\"'").split())
        if found := _CASE.match(tidy):
            return found.group(1).strip(" .:*\"'|")
        if found := re.search(r"\b(?:load case|case|combination|lc|results for)\b[\s:#=]*(.+)", tidy, re.IGNORECASE):
            label = found.group(1).strip(" .:*\"'|)")
            return label if self._resolve_case(label) else None
        if found := _OF_ENVELOPE.search(tidy):
            return found.group(1) if self._resolve_case(found.group(1)) else None
        parts = [p.strip() for p in re.split(r"\s[-\u2013\u2014]\s|[,;:()\[\]]", tidy) if p.strip()]
        known = (*self.names.frame.cases, *self.names.frame.envelopes)
        exact = [p for p in parts if p.casefold() in {c.casefold() for c in known}]
        return exact[0] if len(exact) == 1 and len(exact[0]) > 1 else None

    def _resolve_case(self, label: str) -> str | None:
        if name := self.names.case(label):
            return name
        pieces = [p for p in re.split(r"\s[-\u2013\u2014]\s|[:;,()\[\]]|\s+", label) if p]
        whole = [p for p in re.split(r"\s[-\u2013\u2014]\s|[:;,()\[\]]", label) if p.strip()]
        for parts in (whole, pieces):
            found = {n for p in parts if (n := self.names.case(p.strip(" \"'")))}
            if len(found) == 1:
                return found.pop()
        return None

    def _heading_of_member(self, text: str, filled: list[str], numbers: int) -> tuple[str, str] | None:
        if len(filled) > 6:
            return None
        tidy = " ".join(text.strip().strip("*|").split())
        found = _MEMBER.fullmatch(tidy)
        label = found.group(1).strip(" :.") if found else tidy.rstrip(":").strip()
        if not found and (numbers or not text.rstrip().endswith(":")):
            return None
        if len(filled) > 2 and (separator_of(text) != "blank" or numbers and not _ABOUT_A_MEMBER.search(tidy)):
            return None
        hit = self.names.member(label)
        if hit is None:
            first = _AFTER_NAME.split(label, maxsplit=1)[0].strip(" :.")
            hit = self.names.member(first) if first else None
        if hit is None:
            return None
        self.block = hit
        return "heading", f"member {hit.name}"

    def _carry_on(self, number: int, text: str) -> None:
        """A new case over the same columns: the head stays."""
        self.out.headings.append((number, text))
        if self.table is not None and not self.table.rows:
            self.table.case, self.table.case_label = self.case, self.case_label
        elif self.table is not None:
            self.table = self._fresh(list(self.table.heads), self.table.heading)
        self.heading.append(" ".join(text.split())[:200])

    def _heading(self, number: int, text: str) -> tuple[str, str]:
        self.out.headings.append((number, text))
        if _UNITS_SENTENCE.search(text):
            return "heading", "units"
        self.heading.append(" ".join(text.split())[:200])
        self.heading = self.heading[-6:]
        return "heading", ""

    # -- rows

    def _sentence(self, number: int, text: str, filled: list[str]) -> tuple[str, str] | None:
        """Values in words: not under a table's head, where a row may have units in its cells."""
        if (self.table is not None and self.table.heads and self._may_follow(filled)) or len(text) > 500:
            return None
        if separator_of(text) in ("tab", "bar") and len(filled) > 2:
            return None
        if _end_numbers(text.split()) > 0 or not looks_told(text, self.names):
            return None
        self.out.sentences.append((number, text, self.case))
        return "values in words", ""

    def _may_follow(self, filled: list[str]) -> bool:
        assert self.table
        if not self.table.rows:
            return any(self._knows(t) for t in filled[:3])
        if "=" in filled and not self._knows(filled[0]) and not is_number(filled[0]):
            return False  # "Sway at eaves = 8.9 mm" is as wide as the row above it
        last = [c.text for c in cells_of(self.table.rows[-1][1])[1]]
        return sum(map(is_number, last)) == sum(map(is_number, filled)) or self._fits(filled, named=False)

    def _row(self, number: int, text: str, filled: list[str], numbers: int) -> tuple[str, str] | None:
        if not numbers:
            return self._named_row(number, text, filled) or self._spoilt_row(number, text, filled)
        if _TOTAL.match(filled[0]) and not self._knows(filled[0]):
            return "total", ""
        if _DATE.search(text) and not self._fits(filled) and not self._knows(filled[0]):
            return "remark", "a date, a page or the like"
        words = [t for t in filled if not is_number(t) and not self._knows(t) and not self._of_envelope(t)
                 and len(re.sub(r"\W", "", t)) > 1]  # fmt: skip
        told = self._parted_otherwise(text) and not self._knows(filled[0])
        if len(words) > max(1 if told else 2, numbers) and (told or not self._as_wide_as_heads(text, filled)):
            self.out.remarks.append((number, text))
            return "remark", ""
        if self.table is None:
            self.table = self._fresh([], " / ".join(self.heading))
        self.heading = []
        self.table.rows.append((number, text))
        self.table.blocks.append(self.block)
        return "row", ""

    def _parted_otherwise(self, text: str) -> bool:
        """Is it a line of words below a table whose cells tabs, commas or bars part?"""
        if self.table is None or not self.table.rows:
            return False
        return separator_of(text) == "blank" != separator_of(self.table.rows[-1][1])

    def _as_wide_as_heads(self, text: str, filled: list[str]) -> bool:
        """ The same by cells that are words, or that two blanks part."""
        if self._under_heads(text, filled) or self.table is None or not self.table.heads:
            return self._under_heads(text, filled)
        head = self.table.heads[0][1]
        alike = separator_of(text) == separator_of(head) == "blank"
        return alike and len(wide_cells(text)) == len(wide_cells(head)) > 2

    def _of_envelope(self, text: str) -> bool:
        """ "max", "min", or the name of what governs, or a word of it."""
        named = text.casefold().strip(",;()") in self.case_words or self.names.case(text) is not None
        return named or which_of(text) is not None

    def _under_heads(self, text: str, filled: list[str]) -> bool:
        """Has the line as many cells as the table has heads? Blank ones count between separators that can be seen."""
        if self.table is None or not self.table.heads:
            return False
        (separator, cells), (as_heads, heads) = cells_of(text), cells_of(self.table.heads[0][1])
        if separator == as_heads != "blank" and len(cells) == len(heads):
            return True
        return len([c for c in heads if c.text]) == len(filled)

    def _under_cases(self, text: str, filled: list[str]) -> bool:
        """Is it a row of a table whose first column names the case?"""
        if self.table is None or not self.table.heads or not self._under_heads(text, filled):
            return False
        return head_of(next((c.text for c in cells_of(self.table.heads[0][1])[1] if c.text), "")).noun == "case"

    def _joining_row(self, number: int, text: str, filled: list[str], separator: Separator) -> tuple[str, str] | None:
        """A row of names alone, under heads that say which joints a member joins."""
        if self.table is None or not self.table.heads or self.heading or not _joins(self.table.heads[0][1]):
            return None
        head = self.table.heads[0][1]
        heads = [c.text for c in cells_of(head)[1] if c.text]
        if separator != separator_of(head):
            return None
        if separator == "blank":
            filled, heads = [c.text for c in wide_cells(text)], [c.text for c in wide_cells(head)]
            if len(filled) < 3 and all(map(self._knows, words := _with_prefixes(text.split()))):  # single blanks
                filled, heads = words, ["", "", ""]
        if len(filled) != len(heads) or len(filled) < 3 or plain(text) == plain(head) or self._is_units(filled):
            return None
        self.table.rows.append((number, text))
        self.table.blocks.append(None)
        return "row", ""

    def _named_row(self, number: int, text: str, filled: list[str]) -> tuple[str, str] | None:
        """The first line of a block may hold the member's name alone, under the table's head."""
        if self.table is not None and len(filled) == 1 and (hit := self.names.member(filled[0])):
            self.block = hit
            return "heading", f"member {hit.name}"
        return None

    def _spoilt_row(self, number: int, text: str, filled: list[str]) -> tuple[str, str] | None:
        """A row all of whose values are spoilt ("*****", "inf", "37.8l4") must not be lost without a word."""
        if self.table is None or len(filled) < 2 or not self._knows(filled[0]):
            return None
        like = (self.table.rows or self.table.heads or [(0, "")])[-1][1]
        cells = [c.text for c in cells_of(like)[1] if c.text]
        values = [t for t in filled[1:] if not self._knows(t) and not is_blank(t)]
        if separator_of(like) != separator_of(text) or len(cells) != len(filled) or not all(map(_SPOILT.search, values)):
            return None
        if not values:
            return None
        self.table.rows.append((number, text))
        self.table.blocks.append(self.block)
        return "row", ""

    def _mistyped_row(self, number: int, text: str, filled: list[str], numbers: int) -> tuple[str, str] | None:
        """A row whose only values are mistyped ("C-D  D  -25.6O"): letters that look like heads make no head of it."""
        if numbers or self.table is None or not self.table.heads or len(filled) < 2 or not self._knows(filled[0]):
            return None
        values = [t for t in filled[1:] if not self._knows(t)]
        if not values or not all(map(_MISTYPED.match, values)):
            return None
        self.heading = []
        self.table.rows.append((number, text))
        self.table.blocks.append(self.block)
        return "row", ""

    def _knows(self, text: str) -> bool:
        return self.names.member(text) is not None or self.names.joint(text) is not None

    def _fits(self, filled: list[str], named: bool = True) -> bool:
        """Does the line have about as many cells as the table's rows?"""
        if self.table is None or not self.table.rows:
            return False
        last = [c for c in cells_of(self.table.rows[-1][1])[1] if c.text]
        return abs(len(last) - len(filled)) <= 1 and (not named or self._knows(filled[0]) or is_number(filled[0]))
