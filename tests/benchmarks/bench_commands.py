"""Whole commands on frames of 400 and 10,100 members: `verify` with suspects against `opinions`, and the most memory.

Run by `python -m tests.benchmarks.bench_commands`. The claims are printed by the first opinion of the frame as it stands
(right), of the frame with one foot pinned, and of the frame with softer beams (wrong), all member ends and reactions of
one case.
"""

from __future__ import annotations

import tempfile
from pathlib import Path

from crosscheck.frame.draft import draft_grid
from tests.benchmarks.timing import HEAD, Row, Spent, least_spent, show, spent
from tests.sheds import claim_text

SUSPECTS, MEMORY = 4.0, 600.0
MIDDLE, LARGE = ("7 x 6", "27 x 3.5"), ("50 x 6", "100 x 3.5")
PINNED = '[supports]\nA0 = "pinned"\n\n[analysis]'
ROUNDS = 3


def written(folder: Path, name: str, grid: tuple[str, str]) -> Path:
    """A frame of three cases and two combinations, and claims right and wrong beside it."""
    bays, storeys = grid
    path = folder / f"{name}.toml"
    text = draft_grid((bays,), (storeys,))
    path.write_text(text, encoding="utf-8")
    for claim, changed in (
        ("right", text),
        ("pinned", text.replace("[analysis]", PINNED)),
        ("soft", text.replace("23130 cm^4", "13130 cm^4")),
    ):
        other = folder / f"{name} {claim}.toml"
        other.write_text(changed, encoding="utf-8")
        assert (changed == text) == (claim == "right")
        (folder / f"{name}.{claim}.txt").write_text(claim_text(other), encoding="utf-8")
    return path


def words(frame: Path, claim: str = "") -> list[str]:
    if not claim:
        return ["-m", "crosscheck", "opinions", str(frame)]
    return ["-m", "crosscheck", "verify", str(frame), str(frame.with_name(f"{frame.stem}.{claim}.txt"))]


def suspects(folder: Path) -> list[Row]:
    """Two wrong claims on 405 members: one that a single place explains, one that takes a section of all the beams."""
    frame = written(folder, "middle", MIDDLE)
    commands = {claim or "opinions": words(frame, claim) for claim in ("", "pinned", "soft")}
    took = least_spent(commands, ROUNDS, status=(0, 1))
    return [
        Row(f"5  verify with suspects / opinions, 405 members, {says}", took[claim].processor, took["opinions"].processor,
            SUSPECTS)
        for claim, says in (("pinned", "a foot was pinned"), ("soft", "all beams were softer"))
    ]  # fmt: skip


def memory(folder: Path) -> list[Row]:
    """The most memory of every kind of check of 10,100 members; what each took is said, too."""
    frame = written(folder, "large", LARGE)
    rows = []
    for claim, status, says in (
        ("", 0, "opinions"), ("right", 0, "verify a right claim"), ("soft", 1, "verify a wrong claim, suspects"),
    ):  # fmt: skip
        took: Spent = spent(words(frame, claim), status=(status,))
        what = f"5  memory, 10,100 members, {says} ({took.processor:.1f} s of processor time)"
        rows.append(Row(what, took.megabytes, 1.0, MEMORY, unit="MB"))
    return rows


def rows() -> list[Row]:
    with tempfile.TemporaryDirectory() as name:
        return [*suspects(Path(name)), *memory(Path(name))]


def main() -> int:
    print(HEAD)
    return show(rows())


if __name__ == "__main__":
    raise SystemExit(main())
