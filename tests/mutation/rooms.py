"""What is altered, how many, and who must notice.

tests: arguments of pytest by the altered module's name, "*" for every module and first, for they are the quickest. A mutant
that the comparison on cases/ lets through must be noticed by one of them; the whole suite notices at least as much.
"""

from __future__ import annotations

import os
import tomllib
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path

ROOT = Path(__file__).resolve().parents[2]
KNOWN = Path(__file__).with_name("known.toml")
"""Survivors looked at one by one: mutants that change nothing, each with its reason."""


LONG = ("tests/test_agreement.py", "tests/test_week_agreement.py")
"""Of an opinion, the last to notice: 700 random frames. Left out where QUICK is set: survivors are then tried again."""


@dataclass(frozen=True)
class Room:
    """folder: of the modules altered; opinion: its name in answers, "" where it is none."""

    folder: str
    count: int
    seed: int
    tests: Mapping[str, tuple[str, ...]]
    opinion: str = ""
    second_order: frozenset[str] = frozenset()
    unheard: frozenset[str] = frozenset()
    """Modules that only second order runs, and those that no opinion's answer comes from (working, suspects)."""

    @property
    def modules(self) -> list[Path]:
        return sorted((ROOT / self.folder).glob("*.py"))

    @property
    def last(self) -> tuple[str, ...]:
        return LONG if self.opinion and "QUICK" not in os.environ else ()

    @property
    def every_test(self) -> list[str]:
        return list(dict.fromkeys(test for module in self.tests for test in self.who_notices(module)))

    def who_notices(self, module: str) -> tuple[str, ...]:
        every, own = self.tests.get("*", ()), self.tests.get(module, ())
        return (*own, *every, *self.last) if module in self.second_order else (*every, *own, *self.last)


SUSPECTS = ("tests/test_suspects.py",)
SECOND_ORDER = ("tests/test_second_order.py -k not(agree_up_to_near)and(not(many_elements))",)
WEEK = ("tests/test_slope_deflection_week.py",)
OTHER_WEEK = ("tests/test_moment_distribution_week.py",)
ROOMS = {
    "slope_deflection": Room(
        "crosscheck/opinions/slope_deflection", 200, 1,
        {
            "prepared": SUSPECTS, "second_order": SECOND_ORDER, "division": SECOND_ORDER, "displaced_spans": SECOND_ORDER,
            "balance": SECOND_ORDER, "varying": WEEK, "one_way": WEEK, "parting": WEEK,
            "*": ("tests/test_mutants.py", "tests/test_exact.py", "tests/published/test_published.py"),
        },
        "slope-deflection", frozenset({"second_order", "division", "displaced_spans", "balance"}),
        frozenset({"prepared", "equations", "one_way", "parting"}),
    ),
    "moment_distribution": Room(
        "crosscheck/opinions/moment_distribution", 200, 2,
        {
            **dict.fromkeys(("second_order", "bent_spans", "displaced", "displaced_working", "critical", "stretches"),
                            SECOND_ORDER),
            **dict.fromkeys(("gradual", "one_way", "varying", "members", "spans", "pieces"), OTHER_WEEK),
            "*": ("tests/test_mutants.py", "tests/test_exact.py", "tests/test_moment_distribution.py"),
        },
        "moment-distribution",
        frozenset({"second_order", "bent_spans", "displaced", "critical", "stretches", "gradual"}),
        frozenset({"working", "displaced_working", "one_way"}),
    ),
    "library": Room(
        "crosscheck/opinions/library", 200, 3,
        {"*": ("tests/test_mutants.py", "tests/test_library.py", "tests/test_exact.py")}, "library",
    ),
    "audit": Room(
        "crosscheck/audit", 100, 4,
        {"*": ("tests/test_mutants.py", "tests/test_audit.py", "tests/test_audit_corpus.py", "tests/test_audit_week.py")},
    ),
    "compare": Room(
        "crosscheck/compare", 100, 5,
        {"*": ("tests/test_mutants.py", "tests/test_mutants_compare_a.py", "tests/test_mutants_compare_b.py",
               "tests/test_mutants_compare_c.py", "tests/test_claims_variants.py", "tests/test_claims.py",
               "tests/test_claims_parts.py", "tests/test_claims_wild.py",
               "tests/published/test_patterns.py", "tests/test_claims_pastes.py",
               "tests/test_envelope_claims.py", "tests/test_exact_limits.py", "tests/test_cases.py")},
    ),
}  # fmt: skip


def known() -> dict[str, str]:
    """Mutant to the reason why nothing can notice it."""
    return dict(tomllib.loads(KNOWN.read_text(encoding="utf-8"))) if KNOWN.exists() else {}
