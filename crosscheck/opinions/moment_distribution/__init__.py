"""The moment-distribution opinion: release and carry over, sway by holding the joints (H. Cross 1932).

    pieces        the loads of a case cut into pieces, and statics along them
    varying       stepped and tapered members, cut into lengths for Gauss's rule
    members       stiffness, carry-over and fixed-end moments by moment-area and Gauss's rule
    sways         the independent sways, from geometry
    distribution  release and carry over
    holding       holding forces and sway corrections, repeated until joints and sways balance
    process       first order: the cases as columns of one process
    one_way       which one-way members and supports work in a case
    opinion       the answer; spans, values along the members; working, tables to follow by hand

and in second order

    stretches     the member under axial force: moment-area and Gauss's rule again, short stretches joined
    displaced     release and carry over one joint at a time, the axial forces taken as known
    critical      how far the axial forces can grow
    second_order  repeated until the axial forces settle; bent_spans, one_way_displaced, displaced_working as above

Shares no mechanics with the other opinions: formulas that stand there too are meant to stand twice.
"""

from crosscheck.opinions.moment_distribution.opinion import opine
from crosscheck.opinions.moment_distribution.process import NAME
from crosscheck.opinions.moment_distribution.second_order import critical_load_factor
from crosscheck.opinions.moment_distribution.working import working

__all__ = ["NAME", "critical_load_factor", "opine", "working"]
