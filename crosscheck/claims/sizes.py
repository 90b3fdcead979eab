"""How large a claim may be: what is larger is refused before it is unpacked, so that no file exhausts memory or time."""

from __future__ import annotations

import re
import zipfile
from pathlib import Path
from typing import BinaryIO

MOST_BYTES = 100_000_000
"""Of a claim as it lies on disk: a million rows are less."""
MOST_UNPACKED = 500_000_000
"""Of a spreadsheet's parts without their compression."""
MOST_CELLS = 20_000_000
"""Rows times columns of one sheet."""
_PLACE = re.compile(rb'<c r="([A-Z]{1,4})([0-9]{1,8})"')
_REPEATED = re.compile(
    rb'<table:table-(?:row|cell)[^>]*number-(?:rows|columns)-repeated="([0-9]+)"([^>]*)>(.{0,400})', re.S
)


class TooLarge(ValueError):
    """Says what is too large."""


def limited(stream: BinaryIO) -> bytes:
    """The whole of a stream. Raises TooLarge beyond MOST_BYTES: devices and pipes may never end."""
    data = stream.read(MOST_BYTES + 1)
    if len(data) > MOST_BYTES:
        raise TooLarge(f"larger than {MOST_BYTES // 10**6} MB")
    return data


def check_spreadsheet(path: Path) -> None:
    """Raises TooLarge where a spreadsheet file would unpack to more than may be; other formats are left to their reader."""
    if not zipfile.is_zipfile(path):
        return
    with zipfile.ZipFile(path) as packed:
        if sum(part.file_size for part in packed.infolist()) > MOST_UNPACKED:
            raise TooLarge(f"larger than {MOST_UNPACKED // 10**6} MB unpacked")
        for part in packed.namelist():
            if re.fullmatch(r"xl/worksheets/[^/]+\.xml", part):
                _few_cells(_read(packed, part))
            elif part == "content.xml":
                _few_repeats(_read(packed, part))


def _read(packed: zipfile.ZipFile, part: str) -> bytes:
    # A part may be larger than the archive's own list says.
    with packed.open(part) as stream:
        data = stream.read(MOST_UNPACKED + 1)
    if len(data) > MOST_UNPACKED:
        raise TooLarge(f"larger than {MOST_UNPACKED // 10**6} MB unpacked")
    return data


def _few_cells(sheet: bytes) -> None:
    """One cell far out makes a table of empty ones up to it."""
    columns, rows = 0, 0
    for letters, number in _PLACE.findall(sheet):
        columns, rows = max(columns, _column(letters)), max(rows, int(number))
    if columns * rows > MOST_CELLS:
        raise TooLarge(f"a sheet of {rows} rows and {columns} columns")


def _column(letters: bytes) -> int:
    number = 0
    for letter in letters:
        number = 26 * number + letter - 64
    return number


def _few_repeats(content: bytes) -> None:
    """Rows and cells that hold something, repeated; empty ones at a sheet's end are usual and cost nothing."""
    for count, rest, inside in _REPEATED.findall(content):
        filled = not rest.endswith(b"/")
        if filled and int(count) > MOST_CELLS // 1000 and b"<text:" in inside.partition(b"</table:table-")[0]:
            raise TooLarge(f"a row or cell repeated {int(count)} times")
