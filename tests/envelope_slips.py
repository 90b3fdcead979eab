"""Seeded mistakes of envelopes, and which suspect comes first: `python -m tests.envelope_slips 60`.

A combination or a pattern left out of the envelope, or values of other combinations printed beside its extremes, on the
frames of tests.paste_envelopes. Only slips that the printed values show (the verdict is disagree) count.
"""

from __future__ import annotations

import sys
from collections import Counter
from random import Random

import numpy as np

from crosscheck import check
from crosscheck.claims.read import read_claim_text
from crosscheck.claims.reading import FrameNames
from crosscheck.frame.model import Frame
from tests.paste_envelopes import Known, frames, known

SLIPS = ("combination", "pattern", "mixed")


def patterned(frame: Frame, name: str) -> dict[str, list[str]]:
    """Combinations of the envelope with an arrangement, by the pattern's case."""
    out: dict[str, list[str]] = {}
    for n in frame.meant(name):
        for case in frame.combinations[n].factors if n in frame.combinations else ():
            if frame.cases[case].arranged:
                out.setdefault(frame.cases[case].arranged, []).append(n)
    return out


def claim(k: Known, envelope: str, slip: str, r: Random) -> tuple[str, str, tuple[str, ...]] | None:
    """Text, and the kind and place of the suspect that should come first; None where the frame has no room for the slip."""
    frame, names = k.frame, list(k.frame.meant(envelope))
    where: tuple[str, ...] = ()
    kept = names
    if slip == "combination":
        kept = [n for n in names if n != r.choice(names)]
    elif slip == "pattern":
        found = patterned(frame, envelope)
        if not found:
            return None
        case = r.choice(sorted(found))
        where, kept = (case,), [n for n in names if n not in found[case]]
    if not kept:
        return None
    ends = np.stack([k.answer.cases[n].ends for n in kept])
    rows = [f"Envelope {envelope}", "Member\tJoint\tExtreme\tV\tM\tCombination", f"\t\t\t[{frame.units.force}]"
            f"\t[{frame.units.force} {frame.units.length}]\t"]  # fmt: skip
    size = [np.nanmax(np.abs(ends[..., q])) for q in (1, 2)]
    digits = [int(np.clip(4 - np.floor(np.log10(s)), 0, 9)) if s > 0 else 3 for s in size]
    for m, member in enumerate(frame.members.values()):
        for e, joint in enumerate((member.joint_from, member.joint_to)):
            for word, by in (("max M", ends[:, m, e, 2].argmax()), ("min M", ends[:, m, e, 2].argmin())):
                shear = ends[by, m, e, 1] if slip != "mixed" else ends[:, m, e, 1].max()
                rows.append(f"{member.name}\t{joint}\t{word}\t{shear:.{digits[0]}f}\t{ends[by, m, e, 2]:.{digits[1]}f}"
                            f"\t{kept[by]}")  # fmt: skip
    return "\n".join(rows), "load" if slip == "pattern" else "load case", where


def main() -> None:
    count = int(sys.argv[1]) if len(sys.argv) > 1 else 60
    first, told, drawn = Counter[str](), Counter[str](), Counter[str]()
    asked: dict[str, check.Opinions] = {}
    for seed in range(count):
        r = Random(f"envelope slip {seed}")
        key, slip = frames()[seed % len(frames())], SLIPS[seed // len(frames()) % 3]
        k = known(key)
        assert k
        made = claim(k, r.choice(list(k.frame.envelopes)), slip, r)
        if made is None:
            continue
        text, kind, where = made
        if key not in asked:
            asked[key] = check.ask(k.frame)
        result = check.verify(k.frame, read_claim_text(text, FrameNames.of(k.frame)), opinions=asked[key])
        if result.verdict != "disagree":
            told[f"{slip}: {result.verdict}"] += 1
            continue
        drawn[slip] += 1
        best = result.suspects[0] if result.suspects else None
        right = best is not None and best.kind == kind and (not where or best.where == where)
        first[slip] += right
        if not right:
            said = "; ".join(f"{s.kind} {s.where} {s.says} {s.explains:.4f}" for s in result.suspects[:2])
            print(seed, key, slip, where, said or result.no_suspects, flush=True)
    for slip in SLIPS:
        print(f"{slip:<12} first in {first[slip]} of {drawn[slip]}")
    print("not shown by what is printed:", dict(told))


if __name__ == "__main__":
    main()
