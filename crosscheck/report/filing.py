"""Writing a record where it was asked for, and the check log beside the frame."""

from __future__ import annotations

import datetime
import shlex
from collections.abc import Sequence
from dataclasses import dataclass, replace
from pathlib import Path
from typing import TYPE_CHECKING

from crosscheck import __version__, log
from crosscheck.check import Opinions, TwoPrintouts, Verification
from crosscheck.claims.reading import Reading
from crosscheck.files import replace_bytes, replace_text
from crosscheck.frame.model import Frame
from crosscheck.problems import Problem, UnusableInput
from crosscheck.report import words

if TYPE_CHECKING:
    from crosscheck.report.about import Circumstances
    from crosscheck.report.content import Record
    from crosscheck.review.finding import Finding, Subject
    from crosscheck.suite.regress import SuiteOutcome

PDF = ".pdf"
ENDINGS = (".html", ".htm", PDF)


@dataclass(frozen=True, slots=True)
class Filing:
    """One record to be written: to `path`, with what is said about it, by the `command` given at `when`."""

    path: Path
    about: dict[str, str]
    reason: str
    command: str
    when: datetime.datetime

    @staticmethod
    def asked(path: str, about: Sequence[str], reason: str, given: Sequence[str]) -> Filing:
        """From the command line. Raises UnusableInput for a path or an --about that cannot be."""
        from crosscheck.report.about import read_about

        target = Path(path)
        if target.suffix.lower() not in ENDINGS:
            says = "is no page's name"
            raise UnusableInput([Problem(path, None, "--report", says, "a name that ends in .html or .pdf")])
        if not target.parent.is_dir():
            says, advice = "lies in a folder that is not there", f"make {target.parent}"
            raise UnusableInput([Problem(path, None, "--report", says, advice)])
        command = shlex.join(["crosscheck", *given])
        return Filing(target, read_about(about), reason, command, datetime.datetime.now(datetime.UTC))

    def ask_for_reason(self, frame: Frame) -> None:
        """Raises UnusableInput where the frame has changed since a claim was seen and --reason says nothing."""
        log.ask_for_reason(log.read_log(log.log_path(frame)), frame, self.reason)

    def opinions(self, result: Opinions) -> None:
        from crosscheck.report.record import opinions_record

        self._write(opinions_record(result, self._around(result.frame)))

    def verification(
        self, stated: Verification, reading: Reading, suspect: int = 0, changed: Verification | None = None
    ) -> None:
        """The record of a check, after its entry in the log.

        stated: of frame and claim as stated, what the log keeps. changed: as `suspect` (from 1) supposes, where the record
        is of that.
        """
        from crosscheck.report.record import verify_record

        frame = stated.opinions.frame
        history = log.append(log.log_path(frame), self._entry(stated)) if frame.file else ()
        supposed = f"suspect {suspect}: {stated.suspects[suspect - 1].says}" if changed is not None else ""
        self._write(verify_record(changed or stated, replace(self._around(frame, reading, history), supposed=supposed)))

    def printouts(self, result: TwoPrintouts, readings: tuple[Reading, Reading]) -> None:
        from crosscheck.report.printouts_record import printouts_record

        around = self._around(result.first.opinions.frame, readings[0])
        self._write(printouts_record(result, readings, around))

    def inspection(self, subject: Subject, findings: Sequence[Finding]) -> None:
        from crosscheck.report.about import Circumstances
        from crosscheck.report.record import inspect_record

        self._write(inspect_record(subject, findings, Circumstances(self.command, self.when, self.about)))

    def suite(self, outcome: SuiteOutcome) -> None:
        """The overview, and a page for each frame in a folder beside it."""
        from crosscheck.report.about import Circumstances
        from crosscheck.report.suite_record import suite_records

        folder = self.path.with_suffix(".frames")
        around = Circumstances(self.command, self.when, self.about)
        overview, pages = suite_records(outcome, around, folder.name, self.path.suffix.lower())
        make_folder(folder)
        for address, record in pages.items():
            self._write(record, self.path.parent / address)
        self._write(overview)

    def _entry(self, result: Verification) -> log.Entry:
        frame, claim = result.opinions.frame, result.closed
        return log.Entry(
            self.when.isoformat(timespec="seconds"), __version__, frame.variant, frame.sha256, frame.content, claim.file,
            claim.sha256, f"{words.idealisation(frame)}; {100 * result.tolerance.relative:g}%", result.verdict,
            sum(c.compared for c in result.cases), sum(c.of for c in result.cases), self.reason,
        )  # fmt: skip

    def _around(
        self, frame: Frame, reading: Reading | None = None, history: tuple[log.Entry, ...] = ()
    ) -> Circumstances:
        from crosscheck.report.about import Circumstances

        return Circumstances(self.command, self.when, self.about, review(frame), history, reading)

    def _write(self, record: Record, path: Path | None = None) -> None:
        target = path or self.path
        if target.suffix.lower() == PDF:
            from crosscheck.report.paper import paper

            replace_bytes(target, paper(record))
        else:
            from crosscheck.report.page import page

            replace_text(target, page(record))


def make_folder(folder: Path) -> None:
    """Make a folder that may be there already. Raises UnusableInput."""
    try:
        folder.mkdir(exist_ok=True)
    except OSError as error:
        raise UnusableInput([Problem(str(folder), None, "--report", f"cannot be made ({error.strerror})")]) from None


def review(frame: Frame) -> tuple[Finding, ...]:
    """What a reviewer would ask about the model."""
    from crosscheck.review.inspect import inspect, subject_of

    return tuple(inspect(subject_of(frame)))
