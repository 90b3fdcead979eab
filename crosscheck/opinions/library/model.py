"""Feeding the library: the divided frame as anastruct members, supports and loads, one solve, its vectors read back.

anastruct (R. Vink and contributors, licence GPL-3.0) is fed only what it gets right. What is restated for it, each
restatement held to closed forms by the qualification:

* *Places.* It keeps coordinates in single precision, so its nodes stand on a vertical line, which settles only what
  joins what (and that a member runs as given); each member's length and angle are then set in full precision.
* *Connections.* Its own hinges keep the stiffness of a rigid far end and its springs are not symmetrical. A member
  whose ends turn with fixity factors g1, g2 (g = kL / (kL + 3EI): G. R. Monforton and T. S. Wu, J. Struct. Div. ASCE
  89 (ST6), 1963) behaves as four members side by side: rigid at both ends, hinged at the first, at the second, at both,
  which share its stiffness and its loads as 3 g1 g2 : 4 (1 - g1) g2 : 4 g1 (1 - g2) : 4 (1 - g1)(1 - g2). One that is
  hinged at one end is given three quarters of its EI.
* *Joints.* It takes every member as hinged where fewer than two are rigid, so two members without stiffness lie
  beside each member whose ends turn, and rigid ones are entered first.
* *Line loads.* It forms their end actions with end springs a million times stiffer than the member; the EI that it
  reads for that alone is reduced, which makes the springs stiff enough for full precision.
* *Supports.* A translational spring is a member without bending stiffness to a fixed node. A force on a joint whose
  held direction is turned, which it refuses, comes in through a free stub that points along the force.
* *Freedoms that nothing resists* are held; nothing acts there.
"""

from __future__ import annotations

import math
from collections.abc import Iterable
from dataclasses import dataclass
from typing import Any

import numpy as np

from crosscheck.frame.model import FREE, HELD, Floats, Frame
from crosscheck.opinions.library.deferred import drawing_deferred
from crosscheck.opinions.library.mesh import Mesh

STIFFER = 1e-8
"""Factor on the EI that only its line-load springs read: they become 1e14 times stiffer than the member."""
HINGED = ((), (1,), (2,), (1, 2))
"""Which ends are hinged in the four members that stand for one whose ends turn."""
HINGE_FACTOR = (1.0, 0.75, 0.75, 1.0)
"""On EI: 3EI/L where the far end is hinged, for which the library takes 4EI/L."""


class Unfit(Exception):
    """The library did something other than what it was qualified for."""


@dataclass(frozen=True, slots=True)
class Strip:
    """One of its members: between two of our nodes, with share `share` of what piece `piece` carries (-1: of none).

    length, angle (radians, counter-clockwise from x), EA, EI as it shall use them; hinges: 1 its start, 2 its end;
    is_load: it only brings a load to its start.
    """

    start: int
    end: int
    length: float
    angle: float
    EA: float
    EI: float
    hinges: tuple[int, ...] = ()
    piece: int = -1
    share: float = 0.0
    is_load: bool = False


@dataclass(frozen=True, slots=True)
class Vectors:
    """What one solve gives.

    pieces: (places, 2, 3) actions on the piece that starts at a place, at its start and end: along its x, along its y,
    clockwise. nodes: (nodes, 3) dx, dy (global), clockwise rotation. taken: (nodes, 3) what all its members and springs
    take from each node: global fx, fy, clockwise couple; the load there, but for reactions and rounding.
    """

    pieces: Floats
    nodes: Floats
    taken: Floats


def solve(frame: Frame, mesh: Mesh, force: Floats, line: Floats, EI: Floats, EA: Floats) -> Vectors:
    """One solve on a fresh system.

    force: (nodes, 3) global fx, fy, clockwise couple. line: (places, 2, 2) as in Laid. EI, EA: (m,) of each member.
    Raises Unfit where the library refuses, finds the system singular, or treats a joint as hinged on its own account.
    """
    try:
        return _Feeder(frame, mesh, force, line, EI, EA).vectors()
    except Unfit:
        raise
    except Exception as error:  # whatever a foreign library may throw: it costs its own word, never ours
        raise Unfit(f"it stopped with {type(error).__name__}: {error}") from error


def fixity_shares(EI: float, length: float, turn: tuple[float, float]) -> list[float]:
    """Shares of the four members (HINGED) that stand for one whose end connections have stiffness `turn`; sum 1."""
    g1, g2 = (1.0 - 3.0 * EI / (3.0 * EI + k * length) for k in turn)
    parts = (3.0 * g1 * g2, 4.0 * (1.0 - g1) * g2, 4.0 * g1 * (1.0 - g2), 4.0 * (1.0 - g1) * (1.0 - g2))
    return [part / sum(parts) for part in parts]


