"""First stage of reading a claim: bytes or a spreadsheet file to lines of text.

Printouts come as UTF-8 with or without a byte order mark, UTF-16, or Latin-1 (Windows-1252); line ends of any kind.
A spreadsheet becomes lines with tabs between cells, each number at the 15 digits that the file holds.
"""

from __future__ import annotations

import codecs
import hashlib
import re
import sys
from pathlib import Path
from typing import Literal, NoReturn

from crosscheck.claims.sizes import TooLarge, check_spreadsheet, limited
from crosscheck.problems import Problem, UnusableInput

SPREADSHEETS = (".xlsx", ".xlsm", ".xls", ".ods")
_MARKS = ((codecs.BOM_UTF8, "utf-8"), (codecs.BOM_UTF16_LE, "utf-16-le"), (codecs.BOM_UTF16_BE, "utf-16-be"))
_LINE_END = re.compile(r"\r\n|[\r\n\x0b\x0c\x85\u2028\u2029]")


def refuse(file: str, says: str, instead: str = "", line: int | None = None) -> NoReturn:
    """Raise one problem of the claim as UnusableInput."""
    raise UnusableInput([Problem(file, line, "", says, instead)])


def decode(data: bytes, file: str = "") -> str:
    """Text of the bytes. Raises UnusableInput where they are not text."""
    for mark, encoding in _MARKS:
        if data.startswith(mark):
            return _strictly(data[len(mark) :], encoding, file)
    if wide := _wide(data):
        return _strictly(data, wide, file)
    if b"\x00" in data:
        refuse(file, "this is not text", "give the results as text, or as a spreadsheet file named .xlsx")
    try:
        return data.decode("utf-8")
    except UnicodeDecodeError:
        # Windows-1252 leaves five bytes without meaning; Latin-1 gives every byte one.
        return data.decode("cp1252", errors="replace")


def _wide(data: bytes) -> str:
    """UTF-16 without its mark shows as a zero in every other byte of a text in Latin letters."""
    head = data[:2000]
    if len(head) < 4 or len(data) % 2:
        return ""
    pairs = len(head) // 2
    if head[1::2].count(0) > 0.8 * pairs and head[0::2].count(0) == 0:
        return "utf-16-le"
    if head[0::2].count(0) > 0.8 * pairs and head[1::2].count(0) == 0:
        return "utf-16-be"
    return ""


def _strictly(data: bytes, encoding: str, file: str) -> str:
    try:
        return data.decode(encoding)
    except UnicodeDecodeError as error:
        refuse(file, f"the text breaks off: not {encoding.upper()} at byte {error.start}", "save it again as UTF-8")


def lines_of(text: str) -> list[str]:
    """Lines without their ends; line k of the file is index k - 1."""
    return _LINE_END.split(text.removeprefix("\ufeff"))


def read_source(path_or_dash: str | Path, sheet: str | None = None) -> tuple[str, str, str]:
    """(file as given, SHA-256 of its bytes, text). "-" is standard input. Raises UnusableInput."""
    file = str(path_or_dash)
    try:
        if file == "-":
            data = limited(sys.stdin.buffer)
        else:
            with Path(file).open("rb") as stream:
                data = limited(stream)
    except TooLarge as error:
        refuse(file, f"the claim is {error}", "give the results alone")
    except (OSError, ValueError) as error:
        reason = (getattr(error, "strerror", None) or str(error)).lower()
        refuse(file, f"the claim cannot be opened ({reason})", "give a readable file")
    digest = hashlib.sha256(data).hexdigest()
    if Path(file).suffix.lower() in SPREADSHEETS:
        return file, digest, _spreadsheet(Path(file), sheet)
    if sheet is not None:
        refuse(file, "--sheet goes with a spreadsheet file, and this is text", "leave --sheet out")
    return file, digest, decode(data, file)


def _spreadsheet(path: Path, sheet: str | None) -> str:
    """Every sheet (or the one named) as lines with tabs; the sheet's name stands in a line of its own above."""
    import pandas as pd

    try:
        check_spreadsheet(path)
    except TooLarge as error:
        refuse(str(path), f"the spreadsheet holds {error}", "give the results alone, or save them as .csv")
    except Exception as error:  # noqa: BLE001 - a damaged archive: whatever zipfile makes of it
        refuse(str(path), f"the spreadsheet cannot be read ({type(error).__name__})", "save it as .xlsx or .csv")
    engine: Literal["openpyxl"] | None = "openpyxl" if path.suffix.lower() in (".xlsx", ".xlsm") else None
    try:
        sheets = pd.read_excel(path, sheet_name=None, header=None, dtype=object, engine=engine)
    except ImportError:
        refuse(str(path), "spreadsheet files need pandas with its excel extra", 'pip install "pandas[excel]"')
    except Exception as error:  # every reader behind pandas raises errors of its own kind
        refuse(str(path), f"the spreadsheet cannot be read ({type(error).__name__})", "save it as .xlsx or .csv")
    if sheet is not None and sheet not in sheets:
        refuse(str(path), f'there is no sheet "{sheet}"', f"the sheets are {', '.join(map(str, sheets))}")
    out: list[str] = []
    for name, table in sheets.items():
        if sheet is None or name == sheet:
            out += [str(name), *("\t".join(_cell(c) for c in row) for row in table.to_numpy().tolist()), ""]
    return "\n".join(out)


def _cell(value: object) -> str:
    """A cell as text on one line; an empty one (NaN) as nothing."""
    if value is None or value != value:
        return ""
    if isinstance(value, float):
        return f"{value:.15g}"
    return " ".join(str(value).split())
