"""The moment-distribution opinion: release and carry over, sway by holding the joints (H. Cross 1932).

    pieces        the loads of a case cut into pieces, and statics along them
    members       stiffness, carry-over and fixed-end moments by moment-area and Gauss's rule
    sways         the independent sways, from geometry
    distribution  release and carry over
    holding       holding forces and sway corrections, repeated until joints and sways balance
    opinion       the answer; spans, values along the members; working, tables to follow by hand

Shares no mechanics with the other opinions: formulas that stand there too are meant to stand twice.
"""

from crosscheck.opinions.moment_distribution.opinion import opine
from crosscheck.opinions.moment_distribution.process import NAME
from crosscheck.opinions.moment_distribution.working import working

__all__ = ["NAME", "opine", "working"]
