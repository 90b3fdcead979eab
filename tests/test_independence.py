"""The opinions share no mechanics, and a wrong term in one of them is laid at its door.

First, what each opinion imports, read from its source. Then wrong terms: a copy of an opinion is loaded under another
name with one arithmetic operation altered, and compared with the other two as they are.
"""

from __future__ import annotations

import ast
import importlib
import subprocess
import sys
import warnings
from collections import Counter
from collections.abc import Iterator
from dataclasses import dataclass
from functools import cache
from pathlib import Path
from random import Random
from types import ModuleType

import pytest

import crosscheck
from crosscheck.answer import Answer
from crosscheck.compare.differences import Difference
from crosscheck.compare.differences import Place as ComparedPlace
from crosscheck.compare.opinions import Comparison, lone_dissenter
from crosscheck.frame.kinematics import study
from crosscheck.frame.model import Frame
from crosscheck.frame.reader import read_frame_text
from crosscheck.opinions import library, moment_distribution, slope_deflection
from crosscheck.opinions.library import deferred

ROOT = Path(crosscheck.__file__).parent
OPINIONS = {
    "slope-deflection": slope_deflection,
    "moment-distribution": moment_distribution,
    "library": library,
}

# --- what the opinions import ------------------------------------------------------------------------

ANY = frozenset({"*"})
SHARED = {
    "crosscheck.answer": ANY,
    "crosscheck.problems": ANY,
    "crosscheck.frame.model": ANY,
    "crosscheck.frame.loads": ANY,
    "crosscheck.frame.stations": ANY,
    "crosscheck.frame.kinematics": frozenset({"Study"}),
}
"""What an opinion may import from the package besides itself: data and geometry. Of kinematics only its findings."""
BELOW = ("crosscheck.frame", "crosscheck.answer", "crosscheck.problems")
"""What frame/ may import from the package."""
MECHANICS = {"E", "G", "I", "shear_area"}
"""Properties that the shared geometry has no use for."""
GEOMETRY = ("answer.py", "frame/loads.py", "frame/stations.py", "frame/kinematics.py")


def imports(source: str, package: str) -> Iterator[tuple[str, str]]:
    """(module, name) of every import anywhere in a source; relative ones resolved in `package`; dynamic ones too."""
    for node in ast.walk(ast.parse(source)):
        if isinstance(node, ast.Import):
            yield from ((alias.name, "") for alias in node.names)
        elif isinstance(node, ast.ImportFrom):
            base = package.rsplit(".", node.level - 1)[0] if node.level > 1 else package
            module = f"{base}.{node.module}" if node.level and node.module else (node.module or base)
            yield from ((module, alias.name) for alias in node.names)
        elif isinstance(node, ast.Constant) and isinstance(node.value, str) and node.value.startswith("crosscheck."):
            yield node.value, ""  # a module's name as text can only be meant for a dynamic import
        elif isinstance(node, ast.Name) and node.id in ("importlib", "__import__"):
            yield f"crosscheck.?{node.id}", ""


def trespasses(source: str, own: str) -> list[str]:
    """Imports from the package that an opinion whose package is `own` may not make."""
    found = []
    for module, name in imports(source, own):
        if module.split(".")[0] != "crosscheck" or module == own or module.startswith(own + "."):
            continue
        if module == "crosscheck.opinions" and f"{module}.{name}" == own:
            continue
        allowed = SHARED.get(module, frozenset())
        if allowed != ANY and name not in allowed:
            found.append(f"{module} {name}".strip())
    return found


DYNAMIC = {"opinions/library/deferred.py"}
"""Modules that may import by name: what they so import is held by test_only_drawing_is_imported_by_name."""


def sources(package: Path) -> list[Path]:
    return sorted(package.rglob("*.py"))


def opinion_packages() -> dict[str, Path]:
    """Every package under opinions/, so that a new opinion is held to the rules too."""
    return {f"crosscheck.opinions.{p.name}": p for p in (ROOT / "opinions").iterdir() if (p / "__init__.py").exists()}