class _Feeder:
    """Builds one system. Node numbers are ours; `ids` gives the library's."""

    def __init__(self, frame: Frame, mesh: Mesh, force: Floats, line: Floats, EI: Floats, EA: Floats) -> None:
        with drawing_deferred():
            from anastruct.fem.system import SystemElements
            from anastruct.vertex import Vertex

        self.frame, self.mesh, self.line, self.EI, self.EA = frame, mesh, line, EI, EA
        self.force: dict[int, Floats] = dict(enumerate(force.copy()))
        self.system: Any = SystemElements()
        self.vertex: Any = Vertex
        self.ids: dict[int, int] = {}
        self.nodes = mesh.nodes
        self.turned: dict[int, float] = {}
        self.fixed: list[int] = []
        t, s = frame.member_table, frame.support_table
        self.angle = np.arctan2(t.sin, t.cos)
        self.stiffness = _held_where_nothing_resists(frame)
        self.support_angle = np.arctan2(s.sin, s.cos)

    def vectors(self) -> Vectors:
        strips = [*self._pieces(), *self._springs(), *self._stubs(), *self._lonely()]
        strips.sort(key=lambda strip: len(strip.hinges))
        elements = [self._enter(strip) for strip in strips]
        if self.system.internal_hinges:
            raise Unfit("it took a joint as hinged that is not")
        self._hold()
        self._load(strips, elements)
        self.system.solve(naked=True)
        return self._read(strips, elements)

    # --- members ---

    def _pieces(self) -> Iterable[Strip]:
        mesh, t = self.mesh, self.frame.member_table
        for p in mesh.pieces.tolist():
            m = int(mesh.member[p])
            length = float(mesh.x[p + 1] - mesh.x[p])
            turn = (
                float(t.turn[m, 0]) if p == mesh.first[m] else HELD,
                float(t.turn[m, 1]) if p + 2 == mesh.first[m + 1] else HELD,
            )
            where = int(mesh.node[p]), int(mesh.node[p + 1]), length, float(self.angle[m])
            yield from _side_by_side(where, float(self.EA[m]), float(self.EI[m]), turn, p)

    def _springs(self) -> Iterable[Strip]:
        """Each translational spring as a member of length 1 with EA = k to a node of its own, which is fixed."""
        for j, axis in np.argwhere((self.stiffness[:, :2] != FREE) & (self.stiffness[:, :2] != HELD)).tolist():
            self.fixed.append(self._new_node())
            angle = float(self.support_angle[j]) + axis * math.pi / 2
            yield Strip(j, self.fixed[-1], 1.0, angle, float(self.stiffness[j, axis]), 0.0)

    def _stubs(self) -> Iterable[Strip]:
        """For each force on a joint with a turned roller: a free member along it; the force moves to its far end."""
        length = float(np.median(self.frame.member_table.length))
        EI = float(np.median(self.EI))
        for j in range(len(self.frame.joints)):
            fx, fy, _ = self.force[j].tolist()
            if self._roller(j) is None or not (fx or fy):
                continue
            end = self._new_node()
            self.force[end] = np.array([fx, fy, 0.0])
            self.force[j][:2] = 0.0
            yield Strip(j, end, length, math.atan2(fy, fx), 1e3 * EI / length**2, EI, is_load=True)

    def _lonely(self) -> Iterable[Strip]:
        """A joint that nothing joins exists for the library only with a member: one without stiffness."""
        joined = np.zeros(len(self.frame.joints), dtype=bool)
        joined[self.frame.member_table.ends.ravel()] = True
        for j in np.flatnonzero(~joined).tolist():
            self.fixed.append(self._new_node())
            yield Strip(j, self.fixed[-1], 1.0, 0.0, 0.0, 0.0)

    def _new_node(self) -> int:
        self.nodes += 1
        return self.nodes - 1

    def _enter(self, strip: Strip) -> Any:
        for node in (strip.start, strip.end):
            self.ids.setdefault(node, len(self.ids) + 1)
        where = [self.vertex(0.0, float(node)) for node in (strip.start, strip.end)]
        number = self.system.add_element(where, EA=strip.EA, EI=strip.EI, spring=dict.fromkeys(strip.hinges, 0))
        element = self.system.element_map[number]
        element.l = strip.length
        element.angle = element.a1 = element.a2 = strip.angle
        element.compile_kinematic_matrix()
        element.compile_constitutive_matrix()
        element.compile_stiffness_matrix()
        return element

    # --- supports ---

    def _roller(self, j: int) -> float | None:
        """Free direction (degrees) where exactly one direction of translation is held, and not square to the axes."""
        held = self.stiffness[j, :2] == HELD
        s = self.frame.support_table
        if held.sum() != 1 or s.sin[j] == 0.0 or s.cos[j] == 0.0:
            return None
        return math.degrees(self.support_angle[j]) + (90.0 if held[0] else 0.0)

    def _hold(self) -> None:
        system, ids = self.system, self.ids
        system.add_support_fixed([ids[node] for node in self.fixed])
        for j in np.flatnonzero((self.stiffness != FREE).any(axis=1)).tolist():
            self._hold_translation(j)
            turn = float(self.stiffness[j, 2])
            if turn == HELD:
                system.add_support_rotational(ids[j])
            elif turn != FREE:
                system.add_support_spring(ids[j], 3, turn, roll=True)

    def _hold_translation(self, j: int) -> None:
        held = self.stiffness[j, :2] == HELD
        slope = self._roller(j)
        if held.all():
            self.system.add_support_hinged(self.ids[j])
        elif slope is not None:
            self.turned[j] = math.radians(slope)
            self.system.add_support_roll(self.ids[j], "x", angle=slope)
        elif held.any():
            along_x = held[0] == (self.frame.support_table.sin[j] == 0.0)
            self.system.add_support_roll(self.ids[j], "y" if along_x else "x")

    # --- loads ---

    def _load(self, strips: list[Strip], elements: list[Any]) -> None:
        for node, force in self.force.items():
            fx, fy, couple = force.tolist()
            if fx or fy:
                self.system.point_load(self.ids[node], Fx=fx, Fy=fy)
            if couple:
                self.system.moment_load(self.ids[node], Tz=-couple)
        for strip, element in zip(strips, elements, strict=True):
            if strip.share and self.line[strip.piece].any():
                along, across = (strip.share * self.line[strip.piece]).T.tolist()
                self.system.q_load(across, element.id, direction="element", q_perp=along)
                element.EI *= STIFFER

    # --- results ---

    def _read(self, strips: list[Strip], elements: list[Any]) -> Vectors:
        pieces, taken = np.zeros((len(self.mesh.x), 2, 3)), np.zeros((self.nodes, 3))
        for strip, element in zip(strips, elements, strict=True):
            raw = np.asarray(element.element_force_vector + element.element_primary_force_vector)
            both = np.array([_local(raw[:3], element.a1), _local(raw[3:], element.a2)])
            if strip.piece >= 0:
                pieces[strip.piece] += both
            if not strip.is_load:
                taken[[strip.start, strip.end]] += to_global(both, math.cos(strip.angle), math.sin(strip.angle))
        moved = self._displacements()
        turn = self.stiffness[:, 2]
        sprung = np.flatnonzero((turn != FREE) & (turn != HELD))
        taken[sprung, 2] += turn[sprung] * moved[sprung, 2]
        if not (np.isfinite(pieces).all() and np.isfinite(moved).all()):
            raise Unfit("it gave values that are no numbers")
        return Vectors(pieces, moved, taken[: self.mesh.nodes])

    def _displacements(self) -> Floats:
        raw = np.asarray(self.system.system_displacement_vector, dtype=float).reshape(-1, 3)
        ids = np.array([self.ids[node] for node in range(self.mesh.nodes)]) - 1
        # Its y points down; its positive rotation is counter-clockwise.
        moved: Floats = raw[ids] * [1.0, -1.0, -1.0]
        for node, angle in self.turned.items():
            x, y = moved[node, :2]
            moved[node, 0] = x * math.cos(angle) - y * math.sin(angle)
            moved[node, 1] = x * math.sin(angle) + y * math.cos(angle)
        return moved


