"""What lies beside a frame file: its record, its accepted differences, its claims; and which files are frames.

FRAME is the frame file's name without .toml: FRAME.record.toml, FRAME.accepted.toml, FRAME.claim.txt,
FRAME.NAME.claim.txt.
"""

from __future__ import annotations

import re
from collections.abc import Iterable, Iterator
from dataclasses import dataclass
from pathlib import Path

CLAIM_ENDINGS = (".txt", ".csv", ".tsv", ".md", ".xlsx")
OURS = (".record.toml", ".accepted.toml", ".reading.toml")
"""Endings of TOML files that are not frames."""
EXPECT = re.compile(r"^\s*#\s*expect\s*:\s*disagree\b\s*(?:,\s*(?P<suspect>.*))?$", re.IGNORECASE)


@dataclass(frozen=True, slots=True)
class Expectation:
    """What a claim that is there to be wrong says of itself: the suspect that must come first, if it names one."""

    kind: str = ""
    where: str = ""


def stem(frame: Path) -> str:
    """The frame file's name without .toml."""
    return frame.name.removesuffix(".toml")


def record_path(frame: Path) -> Path:
    return frame.with_name(f"{stem(frame)}.record.toml")


def accepted_path(frame: Path) -> Path:
    return frame.with_name(f"{stem(frame)}.accepted.toml")


def is_frame(path: Path) -> bool:
    """A TOML file that is none of ours by name."""
    return path.name.endswith(".toml") and not path.name.endswith(OURS) and not path.name.startswith(".")


def frames_below(paths: Iterable[Path]) -> Iterator[Path]:
    """Frame files named or lying below the folders named, sorted, each once. Hidden folders are passed over."""
    seen: set[Path] = set()
    found: list[Path] = []
    for path in paths:
        inside = [path] if path.is_file() else [p for p in path.rglob("*.toml") if is_frame(p) and not _hidden(p, path)]
        for p in inside:
            if p.resolve() not in seen:
                seen.add(p.resolve())
                found.append(p)
    yield from sorted(found, key=lambda p: p.as_posix())


def _hidden(path: Path, root: Path) -> bool:
    return any(part.startswith(".") for part in path.relative_to(root).parts[:-1])


def claims_beside(frame: Path) -> list[Path]:
    """The frame's claims, sorted by name. A longer frame name that begins alike keeps its own claims."""
    own = stem(frame)
    others = [stem(p) for p in frame.parent.glob("*.toml") if is_frame(p) and len(stem(p)) > len(own)]
    found = []
    for path in frame.parent.iterdir():
        if not path.name.endswith(tuple(f".claim{e}" for e in CLAIM_ENDINGS)) or not path.name.startswith(f"{own}."):
            continue
        if not any(path.name.startswith(f"{other}.") for other in others if other.startswith(f"{own}.")):
            found.append(path)
    return sorted(found, key=lambda p: p.name)


def claim_name(frame: Path, claim: Path) -> str:
    """"" for FRAME.claim.txt, NAME for FRAME.NAME.claim.txt."""
    middle = claim.name[len(stem(frame)) :].rsplit(".claim.", 1)[0]
    return middle.strip(".")


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
            kind, where = _suspect(found.group("suspect") or "")
            return Expectation(kind, where)
    return None


def _suspect(text: str) -> tuple[str, str]:
    """"support A" into kind and place; kinds of two words are known."""
    text = text.strip()
    for kind in KINDS:
        if text.lower() == kind or text.lower().startswith(kind + " "):
            return kind, text[len(kind) :].strip()
    return "", text


KINDS = (
    "load case", "load", "units", "signs", "transcription", "support", "end release", "stiffness", "geometry",
    "idealisation",
)  # fmt: skip
