"""Print how many of the random frames each opinion spoke for, by feature, and the largest differences found.

    python -m tests.count_features [FRAMES]
"""

from __future__ import annotations

import sys
from collections import Counter

from crosscheck.answer import Answer
from tests.agreement import apart, hear, must_speak
from tests.test_agreement import SEEDS

OPINIONS = ("slope-deflection", "moment-distribution", "library")


def count(frames: int) -> tuple[Counter[str], dict[str, Counter[str]], dict[str, tuple[float, int]]]:
    """Frames with each feature, frames spoken for by each opinion with each feature, and the largest difference of
    moment distribution and the library from slope-deflection with its seed."""
    there = Counter[str]()
    spoke = {name: Counter[str]() for name in OPINIONS}
    worst = dict.fromkeys(OPINIONS[1:], (0.0, -1))
    for seed in range(frames):
        heard = hear(seed)
        features = {*heard.features, "all frames"} | ({"library must speak"} if must_speak(heard) else set())
        there.update(features)
        for name, answer in heard.speaking.items():
            spoke[name].update(features)
            if name != OPINIONS[0] and isinstance(heard.slope_deflection, Answer):
                share = apart(heard.frame, heard.slope_deflection, answer, partial=name == "library")[0]
                worst[name] = max(worst[name], (share, seed))
    return there, spoke, worst


def main() -> None:
    there, spoke, worst = count(int(sys.argv[1]) if len(sys.argv) > 1 else SEEDS)
    print(f"{'feature':32}{'frames':>8}" + "".join(f"{name:>21}" for name in OPINIONS))
    for feature in sorted(there, key=lambda f: (f not in ("all frames", "library must speak"), f)):
        print(f"{feature:32}{there[feature]:>8}" + "".join(f"{spoke[name][feature]:>21}" for name in OPINIONS))
    for name, (share, seed) in worst.items():
        print(f"largest difference of {name} from slope-deflection: {share:.1e} of scale (seed {seed})")


if __name__ == "__main__":
    main()
