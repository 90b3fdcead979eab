"""Every standard frame against its values on record and its claims; a crash costs that frame only."""

from __future__ import annotations

import datetime
import fnmatch
import os
import subprocess
from collections import Counter
from collections.abc import Callable, Iterator, Sequence
from concurrent.futures import ProcessPoolExecutor, as_completed
from concurrent.futures.process import BrokenProcessPool
from dataclasses import dataclass, field
from pathlib import Path

from crosscheck import check
from crosscheck.compare.differences import Difference
from crosscheck.problems import Problem, UnusableInput
from crosscheck.suite.accepted import Accepted, read_accepted
from crosscheck.suite.beside import (
    Expectation,
    accepted_path,
    claim_name,
    claims_beside,
    expectation,
    frames_below,
    record_path,
    stem,
)
from crosscheck.suite.record import against_record, read_record

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

    file: str
    state: str
    says: str = ""
    differences: tuple[Difference, ...] = ()
    claims: tuple[ClaimOutcome, ...] = ()
    accepted: tuple[tuple[Difference, Accepted], ...] = ()
    compared: int = 0


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


def check_frame(path: str, today: datetime.date | None = None) -> FrameOutcome:
    """The outcome of one frame file; never raises."""
    try:
        return _check(Path(path), today or datetime.date.today())
    except UnusableInput as error:
        return FrameOutcome(path, "unreadable", "; ".join(str(p) for p in error.problems[:3]))
    except Exception as error:  # noqa: BLE001 - one frame's crash must not cost the others
        return FrameOutcome(path, "crashed", f"{type(error).__name__}: {error}")


def _check(path: Path, today: datetime.date) -> FrameOutcome:
    frame = check.read(path)
    result = check.ask(frame)
    file = path.as_posix()
    claims, found, accepted = _claims(path, result, today)
    if result.verdict != "agree":
        differences = tuple(d for j in result.judgements.values() for d in j.differences)
        state = "disagree" if result.verdict == "disagree" else "undecided"
        return FrameOutcome(file, state, "the opinions do not agree with each other", differences, claims)
    bad = [c for c in claims if not c.held]
    if bad:
        state = "undecided" if all(c.verdict == "undecided" for c in bad) else "disagree"
        says = "; ".join(f"{c.file}: {c.says}" for c in bad)
        return FrameOutcome(file, state, says, tuple(found), claims, accepted)
    target = record_path(path)
    if not target.exists():
        return FrameOutcome(file, "never on record", "no values on record", (), claims, accepted)
    record = read_record(target)
    moved, compared = against_record(result, record)
    gone = [c for c in record.now.facts.get("claims", []) if not path.with_name(c).exists()]
    older = record.now.facts["frame_sha256"] != frame.sha256
    state, says = _state(bool(moved), older, gone, len(moved), compared)
    return FrameOutcome(file, state, says, tuple(moved), claims, accepted, compared)


def _state(moved: bool, older: bool, gone: Sequence[str], count: int, compared: int) -> tuple[str, str]:
    if older:
        tail = f"; {count:,} of {compared:,} values moved" if moved else "; no value moved"
        return "record older than the frame", f"the frame file has changed since its values went on record{tail}"
    if moved:
        return "moved", f"{count:,} of {compared:,} values moved"
    if gone:
        return "claim deleted", f"{', '.join(gone)} lay beside the frame when it went on record"
    if compared == 0:
        return "undecided", "nothing on record could be compared"
    return "held", f"{compared:,} values hold"


def _claims(
    path: Path, result: check.Opinions, today: datetime.date
) -> tuple[tuple[ClaimOutcome, ...], list[Difference], tuple[tuple[Difference, Accepted], ...]]:
    """Every claim beside the frame; the differences of those that did not hold; and what was accepted."""
    entries = read_accepted(accepted_path(path))
    outcomes, found = [], []
    accepted: list[tuple[Difference, Accepted]] = []
    for claim in claims_beside(path):
        outcome, differences, lived_with = _claim(path, claim, result, entries, today)
        outcomes.append(outcome)
        accepted += lived_with
        if not outcome.held:
            found += differences
    return tuple(outcomes), found, tuple(accepted)


def _claim(
    path: Path, claim: Path, result: check.Opinions, entries: tuple[Accepted, ...], today: datetime.date
) -> tuple[ClaimOutcome, list[Difference], list[tuple[Difference, Accepted]]]:
    from crosscheck.claims import FrameNames, ReadingOptions, read_claim

    try:
        reading = read_claim(str(claim), FrameNames.of(result.frame), ReadingOptions())
        verified = check.verify(result.frame, reading, opinions=result)
    except UnusableInput as error:
        says = f"cannot be read: {error.problems[0]}"
        return ClaimOutcome(claim.name, False, "unreadable", says), [], []
    differences = [d for c in verified.cases for d in c.differences]
    name = claim_name(path, claim)
    lived_with = [(d, e) for d in differences for e in entries if e.covers(name, d, today)]
    left = [d for d in differences if not any(d is known for known, _ in lived_with)]
    held, says = _held(verified, expectation(claim), left, len(lived_with))
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
    if expected.kind and (first is None or not _as_expected(first, expected)):
        said = f"{first.kind} {' '.join(first.where)}".strip() if first else "none"
        return False, f"disagrees, but the first suspect is {said} and not {expected.kind} {expected.where}".strip()
    return True, "disagrees as expected"


