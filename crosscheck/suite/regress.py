"""Every standard frame against its values on record and its claims; a crash costs that frame only."""

from __future__ import annotations

import datetime
import fnmatch
import subprocess
from collections import Counter
from collections.abc import Callable, Sequence
from dataclasses import dataclass, field
from pathlib import Path

from crosscheck import check
from crosscheck.compare.differences import Difference
from crosscheck.frame.reader import sources
from crosscheck.problems import Problem, UnusableInput
from crosscheck.suite.accepted import Accepted, read_accepted
from crosscheck.suite.beside import Expectation, Standard, expectation, frames_below, standards
from crosscheck.suite.moved import Moved, against_record, between_records
from crosscheck.suite.record import read_record
from crosscheck.suite.spread import spread

STATES = (
    "held", "moved", "disagree", "undecided", "claim deleted", "record older than the frame", "never on record",
    "unreadable", "crashed",
)  # fmt: skip
"""What a frame can turn out to be; the first is good, and the worst that applies is reported (later is not worse)."""


@dataclass(frozen=True, slots=True)
class ClaimOutcome:
    """One claim: whether it did what it is there for. says: one sentence."""

    file: str
    held: bool
    verdict: str
    says: str


@dataclass(frozen=True, slots=True)
class FrameOutcome:
    """One frame. state: of STATES. says: why. differences: what moved or disagrees. accepted: with their entries."""

    standard: Standard
    state: str
    says: str = ""
    differences: tuple[Difference, ...] = ()
    claims: tuple[ClaimOutcome, ...] = ()
    accepted: tuple[tuple[Difference, Accepted], ...] = ()
    compared: int = 0

    @property
    def label(self) -> str:
        return self.standard.label


@dataclass(frozen=True, slots=True)
class SuiteOutcome:
    """A whole set, sorted by file."""

    frames: tuple[FrameOutcome, ...]
    looked_in: tuple[str, ...] = field(default=())

    @property
    def counts(self) -> dict[str, int]:
        counted = Counter(f.state for f in self.frames)
        return {state: counted[state] for state in STATES if counted[state]}

    @property
    def exit_status(self) -> int:
        """0 all held, 1 anything else, 2 no frame found or none readable."""
        if not self.frames or all(f.state == "unreadable" for f in self.frames):
            return 2
        return 0 if all(f.state == "held" for f in self.frames) else 1


# --- one frame


def check_frame(standard: Standard, today: datetime.date | None = None) -> FrameOutcome:
    """The outcome of one standard frame; never raises."""
    try:
        return _check(standard, today or datetime.date.today())
    except UnusableInput as error:
        return FrameOutcome(standard, "unreadable", "; ".join(str(p) for p in error.problems[:3]))
    except Exception as error:  # noqa: BLE001 - one frame's crash must not cost the others
        return FrameOutcome(standard, "crashed", f"{type(error).__name__}: {error}")


def _check(standard: Standard, today: datetime.date) -> FrameOutcome:
    frame = check.read(standard.path, standard.variant)
    result = check.ask(frame)
    claims, found, accepted = _claims(standard, result, today)
    if result.verdict != "agree":
        differences = tuple(d for j in result.judgements.values() for d in j.differences)
        state = "disagree" if result.verdict == "disagree" else "undecided"
        return FrameOutcome(standard, state, "the opinions do not agree with each other", differences, claims)
    bad = [c for c in claims if not c.held]
    if bad:
        state = "undecided" if all(c.verdict == "undecided" for c in bad) else "disagree"
        says = "; ".join(f"{c.file}: {c.says}" for c in bad) + _since_recorded(standard, frame.content)
        return FrameOutcome(standard, state, says, tuple(found), claims, accepted)
    if not standard.record.exists():
        return FrameOutcome(standard, "never on record", "no values on record", (), claims, accepted)
    record = read_record(standard.record)
    moved = against_record(result, record)
    gone = [c for c in record.now.facts.get("claims", []) if not standard.path.with_name(c).exists()]
    older = record.now.facts["frame_sha256"] != frame.content
    state, says = _state(moved, older, gone)
    return FrameOutcome(standard, state, says, moved.differences, claims, accepted, moved.compared)


