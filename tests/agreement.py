"""The opinions on one random frame, and how far apart they are: for test_agreement.py and count_features.py.

Differences are in shares of the case's scale of each quantity (DESIGN's scales for comparing opinions, by
crosscheck.compare.tolerance), the largest over every case and combination, kind of result and station.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from typing import Protocol

import numpy as np

from crosscheck.answer import ACROSS, Answer, CaseAnswer, Silent, Undetermined
from crosscheck.compare.tolerance import KIND, Scales, case_scales
from crosscheck.frame.kinematics import study
from crosscheck.frame.loads import load_table
from crosscheck.frame.model import Floats, Frame, Ints
from crosscheck.frame.stations import stations
from crosscheck.opinions import library, moment_distribution, slope_deflection
from tests.exact import Exact
from tests.random_frames import features_of, random_frame, random_frame_text
from tests.truth import Truth
from tests.truth_week import WeekTruth

COLUMNS = {
    "ends": ("axial", "shear", "moment"),
    "joints": ("dx", "dy", "rotation"),
    "reactions": ("fx", "fy", "moment"),
    "spans": ("axial", "shear", "moment", "across"),
}
Along = Callable[[str, Ints, Floats, Ints], Floats]


class Given(Protocol):
    """What an opinion and the tests' own solver have in common."""

    @property
    def cases(self) -> Mapping[str, CaseAnswer]: ...

    @property
    def undetermined(self) -> Undetermined: ...


@dataclass(frozen=True)
class Heard:
    """A random frame and what each opinion says of it."""

    seed: int
    frame: Frame
    features: frozenset[str]
    slope_deflection: Answer | Silent
    moment_distribution: Answer | Silent
    library: Answer | Silent

    @property
    def speaking(self) -> dict[str, Answer]:
        """The answers of the opinions that speak."""
        heard = (self.slope_deflection, self.moment_distribution, self.library)
        return {answer.opinion: answer for answer in heard if isinstance(answer, Answer)}


def hear(seed: int) -> Heard:
    """Ask every opinion about the random frame of a seed."""
    frame = random_frame(seed)
    studied = study(frame)
    features = features_of(frame, random_frame_text(seed))
    if studied.undetermined.axial.any():
        features.add("undetermined axial")
    return Heard(
        seed,
        frame,
        frozenset(features),
        slope_deflection.opine(frame, studied),
        moment_distribution.opine(frame, studied),
        library.opine(frame, studied),
    )


def must_speak(heard: Heard) -> bool:
    """Whether the library must speak: shear-rigid, no zones, temperature, misfit, settlement or open axial force."""
    bars = {"shear elastic", "rigid_from", "rigid_to", "Temperature", "Misfit", "Settlement", "undetermined axial"}
    return not bars & heard.features


def apart(frame: Frame, one: Given, other: Given, partial: bool = False) -> tuple[float, str]:
    """The largest difference as a share of its scale, and where; infinite where one gives what the other does not.

    partial: cases for which `other` does not speak, and values along members that it leaves out (the library has them
    at its own joints only), are passed over.
    """
    worst, where = 0.0, ""
    for name in frame.names:
        if partial and name not in other.cases:
            continue
        pairs = _pairs(frame, name, one, other)
        cases = [one.cases[name], other.cases[name]]
        scales = case_scales(frame, load_table(frame, name), cases, [s[:, ACROSS] for s in pairs["spans"]])
        for kind, (left, right) in pairs.items():
            share, index = _largest(left, right, COLUMNS[kind], scales, partial and kind == "spans")
            if share > worst:
                worst, where = share, f"{name} {kind} {index} {left[index]!r} against {right[index]!r}"
    return worst, where


def _pairs(frame: Frame, name: str, one: Given, other: Given) -> dict[str, tuple[Floats, Floats]]:
    a, b = one.cases[name], other.cases[name]
    at = stations(frame)
    spans = [along(of)(name, at.member, at.x, at.side) for of in (one, other)]
    return {
        "ends": (a.ends, b.ends),
        "joints": (a.joints, b.joints),
        "reactions": (a.reactions, b.reactions),
        "spans": (spans[0], spans[1]),
    }


def along(of: Given) -> Along:
    if isinstance(of, Answer):
        return of.spans.along
    assert isinstance(of, Truth | WeekTruth | Exact)
    return of.along


def _largest(
    left: Floats, right: Floats, columns: tuple[str, ...], scales: Scales, partial: bool
) -> tuple[float, tuple[int, ...]]:
    scale = np.array([getattr(scales, KIND[c]) for c in columns])
    known = np.isfinite(left) & np.isfinite(right)
    share = np.where(known, np.abs(left - right), 0.0) / np.where(scale > 0.0, scale, 1.0)
    if not partial:
        share = np.where(np.isnan(left) != np.isnan(right), np.inf, share)
    index = np.unravel_index(int(np.argmax(share)), share.shape)
    return float(share[index]), tuple(int(k) for k in index)
