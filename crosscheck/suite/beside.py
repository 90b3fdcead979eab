"""What lies beside a frame file: its record, its accepted differences, its claims; and which files are frames.

FRAME is the frame file's name without .toml, and for a frame of a family FRAME.VARIANT: FRAME.record.toml,
FRAME.accepted.toml, FRAME.claim.txt, FRAME.NAME.claim.txt.
"""

from __future__ import annotations

import os
import re
import tomllib
from collections.abc import Iterable, Iterator
from dataclasses import dataclass
from pathlib import Path

CLAIM_ENDINGS = (".txt", ".csv", ".tsv", ".md", ".xlsx")
OURS = (".record.toml", ".accepted.toml", ".reading.toml")
"""Endings of TOML files that are not frames."""
EXPECT = re.compile(r"^\s*#\s*expect\s*:\s*disagree\b\s*(?:,\s*(?P<suspect>.*))?$", re.IGNORECASE)
KINDS = (
    "load case", "load", "units", "signs", "transcription", "support", "end release", "stiffness", "geometry",
    "idealisation",
)  # fmt: skip
"""Of suspects; those that begin alike have the longer one first."""


@dataclass(frozen=True, slots=True)
class Standard:
    """A standard frame: its file and, where that is a family, which frame of it."""

    path: Path
    variant: str = ""

    @property
    def stem(self) -> str:
        """What the names of the files beside it begin with."""
        own = self.path.name.removesuffix(".toml")
        return f"{own}.{self.variant}" if self.variant else own

    @property
    def label(self) -> str:
        """What reports call it."""
        return f"{self.path.as_posix()} [{self.variant}]" if self.variant else self.path.as_posix()

    @property
    def record(self) -> Path:
        return self.path.with_name(f"{self.stem}.record.toml")

    @property
    def accepted(self) -> Path:
        return self.path.with_name(f"{self.stem}.accepted.toml")

    def claims(self) -> list[Path]:
        """The frame's claims, sorted by name. A longer frame name that begins alike keeps its own claims."""
        found = [p for p in _beginning(self.path.parent, f"{self.stem}.") if _is_claim(p)]
        if not found:
            return []
        longer = [s.stem for s in _longer(self)]
        mine = (p for p in found if not any(p.name.startswith(f"{other}.") for other in longer))
        return sorted(mine, key=lambda p: p.name)

    def claim_name(self, claim: Path) -> str:
        """"" for FRAME.claim.txt, NAME for FRAME.NAME.claim.txt."""
        return claim.name[len(self.stem) :].rsplit(".claim.", 1)[0].strip(".")


def _beginning(folder: Path, start: str) -> Iterator[Path]:
    # Names alone: a folder of a thousand frames is looked through a thousand times.
    return (folder / name for name in os.listdir(folder) if name.startswith(start))  # noqa: PTH208


def _is_claim(path: Path) -> bool:
    return path.name.endswith(tuple(f".claim{ending}" for ending in CLAIM_ENDINGS))


def _longer(frame: Standard) -> Iterator[Standard]:
    """Standard frames beside it whose names go on from its own."""
    own = frame.path.name.removesuffix(".toml")
    for path in _beginning(frame.path.parent, f"{own}."):
        if is_frame(path):
            yield from (s for s in standards(path) if s.stem.startswith(f"{frame.stem}.") and s != frame)


def is_frame(path: Path) -> bool:
    """A TOML file that is none of ours by name."""
    return path.name.endswith(".toml") and not path.name.endswith(OURS) and not path.name.startswith(".")


def is_office_file(path: Path) -> bool:
    """A file of sections and materials that frames include, and nothing else; one that cannot be read is none."""
    from crosscheck.frame.include import KEYS

    try:
        text = path.read_text(encoding="utf-8-sig")
        if any(word in text for word in ("[joints", "[grid", "[tables", "[members")):
            return False  # the usual frame, told without parsing
        data = tomllib.loads(text)
    except (OSError, ValueError, RecursionError):
        return False
    return bool(data.keys() & {"sections", "materials"}) and data.keys() <= {*KEYS}


def standards(path: Path) -> list[Standard]:
    """The frames of a file: itself, or every frame of the family that it makes."""
    from crosscheck.frame.reader import variants

    return [Standard(path, name) for name in variants(path)] or [Standard(path)]


def frames_below(paths: Iterable[Path]) -> Iterator[Path]:
    """Frame files named or lying below the folders named, sorted, each once. Hidden folders are passed over."""
    seen: set[Path] = set()
    found: list[Path] = []
    for path in paths:
        inside = [path] if path.is_file() else [p for p in path.rglob("*.toml") if is_frame(p) and not _hidden(p, path)]
        for p in inside:
            if path.is_dir() and is_office_file(p):
                continue
            if p.resolve() not in seen:
                seen.add(p.resolve())
                found.append(p)
    yield from sorted(found, key=lambda p: p.as_posix())


def _hidden(path: Path, root: Path) -> bool:
    return any(part.startswith(".") for part in path.relative_to(root).parts[:-1])


@dataclass(frozen=True, slots=True)
class Expectation:
    """What a claim that is there to be wrong says of itself: the suspect that must come first, if it names one."""

    kind: str = ""
    where: str = ""

    def meets(self, kind: str, where: Iterable[str]) -> bool:
        """Whether a suspect is the one expected; the place may be written with or without what sort of thing it is."""
        said = {name for w in where for name in (w, w.removeprefix("joint "), w.removeprefix("member "))}
        parts = [part.strip() for part in self.where.split(",") if part.strip()]
        there = all(part in said or set(part.split()) <= said for part in parts)
        return there and kind == self.kind

    def __str__(self) -> str:
        return f"{self.kind} {self.where}".strip()


def expectation(claim: Path) -> Expectation | None:
    """What the claim's first line says it is there to show; None where it is there to agree, or is a spreadsheet."""
    if claim.suffix == ".xlsx":
        return None
    with claim.open("rb") as source:
        first = source.readline(4096)
    for encoding in ("utf-8-sig", "utf-16", "latin-1"):
        try:
            text = first.decode(encoding)
        except UnicodeError:
            continue
        found = EXPECT.match(text.strip())
        if found:
            return _expected((found.group("suspect") or "").strip())
    return None


def _expected(text: str) -> Expectation:
    """"support A" into kind and place."""
    for kind in KINDS:
        if text.lower() == kind or text.lower().startswith(kind + " "):
            return Expectation(kind, text[len(kind) :].strip())
    return Expectation(text, "") if text else Expectation()
