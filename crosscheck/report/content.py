"""What a record is made of, before it is a page: sections of facts, sentences, tables, drawings and verbatim text.

Plain content; the HTML page and the PDF are set from it.
"""

from __future__ import annotations

import hashlib
from collections.abc import Mapping
from dataclasses import dataclass, field
from functools import cached_property

from crosscheck.report.pictures import Picture


@dataclass(frozen=True, slots=True)
class Facts:
    """Label and text, side by side."""

    rows: tuple[tuple[str, str], ...]


@dataclass(frozen=True, slots=True)
class Says:
    """Sentences, one a line."""

    lines: tuple[str, ...]


@dataclass(frozen=True, slots=True)
class Grid:
    """A table: columns as (head, "left" or "right"). `blank`: columns to be filled in by hand."""

    caption: str
    columns: tuple[tuple[str, str], ...]
    rows: tuple[tuple[str, ...], ...]
    blank: tuple[int, ...] = ()


@dataclass(frozen=True, slots=True)
class Verbatim:
    """A text as it stands, line by line."""

    title: str
    lines: tuple[str, ...]


@dataclass(frozen=True, slots=True)
class Gallery:
    """Small pictures side by side; their captions lead where Record.links says."""

    pictures: tuple[Picture, ...]


Block = Facts | Says | Grid | Picture | Gallery | Verbatim


@dataclass(frozen=True, slots=True)
class Section:
    title: str
    blocks: tuple[Block, ...]


@dataclass(frozen=True, eq=False)
class Record:
    """A whole record. verdict: one word; sentence: what it means; open: why it is not for acceptance, empty where it is.

    links: text of a table's cell to the address of the record that it stands for. gist: what stands right below the
    verdict, for whoever reads no further. filed: what it is filed under.
    """

    title: str
    subject: str
    verdict: str
    sentence: str
    open: tuple[str, ...]
    sections: tuple[Section, ...]
    when: str
    links: Mapping[str, str] = field(default_factory=dict)
    gist: tuple[tuple[str, str], ...] = ()
    filed: tuple[tuple[str, str], ...] = ()

    def link(self, text: str) -> str:
        """Where a cell of a table leads to, "" for nowhere."""
        return self.links.get(text, "")

    @cached_property
    def checksum(self) -> str:
        """sha256 of all its words and numbers, the same in every form it is written in."""
        said = repr((self.title, self.subject, self.verdict, self.sentence, self.gist, self.filed, self.open, self.when))
        said += "".join(repr((s.title, [_words(b) for b in s.blocks])) for s in self.sections)
        return hashlib.sha256(said.encode("utf-8", "backslashreplace")).hexdigest()


def _words(block: Block) -> str:
    if isinstance(block, Gallery):
        return "".join(p.caption for p in block.pictures)
    return block.caption if isinstance(block, Picture) else repr(block)