def _since_recorded(standard: Standard, content: str) -> str:
    """The likeliest cause of a claim that no longer agrees, where it is one: the frame is not what it was."""
    try:
        changed = standard.record.exists() and read_record(standard.record).now.facts["frame_sha256"] != content
    except UnusableInput:
        return ""  # said when the claims are in order
    return "; the frame file has changed since its values went on record" if changed else ""


def _state(moved: Moved, older: bool, gone: Sequence[str]) -> tuple[str, str]:
    if older:
        return "record older than the frame", f"the frame file has changed since its values went on record; {moved.says}"
    if moved.any:
        return "moved", moved.says
    if gone:
        return "claim deleted", f"{', '.join(gone)} lay beside the frame when it went on record"
    if moved.compared == 0:
        return "undecided", "nothing on record could be compared"
    return "held", moved.says


def _claims(
    standard: Standard, result: check.Opinions, today: datetime.date
) -> tuple[tuple[ClaimOutcome, ...], list[Difference], tuple[tuple[Difference, Accepted], ...]]:
    """Every claim beside the frame; the differences of those that did not hold; and what was accepted."""
    entries = read_accepted(standard.accepted)
    outcomes, found = [], []
    accepted: list[tuple[Difference, Accepted]] = []
    for claim in standard.claims():
        outcome, differences, lived_with = _claim(standard, claim, result, entries, today)
        outcomes.append(outcome)
        accepted += lived_with
        if not outcome.held:
            found += differences
    return tuple(outcomes), found, tuple(accepted)


def _claim(
    standard: Standard, claim: Path, result: check.Opinions, entries: tuple[Accepted, ...], today: datetime.date
) -> tuple[ClaimOutcome, list[Difference], list[tuple[Difference, Accepted]]]:
    from crosscheck.claims import FrameNames, ReadingOptions, read_claim

    expected = expectation(claim)
    try:
        reading = read_claim(str(claim), FrameNames.of(result.frame), ReadingOptions())
        # Nobody asks here what would explain a difference, unless the claim says what should.
        named = expected is not None and bool(expected.kind)
        verified = check.verify(result.frame, reading, opinions=result, suspects=named)
    except UnusableInput as error:
        says = f"cannot be read: {error.problems[0]}"
        return ClaimOutcome(claim.name, False, "unreadable", says), [], []
    differences = [d for c in verified.cases for d in c.differences]
    name = standard.claim_name(claim)
    lived_with = [(d, e) for d in differences for e in entries if e.covers(name, d, today)]
    left = [d for d in differences if not any(d is known for known, _ in lived_with)]
    held, says = _held(verified, expected, left, len(lived_with))
    return ClaimOutcome(claim.name, held, verified.verdict, says), left, lived_with


def _held(
    verified: check.Verification, expected: Expectation | None, left: list[Difference], accepted: int
) -> tuple[bool, str]:
    if expected is None:
        if verified.verdict == "disagree" and accepted and not left and not verified.undecided:
            return True, f"agrees but for {accepted} accepted differences"
        return verified.verdict == "agree", f"{verified.verdict}, expected to agree"
    if verified.verdict != "disagree":
        return False, f"{verified.verdict}, expected to disagree"
    first = verified.suspects[0] if verified.suspects else None
    if expected.kind and (first is None or not expected.meets(first.kind, first.where)):
        said = f"{first.kind} {', '.join(first.where)}".strip() if first else "none"
        return False, f"disagrees, but the first suspect is {said} and not {expected}"
    return True, "disagrees as expected"


# --- a whole set


def chosen(paths: Sequence[Path], only: str | None = None, since: str | None = None) -> list[Standard]:
    """Frames below the paths, of those named like `only`, and changed since the git revision `since`.

    Raises UnusableInput for a path that does not exist or a revision that git does not know.
    """
    missing = [p for p in paths if not p.exists()]
    if missing:
        advice = "name a folder or a frame file"
        raise UnusableInput(Problem(str(p), None, "", "does not exist", advice) for p in missing)
    frames = [s for path in frames_below(paths) for s in standards(path)]
    if only is not None:
        frames = [f for f in frames if fnmatch.fnmatch(f.stem, only) or only in f.stem]
    if since is not None and frames:
        changed = _Changes(since)
        frames = [f for f in frames if changed.touch(f)]
    return frames


