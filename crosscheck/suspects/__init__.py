"""What single mistake, or pair of them, would explain how a claim differs: hypotheses, best first, ties said.

Kinds and places are the README's. Every suspect can be applied (`Suspect.change`), so that its figures can be seen.
"""

from crosscheck.suspects.find import Findings, find, search
from crosscheck.suspects.suspect import Suspect

__all__ = ["Findings", "Suspect", "find", "search"]
