"""Lines of a TOML text: where each key and each entry of a list stands, for messages only.

tomllib keeps no places, so they are found by a second, lighter reading of a text that tomllib has already accepted. It
runs only when there is something to say, and keeps a sound file's reading fast.
"""

from __future__ import annotations

import re
from collections.abc import Iterator, Mapping
from functools import cached_property

Path = tuple[str | int, ...]
"""Keys and list indices from the top of the file: ("loads", "dead", "apply", 2, "direction")."""

_BARE = re.compile(r"[A-Za-z0-9_-]+\Z")
_TOKEN = re.compile(
    r'[ \t\r]+|#[^\n]*|(?P<end>\n)|(?P<text>"""(?:\\.|[^\\])*?"{3,5}|\'\'\'.*?\'{3,5}'
    r"|\"(?:\\.|[^\"\\\n])*\"|'[^'\n]*')|(?P<mark>[][{},=.])|(?P<bare>[^\s\[\]{},=.\"'#]+)|.",
    re.DOTALL,
)
_ESCAPE = re.compile(r'\\(?:u([0-9A-Fa-f]{4})|U([0-9A-Fa-f]{8})|([btnfr"\\]))')
_ESCAPED = {"b": "\b", "t": "\t", "n": "\n", "f": "\f", "r": "\r", '"': '"', "\\": "\\"}


def dotted(path: Path) -> str:
    """A path as people write it: members.rafter.section, loads.dead.apply[2].direction, joints."roof 1"."""
    text = ""
    for part in path:
        if isinstance(part, int):
            text += f"[{part}]"
        else:
            text += ("." if text else "") + (part if _BARE.match(part) else f'"{part}"')
    return text


class Lines(Mapping[str, int]):
    """Dotted key to 1-based line, worked out from the text when first asked for."""

    def __init__(self, text: str) -> None:
        self._text = text
        self.beside: dict[Path, tuple[str, int]] = {}
        """File and line of what does not stand in the text but in a table beside it."""

    @cached_property
    def by_path(self) -> dict[Path, int]:
        """Every path that stands in the text, in its order."""
        return _Locator(self._text).read()

    @cached_property
    def _by_key(self) -> dict[str, int]:
        return {dotted(path): line for path, line in self.by_path.items()}

    def nearest(self, path: Path) -> tuple[str, int | None]:
        """File ("" for the text itself) and line of the path, or of the innermost table around it that stands anywhere."""
        for length in range(len(path), 0, -1):
            place = self.beside.get(path[:length])
            if place is not None:
                return place
            line = self.by_path.get(path[:length])
            if line is not None:
                return "", line
        return "", None

    def __getitem__(self, key: str) -> int:
        return self._by_key[key]

    def __iter__(self) -> Iterator[str]:
        return iter(self._by_key)

    def __len__(self) -> int:
        return len(self._by_key)


class _Locator:
    """Walks the tokens of one text; the first place of a path counts."""

    def __init__(self, text: str) -> None:
        self.lines: dict[Path, int] = {}
        self.tokens = list(_scan(text))
        self.at = 0
        self.counts: dict[Path, int] = {}

    def read(self) -> dict[Path, int]:
        table: Path = ()
        try:
            while self.at < len(self.tokens):
                kind, _, line = self.tokens[self.at]
                if kind == "\n":
                    self.at += 1
                elif kind == "[":
                    table = self._header(line)
                else:
                    self._pair(table)
        except (IndexError, RecursionError):
            pass  # what is known up to here serves the messages just as well
        return self.lines

    def _note(self, path: Path, line: int) -> None:
        self.lines.setdefault(path, line)

    def _kind(self) -> str:
        return self.tokens[self.at][0]

    def _header(self, line: int) -> Path:
        """[a.b] or [[a.b]]; on the way through a list of tables its latest entry is meant."""
        self.at += 1
        listed = self._kind() == "["
        self.at += listed
        keys = self._keys("]")
        self.at += 1 + listed
        path: Path = ()
        for k, key in enumerate(keys):
            path = (*path, key)
            self._note(path, line)
            if listed and k == len(keys) - 1:
                self.counts[path] = self.counts.get(path, -1) + 1
            if path in self.counts:
                path = (*path, self.counts[path])
                self._note(path, line)
        return path

    def _keys(self, stop: str) -> list[str]:
        keys: list[str] = []
        while (kind := self._kind()) != stop:
            if kind in ("text", "bare"):
                text = self.tokens[self.at][1]
                keys.append(_plain(text) if kind == "text" else text)
            self.at += 1
        return keys

    def _pair(self, table: Path) -> None:
        line = self.tokens[self.at][2]
        path = table
        for key in self._keys("="):
            path = (*path, key)
            self._note(path, line)
        self.at += 1
        self._value(path)

    def _value(self, path: Path) -> None:
        kind = self._kind()
        if kind == "[":
            self._list(path)
        elif kind == "{":
            self._inline(path)
        else:
            while self.at < len(self.tokens) and self._kind() not in ("\n", ",", "]", "}"):
                self.at += 1

    def _list(self, path: Path) -> None:
        self.at += 1
        index = 0
        while (kind := self._kind()) != "]":
            if kind in ("\n", ","):
                self.at += 1
                continue
            entry = (*path, index)
            self._note(entry, self.tokens[self.at][2])
            self._value(entry)
            index += 1
        self.at += 1

    def _inline(self, path: Path) -> None:
        self.at += 1
        while (kind := self._kind()) != "}":
            if kind in ("\n", ","):
                self.at += 1
            else:
                self._pair(path)
        self.at += 1


def _scan(text: str) -> Iterator[tuple[str, str, int]]:
    """Kind, text and line of every token but blanks and comments; a mark is its own kind, a line end is "\\n"."""
    line = 1
    for found in _TOKEN.finditer(text):
        kind = found.lastgroup
        if kind is None:
            continue
        token = found.group()
        if kind == "end":
            yield "\n", token, line
            line += 1
        else:
            yield (token if kind == "mark" else kind), token, line
            line += token.count("\n") if kind == "text" else 0


def _plain(text: str) -> str:
    """A quoted key without its quotes and escapes."""
    if text[0] == "'":
        return text[1:-1]
    return _ESCAPE.sub(lambda m: _ESCAPED[m[3]] if m[3] else chr(int(m[1] or m[2], 16)), text[1:-1])