class _Changes:
    """What differs from a git revision or is not known to git; asked once a folder."""

    def __init__(self, revision: str) -> None:
        self.revision = revision
        self._below: dict[Path, frozenset[Path]] = {}

    def touch(self, standard: Standard) -> bool:
        """Whether the frame file, a table it draws on, or what lies beside it has changed."""
        folder = standard.path.parent.resolve()
        if folder not in self._below:
            self._below[folder] = self._ask(folder)
        changed = self._below[folder]
        if any(source.resolve() in changed for source in sources(standard.path)):
            return True
        beside = {folder / p.name for p in (standard.record, standard.accepted, *standard.claims())}
        # A claim or record that is gone has changed too, and only git still knows its name.
        start = f"{standard.stem}."
        gone = (p for p in changed if p.parent == folder and p.name.startswith(start) and not p.exists())
        return bool(beside & changed) or any(gone)

    def _ask(self, folder: Path) -> frozenset[Path]:
        top = Path(_git(folder, ["rev-parse", "--show-toplevel"]).strip())
        names = _git(folder, ["diff", "--name-only", "-z", self.revision, "--", "."])
        fresh = _git(folder, ["ls-files", "--others", "--exclude-standard", "--full-name", "-z", "--", "."])
        return frozenset((top / name).resolve() for name in (names + fresh).split("\0") if name)


def _git(folder: Path, arguments: list[str]) -> str:
    try:
        words = ["git", "-C", str(folder), *arguments]
        done = subprocess.run(words, capture_output=True, text=True, encoding="utf-8", errors="replace", check=False)
    except OSError as error:
        raise UnusableInput([Problem("", None, "--changed-since", f"git cannot be run ({error})")]) from None
    if done.returncode != 0:
        reason = (done.stderr.strip() or "git failed").splitlines()[0]
        raise UnusableInput([Problem("", None, "--changed-since", reason, "name a revision that git knows here")])
    return done.stdout


def run(
    frames: Sequence[Standard], looked_in: Sequence[Path], progress: Callable[[FrameOutcome], None] | None = None,
    workers: int | None = None,
) -> SuiteOutcome:  # fmt: skip
    """Check the frames on all cores."""
    outcomes: list[FrameOutcome] = []
    for outcome in spread(check_frame, frames, _died, workers):
        outcomes.append(outcome)
        if progress is not None:
            progress(outcome)
    order = {standard: k for k, standard in enumerate(frames)}
    outcomes.sort(key=lambda o: order[o.standard])
    return SuiteOutcome(tuple(outcomes), tuple(p.as_posix() for p in looked_in))


def _died(standard: Standard) -> FrameOutcome:
    return FrameOutcome(standard, "crashed", "the process that checked it died")


# --- two sets


def against(frames: Sequence[Standard], roots: Sequence[Path], other: Path) -> SuiteOutcome:
    """Values on record of each frame against those of the same frame below `other`: what moved between two sets."""
    outcomes = []
    for frame in frames:
        root = next((r for r in roots if r.is_dir() and frame.path.is_relative_to(r)), frame.path.parent)
        twin = Standard(other / frame.path.relative_to(root), frame.variant)
        outcomes.append(_against_one(frame, twin))
    return SuiteOutcome(tuple(outcomes), tuple(p.as_posix() for p in (*roots, other)))


def _against_one(frame: Standard, twin: Standard) -> FrameOutcome:
    ours, theirs = frame.record, twin.record
    if not ours.exists() or not theirs.exists():
        which = " and ".join(p.as_posix() for p in (ours, theirs) if not p.exists())
        return FrameOutcome(frame, "never on record", f"no values on record at {which}")
    try:
        found = between_records(read_record(ours), read_record(theirs))
    except UnusableInput as error:
        return FrameOutcome(frame, "unreadable", "; ".join(str(p) for p in error.problems[:3]))
    state = "moved" if found.any else "held" if found.compared else "undecided"
    return FrameOutcome(frame, state, found.says, found.differences, compared=found.compared)