def _as_expected(suspect: object, expected: Expectation) -> bool:
    kind, where = getattr(suspect, "kind", ""), getattr(suspect, "where", ())
    return kind == expected.kind and (not expected.where or set(expected.where.replace(",", " ").split()) <= set(where))


# --- a whole set


def chosen(paths: Sequence[Path], only: str | None = None, since: str | None = None) -> list[Path]:
    """Frames below the paths, of those named like `only`, and changed since the git revision `since`.

    Raises UnusableInput for a path that does not exist or a revision that git does not know.
    """
    missing = [p for p in paths if not p.exists()]
    if missing:
        advice = "name a folder or a frame file"
        raise UnusableInput(Problem(str(p), None, "", "does not exist", advice) for p in missing)
    frames = list(frames_below(paths))
    if only is not None:
        frames = [f for f in frames if fnmatch.fnmatch(stem(f), only) or only in stem(f)]
    if since is not None:
        frames = [f for f in frames if _changed(f, since)]
    return frames


def _changed(frame: Path, revision: str) -> bool:
    """Whether the frame or what lies beside it differs from the revision, or is not known to git."""
    names = [f"{stem(frame)}.toml", f"{stem(frame)}.*"]
    said = [_git(frame.parent, ["diff", "--name-only", revision, "--", *names])]
    said.append(_git(frame.parent, ["ls-files", "--others", "--exclude-standard", "--", *names]))
    return any(text.strip() for text in said)


def _git(folder: Path, arguments: list[str]) -> str:
    try:
        done = subprocess.run(["git", "-C", str(folder), *arguments], capture_output=True, text=True, check=False)
    except OSError as error:
        raise UnusableInput([Problem("", None, "--changed-since", f"git cannot be run ({error})")]) from None
    if done.returncode != 0:
        reason = (done.stderr.strip() or "git failed").splitlines()[0]
        raise UnusableInput([Problem("", None, "--changed-since", reason, "name a revision that git knows here")])
    return done.stdout


def run(
    frames: Sequence[Path], looked_in: Sequence[Path], progress: Callable[[FrameOutcome], None] | None = None,
    workers: int | None = None,
) -> SuiteOutcome:  # fmt: skip
    """Check the frames on all cores."""
    paths = [f.as_posix() for f in frames]
    outcomes: list[FrameOutcome] = []
    for outcome in _outcomes(paths, workers or min(os.cpu_count() or 1, len(paths))):
        outcomes.append(outcome)
        if progress is not None:
            progress(outcome)
    order = {p: k for k, p in enumerate(paths)}
    outcomes.sort(key=lambda o: order[o.file])
    return SuiteOutcome(tuple(outcomes), tuple(p.as_posix() for p in looked_in))


def _outcomes(paths: list[str], workers: int) -> Iterator[FrameOutcome]:
    if workers <= 1 or len(paths) < 4:
        # Not worth starting processes for, unless one dies: then it takes this process with it, as it would anybody's.
        yield from map(check_frame, paths)
        return
    done: set[str] = set()
    try:
        with ProcessPoolExecutor(workers) as pool:
            waiting = {pool.submit(check_frame, p): p for p in paths}
            for future in as_completed(waiting):
                outcome = future.result()
                done.add(waiting[future])
                yield outcome
    except BrokenProcessPool:
        # A worker died and took the pool along: the frames not yet done are tried one a process, to find the one.
        for path in paths:
            if path not in done:
                yield _alone(path)


def _alone(path: str) -> FrameOutcome:
    try:
        with ProcessPoolExecutor(1) as pool:
            return pool.submit(check_frame, path).result()
    except BrokenProcessPool:
        return FrameOutcome(path, "crashed", "the process that checked it died")


# --- two sets


def against(frames: Sequence[Path], roots: Sequence[Path], other: Path) -> SuiteOutcome:
    """Values on record of each frame against those of the same frame below `other`: what moved between two sets."""
    outcomes = []
    for frame in frames:
        root = next((r for r in roots if r.is_dir() and frame.is_relative_to(r)), frame.parent)
        twin = other / frame.relative_to(root)
        outcomes.append(_against_one(frame, twin))
    return SuiteOutcome(tuple(outcomes), tuple(p.as_posix() for p in (*roots, other)))


def _against_one(frame: Path, twin: Path) -> FrameOutcome:
    file = frame.as_posix()
    ours, theirs = record_path(frame), record_path(twin)
    if not ours.exists() or not theirs.exists():
        which = " and ".join(p.as_posix() for p in (ours, theirs) if not p.exists())
        return FrameOutcome(file, "never on record", f"no values on record at {which}")
    try:
        found, compared = _compare_records(frame, ours, theirs)
    except UnusableInput as error:
        return FrameOutcome(file, "unreadable", "; ".join(str(p) for p in error.problems[:3]))
    state = "moved" if found else "held" if compared else "undecided"
    says = f"{len(found):,} of {compared:,} values moved" if found else f"{compared:,} values hold"
    return FrameOutcome(file, state, says, tuple(found), compared=compared)


def _compare_records(frame: Path, ours: Path, theirs: Path) -> tuple[list[Difference], int]:
    from crosscheck.suite.record import compare_tables, table_scales

    here, there = read_record(ours).now, read_record(theirs).now
    found: list[Difference] = []
    compared = 0
    for case in [*here.values, *(c for c in there.values if c not in here.values)]:
        a, b = here.values.get(case, {}), there.values.get(case, {})
        differences, count = compare_tables(case, a, b, table_scales(a, b), ("here", "there"))
        found += differences
        compared += count
    return found, compared