def test_no_opinion_imports_another_or_mechanics_from_elsewhere() -> None:
    packages = opinion_packages()
    assert {module.__name__ for module in OPINIONS.values()} == set(packages)
    found: dict[str, list[str]] = {}
    for own, package in packages.items():
        for path in sources(package):
            name = path.relative_to(ROOT).as_posix()
            bad = trespasses(path.read_text(encoding="utf-8"), own)
            found[name] = [b for b in bad if name not in DYNAMIC or b != "crosscheck.?importlib"]
    assert {name: bad for name, bad in found.items() if bad} == {}


def test_only_drawing_is_imported_by_name() -> None:
    """The one module that imports by name imports matplotlib by it, and names nothing of ours anywhere."""
    assert all(name.split(".")[0] == "matplotlib" for name in deferred.NAMES)
    (path,) = (ROOT / name for name in DYNAMIC)
    ours = {m for m, _ in imports(path.read_text(encoding="utf-8"), "crosscheck.opinions.library") if "crosscheck" in m}
    assert ours == {"crosscheck.?importlib"}


@pytest.mark.parametrize(
    "line",
    [
        "from crosscheck.opinions.slope_deflection.members import coefficients",
        "import crosscheck.opinions.slope_deflection.members as m",
        "from crosscheck.opinions import slope_deflection",
        "from ..slope_deflection import members",
        "def f():\n    from crosscheck.opinions.library import opine",
        "from crosscheck.frame.kinematics import elongations",
        "from crosscheck.frame import kinematics",
        "from crosscheck.audit.fit import flexibility",
        "import crosscheck.compare",
        "m = importlib.import_module('crosscheck.opinions.library')",
        "__import__(name)",
    ],
)
def test_a_trespass_would_be_seen(line: str) -> None:
    assert trespasses(line, "crosscheck.opinions.moment_distribution")


def test_the_rooms_below_know_no_mechanics() -> None:
    """frame/ imports nothing above it, and what the opinions share of it never touches E, G, I or a shear area."""
    for path in sources(ROOT / "frame"):
        modules = {module for module, _ in imports(path.read_text(encoding="utf-8"), "crosscheck.frame")}
        assert {m for m in modules if m.startswith("crosscheck") and not m.startswith(BELOW)} == set(), path
    for name in GEOMETRY:
        tree = ast.parse((ROOT / name).read_text(encoding="utf-8"))
        used = {node.attr for node in ast.walk(tree) if isinstance(node, ast.Attribute)}
        assert used & MECHANICS == set(), name


@pytest.mark.parametrize("name", list(OPINIONS))
def test_importing_one_opinion_loads_no_other(name: str) -> None:
    """In a fresh process, so that nothing that the tests imported hides it."""
    own = OPINIONS[name].__name__
    others = [module.__name__ for module in OPINIONS.values() if module.__name__ != own]
    above = ["crosscheck.audit", "crosscheck.compare", "crosscheck.suspects", "crosscheck.claims", "crosscheck.report"]
    code = f"import sys, {own}; print([m for m in {others + above} if m in sys.modules])"
    run = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert run.stdout.strip() == "[]"


# --- wrong terms ---------------------------------------------------------------------------------------

