"""pytest collects frame files: `pytest cases/` runs each frame, its record and its claims as tests.

Ids are the frame's name, "record" or "opinions", and each claim's file name, so that -k, -x, --lf, JUnit output and
pytest-xdist work on them. A failure shows crosscheck's own words and not an assertion of floats. Folders that hold
crosscheck frames are recognised by the frame file itself: a TOML file with members, a grid or tables beside it.
"""

from __future__ import annotations

import tomllib
from collections.abc import Iterator
from pathlib import Path
from typing import TYPE_CHECKING, Any

import pytest

if TYPE_CHECKING:
    from crosscheck.suite.beside import Standard
    from crosscheck.suite.regress import FrameOutcome


def pytest_collect_file(parent: pytest.Collector, file_path: Path) -> pytest.Collector | None:
    """A frame file is a test file."""
    from crosscheck.suite.beside import is_frame

    if file_path.suffix == ".toml" and is_frame(file_path) and _looks_like_a_frame(file_path):
        file: FrameFile = FrameFile.from_parent(parent, path=file_path)
        return file
    return None


def _looks_like_a_frame(path: Path) -> bool:
    """Told from other TOML files (pyproject.toml, say) by its tables, or what looks like their heads."""
    try:
        text = path.read_text(encoding="utf-8-sig", errors="replace")
    except OSError:
        return False
    if "members" not in text and "grid" not in text:
        return False
    try:
        tables = set(tomllib.loads(text))
    except (ValueError, RecursionError):
        tables = {line.strip(" []") for line in text.splitlines() if line.startswith("[")}
    return "grid" in tables or "members" in tables or {"tables", "sections"} <= tables


class FrameFile(pytest.File):
    """One frame file; each frame in it is checked once, however many of its items run."""

    _latest: FrameOutcome | None = None

    def collect(self) -> Iterator[pytest.Item]:
        from crosscheck.suite.beside import standards

        for standard in standards(self.path):
            name = f"{standard.variant} record" if standard.variant else "record"
            yield FrameItem.from_parent(self, name=name, standard=standard)
            for claim in standard.claims():
                yield FrameItem.from_parent(self, name=claim.name, standard=standard, claim=claim.name)

    def outcome(self, standard: Standard) -> FrameOutcome:
        # The latest alone is kept: items of one frame run one after the other, and a family may be large.
        if self._latest is None or self._latest.standard != standard:
            from crosscheck.suite.regress import check_frame

            self._latest = check_frame(standard)
        return self._latest


class FrameItem(pytest.Item):
    """A frame with its values on record, or one of its claims."""

    def __init__(self, *, standard: Standard, claim: str = "", **rest: Any) -> None:
        super().__init__(**rest)
        self.standard, self.claim = standard, claim

    def runtest(self) -> None:
        assert isinstance(self.parent, FrameFile)
        outcome = self.parent.outcome(self.standard)
        if not self.claim:
            if outcome.state != "held" and not self._claim_failed_alone(outcome):
                raise NotHeld(_told(outcome))
            return
        claim = next((c for c in outcome.claims if c.file == self.claim), None)
        if claim is None or not claim.held:
            says = claim.says if claim is not None else outcome.says
            raise NotHeld(f"{self.claim}: {says}\n{_told(outcome)}")

    @staticmethod
    def _claim_failed_alone(outcome: FrameOutcome) -> bool:
        """A claim that fails is that claim's failure; the record itself was then not looked at and says nothing."""
        return any(not c.held for c in outcome.claims) and outcome.state in ("disagree", "undecided")

    def repr_failure(self, excinfo: pytest.ExceptionInfo[BaseException], style: Any = None) -> Any:
        if isinstance(excinfo.value, NotHeld):
            return str(excinfo.value)
        return super().repr_failure(excinfo, style)

    def reportinfo(self) -> tuple[Path, int | None, str]:
        return self.path, 0, f"{self.path.name}: {self.name}"


class NotHeld(Exception):
    """What crosscheck says of a frame that did not hold."""


def _told(outcome: FrameOutcome) -> str:
    import io

    from crosscheck.report.suite import frame_report
    from crosscheck.report.terminal import console

    out = io.StringIO()
    console(out).print(frame_report(outcome))
    return out.getvalue().rstrip()