def to_global(action: Floats, cos: Floats | float, sin: Floats | float) -> Floats:
    """(n, 3) along, across, clockwise of members of direction (cos, sin) as global fx, fy, clockwise."""
    along, across, couple = action.T
    return np.column_stack([along * cos - across * sin, along * sin + across * cos, couple])


def _side_by_side(
    where: tuple[int, int, float, float], EA: float, EI: float, turn: tuple[float, float], piece: int
) -> Iterable[Strip]:
    """The strips of one piece. where: start and end node, length, angle; turn: stiffness of its end connections."""
    if turn == (HELD, HELD):
        yield Strip(*where, EA, EI, (), piece, 1.0)
        return
    yield from (Strip(*where, 0.0, 0.0),) * 2
    for hinges, factor, share in zip(HINGED, HINGE_FACTOR, fixity_shares(EI, where[2], turn), strict=True):
        if share:
            yield Strip(*where, share * EA, share * factor * EI, hinges, piece, share)


def _held_where_nothing_resists(frame: Frame) -> Floats:
    """(j, 3) support stiffness, HELD in place of FREE at joints that nothing joins and for the turning of joints where
    every end is hinged: an equation the library could not solve, on which nothing acts."""
    t = frame.member_table
    joined = np.zeros(len(frame.joints), dtype=bool)
    joined[t.ends.ravel()] = True
    gripped = np.zeros(len(frame.joints), dtype=bool)
    gripped[t.ends[t.turn != FREE]] = True
    loose = np.column_stack([~joined, ~joined, ~gripped])
    stiffness = frame.support_table.stiffness
    return np.where(loose & (stiffness == FREE), HELD, stiffness)


def _local(raw: Floats, angle: float) -> Floats:
    """Along, across and clockwise from its own vector (x right, y down, counter-clockwise); `angle` of the member in
    its node's axes, which a turned roller turns."""
    cos, sin = math.cos(angle), math.sin(angle)
    fx, fy, turn = float(raw[0]), -float(raw[1]), float(raw[2])
    return np.array([fx * cos + fy * sin, fy * cos - fx * sin, -turn])