FRAMES = {
    "elastic": """
        title = "two bays, elastic: a hinge, a semi-rigid end, a turned spring"
        units = "kN m"
        [materials.steel]
        E = "210 GPa"
        density = "7850 kg/m^3"
        [sections.post]
        I = "8360 cm^4"
        A = "53.8 cm^2"
        [sections.beam]
        I = "16270 cm^4"
        A = "72.7 cm^2"
        [joints]
        A = [0, 0]
        B = [0.4, 4.2]
        C = [6.5, 5.0]
        D = [6.5, 0]
        E = [11, 4.4]
        F = [11.5, 0.5]
        [members]
        "A-B" = { section = "post", material = "steel" }
        "B-C" = { section = "beam", material = "steel", spring_from = 9000 }
        "D-C" = { section = "post", material = "steel" }
        "C-E" = { section = "beam", material = "steel", hinge = "to" }
        "F-E" = { section = "post", material = "steel" }
        [supports]
        A = "fixed"
        D = { x = "held", y = "held", rotation = 4500 }
        F = { x = "held", y = 30000, angle = 20 }
        [analysis]
        axial = "elastic"
        [loads.all]
        apply = [
          { member = "B-C", varying = [6, 9], direction = "down" },
          { member = "B-C", force = 15, direction = 250, at = 2.1 },
          { member = "C-E", uniform = 7, direction = "down", start = 1, end = 3.5 },
          { member = "A-B", uniform = 3, direction = "right", per = "projection" },
          { member = "D-C", couple = 11, at = 2 },
          { joint = "B", force = 12, direction = "right" },
          { joint = "C", couple = -8 },
          { self_weight = 1.0 },
        ]
        """,
    "rigid": """
        title = "pitched portal, axially rigid, pinned and fixed"
        units = "kip ft"
        [materials.steel]
        E = "29000 ksi"
        [sections.post]
        I = "500 in^4"
        [sections.rafter]
        I = "350 in^4"
        [joints]
        A = [0, 0]
        B = [0, 14]
        C = [22, 20]
        D = [40, 13]
        E = [41, 0]
        [members]
        "A-B" = { section = "post", material = "steel" }
        "B-C" = { section = "rafter", material = "steel" }
        "C-D" = { section = "rafter", material = "steel", spring_to = 12000 }
        "E-D" = { section = "post", material = "steel" }
        [supports]
        A = "pinned"
        E = "fixed"
        [loads.all]
        apply = [
          { member = "B-C", uniform = 0.8, direction = "down", per = "projection" },
          { member = "C-D", varying = [0.4, 1.1], direction = "across", start = "20%", end = "90%" },
          { member = "A-B", force = 3.5, direction = "right", at = 6 },
          { member = "E-D", couple = 9, at = "40%" },
          { joint = "D", force = 2, direction = "left" },
          { joint = "C", couple = 6 },
        ]
        """,
}
"""Frames for which all three opinions speak."""

TURNED: dict[type[ast.operator], type[ast.operator]] = {
    ast.Add: ast.Sub, ast.Sub: ast.Add, ast.Mult: ast.Div, ast.Div: ast.Mult,
}  # fmt: skip
ASIDE = ("__init__.py", "working.py", "equations.py", "qualification.py", "scope.py")
"""Modules of an opinion without mechanics of its own results."""
ELSEWHERE = (
    "balance.py", "bent_spans.py", "critical.py", "displaced.py", "displaced_one_way.py", "displaced_spans.py",
    "displaced_working.py", "division.py", "gradual.py", "one_way.py", "second_order.py", "stretches.py", "varying.py",
)  # fmt: skip
"""Modules that these frames, of first order and with plain members, never enter: nothing altered there could be seen."""
PLACES = 120
"""Most places altered in each opinion, in an order fixed by a seed."""
NAMED = 20
"""As soon as so many brought about a difference that is laid at the right door, enough is shown."""


@dataclass(frozen=True)
class Place:
    """One arithmetic operation of an opinion: the n-th of its module."""

    module: str
    n: int

    def altered(self, source: str) -> str:
        """The module's source with this operation turned into its opposite."""
        tree = ast.parse(source)
        node = operations(tree)[self.n]
        node.op = TURNED[type(node.op)]()
        return ast.unparse(tree)


def operations(tree: ast.Module) -> list[ast.BinOp]:
    """Sums, differences, products and quotients inside functions."""
    functions = [n for n in ast.walk(tree) if isinstance(n, ast.FunctionDef)]
    found = [n for f in functions for n in ast.walk(f) if isinstance(n, ast.BinOp) and type(n.op) in TURNED]
    return list(dict.fromkeys(found))


def places(package: Path) -> list[Place]:
    """A fixed choice of operations all over an opinion."""
    every = [
        Place(path.name, n)
        for path in sources(package)
        if path.name not in (*ASIDE, *ELSEWHERE)
        for n in range(len(operations(ast.parse(path.read_text(encoding="utf-8")))))
    ]
    return Random("places").sample(every, k=min(PLACES, len(every)))


