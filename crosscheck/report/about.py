"""What a record says of the check that its findings do not hold: for whom, when, how, and what went before."""

from __future__ import annotations

import datetime
import tomllib
from collections.abc import Iterable, Mapping
from dataclasses import dataclass, field
from pathlib import Path

from crosscheck.claims.reading import Reading
from crosscheck.log import Entry
from crosscheck.problems import Problem, UnusableInput, nearest
from crosscheck.review.finding import Finding

ABOUT = {
    "job": "Job",
    "calculation": "Calculation number",
    "revision": "Revision",
    "originator": "Originator",
    "drawings": "Drawings and their revisions",
    "program": "Other program",
    "program_version": "Other program's version",
    "remarks": "Remarks",
}
"""Free text about the check: key of `--about` and what it stands for."""
FILED = ("job", "calculation", "revision")
"""What of it stands at the head of a record, where it is looked for in a file."""


@dataclass(frozen=True, slots=True)
class Circumstances:
    """What the findings do not hold: how, when and for whom the check was made.

    findings: what the review of the model says. history: the check log, this check last. supposed: what the suspect says
    whose change the check was made with, "" for frame and claim as stated.
    """

    command: str = ""
    when: datetime.datetime = field(default_factory=lambda: datetime.datetime.now(datetime.UTC))
    about: Mapping[str, str] = field(default_factory=dict)
    findings: tuple[Finding, ...] = ()
    history: tuple[Entry, ...] = ()
    reading: Reading | None = None
    supposed: str = ""


def read_about(given: Iterable[str]) -> dict[str, str]:
    """Free text from `--about`: each either KEY=TEXT or a TOML file of such keys. Raises UnusableInput."""
    about: dict[str, str] = {}
    problems = []
    for item in given:
        key, equals, text = item.partition("=")
        stated = equals and (key.strip() in ABOUT or not Path(item).exists())
        pairs = [(key.strip(), text.strip())] if stated else list(_about_file(item).items())
        for name, value in pairs:
            if name in ABOUT:
                about[name] = str(value)
            else:
                advice = nearest(name, ABOUT) or f"known: {', '.join(ABOUT)}"
                problems.append(Problem(item, None, name, "is nothing that a record says about itself", advice))
    if problems:
        raise UnusableInput(problems)
    return about


def _about_file(path: str) -> dict[str, object]:
    try:
        return tomllib.loads(Path(path).read_text(encoding="utf-8-sig"))
    except (OSError, ValueError) as error:
        advice = f"KEY=TEXT, or a TOML file with keys {', '.join(ABOUT)}"
        why = (error.strerror or str(error)).lower() if isinstance(error, OSError) else str(error)
        raise UnusableInput([Problem(path, None, "--about", f"cannot be read ({why})", advice)]) from None
