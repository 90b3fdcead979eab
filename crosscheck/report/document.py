"""The JSON document (README, The JSON document): the same findings as every other report, at full precision."""

from __future__ import annotations

import json
import math
from collections.abc import Iterable
from typing import Any

import numpy as np

from crosscheck.answer import Answer, CaseAnswer
from crosscheck.check import CaseAudit, Opinions, Verification
from crosscheck.compare.differences import Difference
from crosscheck.compare.envelopes import NOBODY, Extremes, envelope, envelope_spans
from crosscheck.compare.opinions import (
    END_QUANTITIES,
    JOINT_QUANTITIES,
    REACTION_QUANTITIES,
    SPAN_QUANTITIES,
    with_turning_points,
)
from crosscheck.frame.model import Floats, Frame
from crosscheck.frame.stations import stations

FORMAT = "crosscheck/1"


def opinions_document(result: Opinions) -> dict[str, Any]:
    """The document of `crosscheck opinions`."""
    differences = [d for j in result.judgements.values() for d in j.differences]
    return {
        "format": FORMAT,
        "frame": frame_part(result.frame),
        "idealisation": idealisation_part(result.frame),
        "opinions": _opinions_part(result),
        "disagreements": [difference_part(d) for d in differences],
        "verdict": result.verdict,
    }


def verification_document(result: Verification) -> dict[str, Any]:
    """The document of `crosscheck verify`."""
    document = opinions_document(result.opinions)
    document["disagreements"] += [difference_part(d) for c in result.cases for d in c.differences]
    document |= {
        "claim": _claim_part(result),
        "statics": [_static_part(s) for audit in result.audits for s in audit.statics if s.ok is not None],
        "compatibility": [row for audit in result.audits for row in _compatibility_part(audit)],
        "suspects": [_suspect_part(s) for s in result.suspects],
    }
    if result.supposed:
        document["supposed"] = result.supposed  # frame, claim and verdict are as a suspect supposes, not as stated
    document["verdict"] = result.verdict
    return document


def frame_part(frame: Frame) -> dict[str, Any]:
    part: dict[str, Any] = {
        "title": frame.title,
        "file": frame.file,
        "sha256": frame.sha256,
        "units": {"force": frame.units.force, "length": frame.units.length},
    }
    if frame.includes:
        part["includes"] = [{"file": one.file, "sha256": one.sha256} for one in frame.includes]
    return part


def idealisation_part(frame: Frame) -> dict[str, Any]:
    a = frame.analysis
    return {"axial": a.axial, "shear": a.shear, "order": a.order}


def _opinions_part(result: Opinions) -> list[dict[str, Any]]:
    from crosscheck.check import OPINIONS

    return [
        _given(result, result.answers[name])
        if name in result.answers
        else {"name": name, "status": "abstained", "why": result.silent[name].why}
        for name in OPINIONS
    ]


def _given(result: Opinions, answer: Answer) -> dict[str, Any]:
    why = "; ".join(f"{case}: {reason}" for case, reason in answer.silent.items()) or None
    results = {name: _case_part(result.frame, answer, name) for name in result.names if name in answer.cases}
    given: dict[str, Any] = {"name": answer.opinion, "status": "given", "why": why, "results": results}
    envelopes = {name: part for name in result.envelopes if (part := _envelope_part(result.frame, answer, name))}
    return given | ({"envelopes": envelopes} if envelopes else {})


def _envelope_part(frame: Frame, answer: Answer, name: str) -> dict[str, Any] | None:
    """Extremes with the case that governs each; null where no case has a value."""
    found = envelope(frame, answer, name)
    if found is None:
        return None
    ends = [
        {"member": m.name, "joint": joint, "quantity": q, **_extreme_part(found.ends, found.names, (k, end, c))}
        for k, m in enumerate(frame.members.values())
        for end, joint in enumerate((m.joint_from, m.joint_to))
        for c, q in enumerate(END_QUANTITIES)
    ]
    joints = [
        {"joint": joint, "quantity": q, **_extreme_part(found.joints, found.names, (k, c))}
        for k, joint in enumerate(frame.joints)
        for c, q in enumerate(JOINT_QUANTITIES)
    ]
    reactions = [
        {"joint": joint, "quantity": q, **_extreme_part(found.reactions, found.names, (frame.joint_index[joint], c))}
        for joint in frame.supports
        for c, q in enumerate(REACTION_QUANTITIES)
    ]
    spans = _envelope_spans(frame, answer, found.names)
    of = {"of": list(found.names), "lacking": list(found.lacking)}
    return of | {"member_ends": ends, "joints": joints, "reactions": reactions, "spans": spans}


def _extreme_part(e: Extremes, names: tuple[str, ...], index: tuple[int, ...]) -> dict[str, Any]:
    return {
        "greatest": plain(float(e.greatest[index])), "greatest_by": _by(names, int(e.greatest_by[index])),
        "least": plain(float(e.least[index])), "least_by": _by(names, int(e.least_by[index])),
    }  # fmt: skip


def _by(names: tuple[str, ...], index: int) -> str | None:
    return None if index == NOBODY else names[index]