def planted(opinion: str, place: Place, folder: Path) -> ModuleType:
    """The opinion's package loaded a second time, under another name, with one operation altered."""
    original = OPINIONS[opinion].__name__
    name = f"planted_{opinion.replace('-', '_')}_{place.module[:-3]}_{place.n}"
    (folder / name).mkdir()
    for path in sources(ROOT / "opinions" / original.rsplit(".", 1)[1]):
        source = path.read_text(encoding="utf-8").replace(original, name)
        if path.name == place.module:
            source = place.altered(source)
        (folder / name / path.name).write_text(source, encoding="utf-8")
    importlib.invalidate_caches()
    return importlib.import_module(name)


@cache
def sound(text: str) -> tuple[Frame, dict[str, Answer]]:
    """A frame and what the three opinions say of it as they are."""
    frame = read_frame_text(text)
    answers = {name: module.opine(frame, study(frame)) for name, module in OPINIONS.items()}
    assert all(isinstance(answer, Answer) for answer in answers.values())
    return frame, {name: answer for name, answer in answers.items() if isinstance(answer, Answer)}


def outcome(opinion: str, module: ModuleType) -> str:
    """What comparing the altered opinion with the other two comes to: the name of the lone dissenter, or "unnamed" for
    a difference without one, "silent" or "stopped" where it gives no answer, "unseen" where it changes nothing."""
    found = "unseen"
    for text in FRAMES.values():
        frame, answers = sound(text)
        try:
            with warnings.catch_warnings():
                warnings.simplefilter("ignore")
                answer = module.opine(frame, study(frame))
                if not isinstance(answer, Answer):
                    return "silent"
                judged = Comparison(frame, {**answers, opinion: answer}).judge("all")
        except Exception:
            return "stopped"
        if judged.verdict == "disagree":
            if judged.dissenter:
                return judged.dissenter
            found = "unnamed"
    return found


@pytest.mark.parametrize("text", FRAMES.values(), ids=FRAMES)
def test_the_opinions_agree_as_they_are(text: str) -> None:
    frame, answers = sound(text)
    assert Comparison(frame, answers).judge("all").verdict == "agree"


@pytest.mark.parametrize(
    ("values", "lone"),
    [
        ([(1.0, 2.0, 2.0)], "a"),
        ([(1.0, 2.0, 2.0), (1.0, 3.0, None)], "a"),
        ([(1.0, 2.0, None)], None),
        ([(None, 2.0, 2.0)], "a"),
        ([(1.0, None, None)], "a"),
        ([(1.0, 2.0, 3.0)], None),
        ([(1.0, 2.0, 2.0), (2.0, 1.0, 2.0)], None),
        ([(1.0, 2.0, 2.0), (1.0, 2.0, 3.0)], None),
        ([], None),
    ],
)
def test_who_stands_out(values: list[tuple[float | None, ...]], lone: str | None) -> None:
    differences = tuple(
        Difference(ComparedPlace("all", "joints", "dx"), dict(zip("abc", row, strict=True)), 1.0, 1e-6)
        for row in values
    )
    assert lone_dissenter(("a", "b", "c"), differences) == lone
    assert lone_dissenter(("a", "b"), differences) is None


@pytest.mark.parametrize("opinion", list(OPINIONS))
def test_a_wrong_term_is_laid_at_the_right_door(
    opinion: str, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """At least 20 wrong terms in each opinion make it the lone dissenter, and none makes another."""
    monkeypatch.syspath_prepend(str(tmp_path))
    package = ROOT / "opinions" / OPINIONS[opinion].__name__.rsplit(".", 1)[1]
    tally = Counter[str]()
    for place in places(package):
        try:
            module = planted(opinion, place, tmp_path)
        except Exception:
            tally["stopped"] += 1  # The altered operation runs while the module loads.
            continue
        if opinion == "library":
            # Its own qualification would notice most wrong terms and abstain; here the comparison has to.
            monkeypatch.setattr(f"{module.__name__}.qualification.failure", lambda *_: "")
        tally[outcome(opinion, module)] += 1
        for name in [m for m in sys.modules if m.split(".")[0] == module.__name__]:
            del sys.modules[name]
        if tally[opinion] == NAMED:
            break
    assert set(tally) <= {opinion, "unnamed", "silent", "stopped", "unseen"}, tally
    assert tally[opinion] >= NAMED, tally