def _envelope_spans(frame: Frame, answer: Answer, names: tuple[str, ...]) -> list[dict[str, Any]]:
    found = envelope_spans(frame, answer, names)
    e = found.values
    parts = []
    for k, member in enumerate(frame.members):
        own = found.at.of(k)
        part: dict[str, Any] = {"member": member, "x": found.at.x[own].tolist()}
        for c, q in enumerate(SPAN_QUANTITIES):
            part[q] = {
                "greatest": _lists(e.greatest[own, c]),
                "greatest_by": [_by(names, i) for i in e.greatest_by[own, c].tolist()],
                "least": _lists(e.least[own, c]),
                "least_by": [_by(names, i) for i in e.least_by[own, c].tolist()],
            }
        parts.append(part)
    return parts


def _case_part(frame: Frame, answer: Answer, name: str) -> dict[str, Any]:
    case: CaseAnswer = answer.cases[name]
    ends, joints, reactions = _lists(case.ends), _lists(case.joints), _lists(case.reactions)
    return {
        "member_ends": [
            {"member": m.name, "joint": joint, "axial": e[0], "shear": e[1], "moment": e[2]}
            for m, pair in zip(frame.members.values(), ends, strict=True)
            for joint, e in zip((m.joint_from, m.joint_to), pair, strict=True)
        ],
        "joints": [
            {"joint": joint, "dx": d[0], "dy": d[1], "rotation": d[2]}
            for joint, d in zip(frame.joints, joints, strict=True)
        ],
        "reactions": [
            {"joint": joint, "fx": r[0], "fy": r[1], "moment": r[2]}
            for joint in frame.supports
            for r in [reactions[frame.joint_index[joint]]]
        ],
        "spans": _spans(frame, answer, name),
    }


def _spans(frame: Frame, answer: Answer, name: str) -> list[dict[str, Any]]:
    member, x, side = with_turning_points(answer, name, stations(frame))
    values = answer.spans.along(name, member, x, side)
    start = np.searchsorted(member, np.arange(len(frame.members) + 1))
    return [
        {
            "member": m, "x": x[a:b].tolist(), "axial": _lists(values[a:b, 0]), "shear": _lists(values[a:b, 1]),
            "moment": _lists(values[a:b, 2]), "across": _lists(values[a:b, 3]),
        }
        for m, a, b in zip(frame.members, start[:-1].tolist(), start[1:].tolist(), strict=True)
    ]  # fmt: skip


def _lists(values: Floats) -> Any:
    """Nested lists with None for NaN, and plain zero for minus zero."""
    clean = values + 0.0
    if np.isfinite(clean).all():
        return clean.tolist()
    loose = clean.astype(object)
    loose[~np.isfinite(clean)] = None
    return loose.tolist()


def plain(value: float | None) -> float | None:
    return None if value is None or not math.isfinite(value) else float(value) + 0.0


def difference_part(d: Difference) -> dict[str, Any]:
    p = d.place
    return {
        "case": p.case, "quantity": p.quantity, "member": p.member, "joint": p.joint, "at": plain(p.at),
        "values": {o: plain(v) for o, v in d.values.items()},
        "difference": plain(d.difference), "allowed": plain(d.allowed),
    }  # fmt: skip


def _claim_part(result: Verification) -> dict[str, Any]:
    c = result.closed
    return {
        "file": c.file,
        "sha256": c.sha256,
        "rows": c.rows,
        "case": c.cases[0] if len(c.cases) == 1 else list(c.cases),
        "units": dict(c.units),
        "signs": dict(c.signs),
        "not_understood": [{"line": line, "text": text, "why": why} for line, text, why in c.not_understood],
        "coverage": {"compared": sum(k.compared for k in result.cases), "of": sum(k.of for k in result.cases)},
        "facts": [{"kind": f.kind, "where": list(f.where), "says": f.says} for f in result.facts],
    }


def _static_part(s: Any) -> dict[str, Any]:
    return {
        "case": s.case, "check": s.check, "where": s.where, "component": s.component,
        "residual": plain(s.residual), "allowed": plain(s.allowed), "ok": bool(s.ok),
    }  # fmt: skip


def _compatibility_part(audit: CaseAudit) -> Iterable[dict[str, Any]]:
    if audit.compatibility is None:
        return []
    return [
        {
            "case": audit.case, "check": row.kind, "where": row.where, "member": row.member or None,
            "rotation": plain(row.rotation), "expected": plain(row.expected), "allowed": plain(row.allowed),
            "ok": bool(row.ok),
        }
        for row in audit.compatibility.checks
    ]  # fmt: skip


def _suspect_part(s: Any) -> dict[str, Any]:
    return {
        "kind": s.kind, "where": list(s.where), "says": s.says, "explains": plain(s.explains),
        "tied_with": list(s.tied_with),
    }  # fmt: skip


def dumps(document: dict[str, Any]) -> str:
    """The document as text; NaN and infinity cannot occur in it."""
    return json.dumps(document, ensure_ascii=False, allow_nan=False, indent=1) + "\n"
