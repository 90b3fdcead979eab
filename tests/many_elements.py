"""Second order by many short elements: the tests' own check, made of nothing that the opinions are made of.

Every flexible part is cut at its loads and between them, into `parts` elements or more; an element has the cubic of
first order (with shear strain, J. S. Przemieniecki, "Theory of Matrix Structural Analysis", 1968, sections 5.6 and 15.2)
and the consistent geometric matrix of its own, varying axial force. All unknowns are in one dense matrix; nothing is
condensed. The axial forces are put in again until they stay. Its error falls with the fourth power of the elements'
length, with shear strain the second (the strain is constant in an element).

Stepped and tapered members are cut at their pieces too, and their elements integrate the varying stiffness with the same
cubic: still the fourth power. Ties are held like supports. One-way parts are not for this: the frame is taken as it is.

Unknowns: dx, dy and counter-clockwise turn of every joint; for every member the turns of the faces behind hinges and
springs, and y and turn (local) of the places within.
"""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np
from scipy.linalg import eigh

from crosscheck.frame.kinematics import tied
from crosscheck.frame.loads import LoadTable, load_table
from crosscheck.frame.model import HELD, Floats, Frame

X3, W3 = np.polynomial.legendre.leggauss(4)
GAUSS, SHARE = (X3 + 1) / 2, W3 / 2


@dataclass
class Line:
    """One member's rows: `maps` (n, unknowns) gives y and turn of its places (2 each) from all unknowns; x of places;
    bending matrix and loads on its places; rows and stiffness of its end springs."""

    x: Floats
    maps: Floats
    stiffness: Floats
    load: Floats
    springs: list[tuple[Floats, float]] = field(default_factory=list)


class ManyElements:
    """One case of a frame, or many times it: `joints` (j, 3) and `ends` (m, 2, 3) as in CaseAnswer, and `critical`."""

    def __init__(self, frame: Frame, name: str, parts: int, tolerance: float = 1e-12) -> None:
        self.frame, self.parts, self.t = frame, parts, frame.member_table
        self.loads = load_table(frame, name)
        self._number()
        self.lines = [self._line(k) for k in range(len(frame.members))]
        self._assemble()
        self.first = self.solve(np.zeros(len(frame.members)), 0.0)[1]
        self.tolerance = tolerance

    # --- unknowns ----------------------------------------------------------------------------------

    def _breaks(self, k: int) -> Floats:
        t, loads = self.t, self.loads
        low, high = t.zone[k, 0], t.length[k] - t.zone[k, 1]
        marks = np.concatenate([
            [low, high], loads.point_at[loads.point_member == k],
            loads.line_start[loads.line_member == k], loads.line_end[loads.line_member == k],
            self.frame.variation.end[self.frame.variation.member == k],
        ])  # fmt: skip
        marks = np.sort(marks[(marks >= low) & (marks <= high)])
        marks = marks[np.append(True, np.diff(marks) > 1e-7 * t.length[k])]
        # Cuts of their own between any two loads: one hard by a load would make an element so short that its stiffness
        # drowns the others', and where loads act along a member the axial force is in a short part of it alone.
        cuts = np.ceil(self.parts * np.sqrt(np.diff(marks) / (high - low))).astype(np.int64)
        inner = [np.linspace(a, b, n + 1)[:-1] for a, b, n in zip(marks[:-1], marks[1:], cuts, strict=True)]
        return np.concatenate([*inner, marks[-1:]])

    def _number(self) -> None:
        self.places = [self._breaks(k) for k in range(len(self.t.length))]
        self.base = []
        count = 3 * len(self.frame.joints)
        for x in self.places:
            self.base.append(count)
            count += 2 + 2 * (len(x) - 2)
        self.count = count

    def _joint_rows(self, k: int, end: int) -> tuple[Floats, Floats, Floats]:
        """Rows that give a joint's displacement along local x and y, and its turn."""
        j, c, s = 3 * self.t.ends[k, end], self.t.cos[k], self.t.sin[k]
        u, v, turn = np.zeros((3, self.count))
        u[j], u[j + 1], v[j], v[j + 1], turn[j + 2] = c, s, -s, c, 1.0
        return u, v, turn

    def _line(self, k: int) -> Line:
        t, x = self.t, self.places[k]
        n, EI = len(x), t.E[k] * t.I[k]
        maps = np.zeros((2 * n, self.count))
        line = Line(x, maps, np.zeros((2 * n, 2 * n)), np.zeros(2 * n))
        for end, place, sign in ((0, 0, 1.0), (1, n - 1, -1.0)):
            _, v, turn = self._joint_rows(k, end)
            maps[2 * place] = v + sign * t.zone[k, end] * turn
            maps[2 * place + 1] = turn
            if t.turn[k, end] != HELD:
                own = np.zeros(self.count)
                own[self.base[k] + end] = 1.0
                maps[2 * place + 1] = own
                line.springs.append((own - turn, float(t.turn[k, end])))
        for i in range(1, n - 1):
            maps[2 * i, self.base[k] + 2 * i] = maps[2 * i + 1, self.base[k] + 2 * i + 1] = 1.0
        elastic = self.frame.analysis.shear == "elastic"
        for i, h in enumerate(np.diff(x)):
            at = slice(2 * i, 2 * i + 4)
            if t.varying[k]:
                line.stiffness[at, at] += self._varying_element(k, float(x[i]), h)
                continue
            phi = 12 * EI / (t.G[k] * t.shear_area[k] * h * h) if elastic else 0.0
            line.stiffness[at, at] += EI / (h**3 * (1 + phi)) * np.array([
                [12, 6 * h, -12, 6 * h], [6 * h, (4 + phi) * h * h, -6 * h, (2 - phi) * h * h],
                [-12, -6 * h, 12, -6 * h], [6 * h, (2 - phi) * h * h, -6 * h, (4 + phi) * h * h],
            ])  # fmt: skip
        self._line_loads(k, line)
        return line

    def _sections(self, k: int, x: Floats) -> tuple[Floats, Floats, Floats, Floats]:
        """E I, G times shear area, E A and depth at places x (n,) of one element of a member."""
        t, v = self.t, self.frame.variation
        if t.varying[k]:
            rows = np.flatnonzero(v.member == k)
            row = rows[int(np.searchsorted(v.end[rows], x.mean()))]
            I, A, shear_area, depth = (of[0] for of in v.at(np.array([row]), x[None]))  # noqa: E741
        else:
            I, A, shear_area, depth = (np.full_like(x, of[k]) for of in (t.I, t.A, t.shear_area, t.depth))  # noqa: E741
        return t.E[k] * I, t.G[k] * shear_area, t.E[k] * A, depth

    def _phi(self, k: int, a: float, h: float) -> float:
        """Shear to bending stiffness of the element from a to a + h, by the section at its middle."""
        if self.frame.analysis.shear != "elastic":
            return 0.0
        EI, GA, _, _ = self._sections(k, np.array([a + h / 2]))
        return float(12 * EI[0] / (GA[0] * h * h))

    def _curvature(self, phi: float, h: float) -> Floats:
        """(4, g) curvature at Gauss's points of an element."""
        z = GAUSS
        return np.array([-6 + 12 * z, h * (6 * z - 4 - phi), 6 - 12 * z, h * (6 * z - 2 + phi)]) / (h * h * (1 + phi))

    def _varying_element(self, k: int, a: float, h: float) -> Floats:
        phi, (EI, GA, _, _) = self._phi(k, a, h), self._sections(k, a + GAUSS * h)
        bent = self._curvature(phi, h)
        matrix = (bent * EI * SHARE * h) @ bent.T
        if phi:
            sheared = phi / (2 * (1 + phi)) * np.array([2 / h, 1.0, -2 / h, 1.0])
            matrix += GA @ SHARE * h * np.outer(sheared, sheared)
        return np.asarray(matrix)

    def _shapes(self, k: int, a: float, h: float) -> tuple[Floats, Floats]:
        """(4, g) displacement and its slope at Gauss's points of the element from a to a + h."""
        z, phi = GAUSS, self._phi(k, a, h)
        y = [
            1 + phi - phi * z - 3 * z**2 + 2 * z**3, h * ((1 + phi / 2) * z - (2 + phi / 2) * z**2 + z**3),
            phi * z + 3 * z**2 - 2 * z**3, h * (-phi / 2 * z + (phi / 2 - 1) * z**2 + z**3),
        ]  # fmt: skip
        slope = [
            (-phi - 6 * z + 6 * z**2) / h, 1 + phi / 2 - (4 + phi) * z + 3 * z**2,
            (phi + 6 * z - 6 * z**2) / h, -phi / 2 + (phi - 2) * z + 3 * z**2,
        ]  # fmt: skip
        return np.array(y) / (1 + phi), np.array(slope) / (1 + phi)

    def _line_loads(self, k: int, line: Line) -> None:
        loads, x = self.loads, line.x
        for i, h in enumerate(np.diff(x)):
            at = x[i] + GAUSS * h
            push = _intensity(loads, k, at, loads.line_across) * SHARE * h
            line.load[2 * i : 2 * i + 4] += self._shapes(k, float(x[i]), h)[0] @ push
        for p in np.flatnonzero(loads.point_member == k):
            i = int(np.argmin(np.abs(x - loads.point_at[p])))
            if abs(x[i] - loads.point_at[p]) < 1e-6 * self.t.length[k]:
                line.load[2 * i] += loads.point_across[p]
                line.load[2 * i + 1] -= loads.point_couple[p]
        if loads.difference[k] and self.t.varying[k]:
            for i, h in enumerate(np.diff(x)):
                EI, _, _, depth = self._sections(k, x[i] + GAUSS * h)
                bend = EI * self.t.alpha[k] * loads.difference[k] / depth * SHARE * h
                line.load[2 * i : 2 * i + 4] += self._curvature(self._phi(k, float(x[i]), h), h) @ bend
        elif loads.difference[k]:
            bend = self.t.E[k] * self.t.I[k] * self.t.alpha[k] * loads.difference[k] / self.t.depth[k]
            line.load[1] -= bend
            line.load[-1] += bend

    def _zone_loads(self, k: int, right: Floats) -> None:
        """Loads on rigid zones, on the joints' own unknowns."""
        t, loads, length = self.t, self.loads, self.t.length[k]
        for end, (low, high) in enumerate(((0.0, t.zone[k, 0]), (length - t.zone[k, 1], length))):
            _, v, turn = self._joint_rows(k, end)
            origin = length * end
            for q in np.flatnonzero(loads.line_member == k):
                a, b = max(low, loads.line_start[q]), min(high, loads.line_end[q])
                if b > a:
                    at = a + GAUSS * (b - a)
                    one = _one_intensity(loads, q, at, loads.line_across) * SHARE * (b - a)
                    right += v * one.sum() + turn * (one * (at - origin)).sum()
            for p in np.flatnonzero(loads.point_member == k):
                x = loads.point_at[p]
                within = x < low + t.zone[k, 0] if end == 0 else x > low
                if within:
                    right += loads.point_across[p] * (v + turn * (x - origin)) - loads.point_couple[p] * turn

    # --- the whole ---------------------------------------------------------------------------------

    def _assemble(self) -> None:
        t, loads = self.t, self.loads
        self.matrix, self.right = np.zeros((self.count, self.count)), np.zeros(self.count)
        for k, line in enumerate(self.lines):
            self.matrix += line.maps.T @ line.stiffness @ line.maps
            self.right += line.maps.T @ line.load
            for row, spring in line.springs:
                self.matrix += spring * np.outer(row, row)
            self._zone_loads(k, self.right)
        for j, (fx, fy, couple) in enumerate(loads.joint):
            self.right[3 * j : 3 * j + 3] += (fx, fy, -couple)
        self.stretch = np.array([self._joint_rows(k, 1)[0] - self._joint_rows(k, 0)[0] for k in range(len(t.length))])
        self.along = np.array([_along(loads, k, np.array([t.length[k]]), True)[0] for k in range(len(t.length))])
        for k in range(len(t.length)):
            self.right += self.along[k] * self._joint_rows(k, 1)[0]
        self._supports()
        self.longer = np.array([self._longer(k) for k in range(len(t.length))])
        self.spring = np.array([0.0 if t.rigid[k] else 1.0 / self._axial(k) for k in range(len(t.length))])
        rigid = self.stretch[t.rigid]
        self.matrix += self.stretch.T @ (self.spring[:, None] * self.stretch)
        self.right += self.stretch.T @ (self.spring * self.longer)
        held = np.array(self.held).reshape(-1, self.count)
        loose = [np.eye(self.count)[i] for i in np.flatnonzero(np.abs(self.matrix).sum(axis=0) == 0)]
        # Turns and places that nothing uses, faces without a connection among them.
        loose = [r for r in loose if not np.any(held @ r) and not np.any(rigid @ r)]
        self.fixed = np.vstack([held, *[r[None] for r in loose]])
        self.fixed_value = np.append(np.array(self.held_value), np.zeros(len(loose)))
        self.fixed = np.vstack([self.fixed, rigid])
        self.fixed_value = np.append(self.fixed_value, self.longer[t.rigid])
        _, values, right = np.linalg.svd(self.fixed)
        rank = int(np.sum(values > 1e-9 * values[0]))
        self.free = right[rank:].T
        self.particular = np.linalg.lstsq(self.fixed, self.fixed_value, rcond=1e-10)[0]

    def _supports(self) -> None:
        s, self.held, self.held_value = self.frame.support_table, [], []
        for j in range(len(self.frame.joints)):
            rows = np.zeros((3, self.count))
            rows[0, 3 * j], rows[0, 3 * j + 1] = s.cos[j], s.sin[j]
            rows[1, 3 * j], rows[1, 3 * j + 1] = -s.sin[j], s.cos[j]
            rows[2, 3 * j + 2] = -1.0
            for row, stiffness, moved in zip(rows, s.stiffness[j], self.loads.settlement[j], strict=True):
                if stiffness == HELD:
                    self.held.append(row)
                    self.held_value.append(moved)
                elif stiffness:
                    self.matrix += stiffness * np.outer(row, row)
                    self.right += stiffness * moved * row
        for row in tied(self.frame).toarray():
            self.held.append(np.append(row, np.zeros(self.count - len(row))))
            self.held_value.append(0.0)

    def _axial(self, k: int) -> float:
        """Elongation under a unit of axial force."""
        t, x = self.t, self.lines[k].x
        if not t.varying[k]:
            return float(t.clear[k] / (t.E[k] * t.A[k]))
        parts = zip(x[:-1], np.diff(x), strict=True)
        return float(sum((SHARE / self._sections(k, a + GAUSS * h)[2]).sum() * h for a, h in parts))

    def _longer(self, k: int) -> float:
        """Lengthening without axial force at the `from` end."""
        t, loads = self.t, self.loads
        longer = float(loads.misfit[k])
        if loads.mean[k]:
            longer += t.alpha[k] * loads.mean[k] * t.clear[k]
        if not t.rigid[k]:
            for a, b in zip(self.lines[k].x[:-1], self.lines[k].x[1:], strict=True):
                at = a + GAUSS * (b - a)
                longer -= float(_along(loads, k, at) / self._sections(k, at)[2] @ SHARE) * (b - a)
        return longer

    def geometric(self, axial: Floats, scale: float) -> Floats:
        """The consistent geometric matrix of axial forces (m,) at the `from` ends and `scale` times the loads along."""
        return np.asarray(sum(self._geometric(k, axial[k], scale) for k in range(len(self.lines))))

    def _geometric(self, k: int, axial: float, scale: float) -> Floats:
        """One member's share of it."""
        line = self.lines[k]
        own = np.zeros_like(line.stiffness)
        for i, h in enumerate(np.diff(line.x)):
            slope = self._shapes(k, float(line.x[i]), h)[1]
            pull = (axial - scale * _along(self.loads, k, line.x[i] + GAUSS * h)) * SHARE * h
            own[2 * i : 2 * i + 4, 2 * i : 2 * i + 4] += (slope * pull) @ slope.T
        matrix = line.maps.T @ own @ line.maps
        for end, (a, b) in enumerate(((0.0, line.x[0]), (line.x[-1], self.t.length[k]))):
            marks = np.unique(np.concatenate([[a, b], self._marks(k, a, b)]))
            turn = self._joint_rows(k, end)[2]
            for c, d in zip(marks[:-1], marks[1:], strict=True):
                pull = (axial - scale * _along(self.loads, k, c + GAUSS * (d - c))) @ SHARE * (d - c)
                matrix += pull * np.outer(turn, turn)
        return np.asarray(matrix)

    def _marks(self, k: int, a: float, b: float) -> Floats:
        loads = self.loads
        of = loads.line_member == k
        x = np.concatenate([loads.point_at[loads.point_member == k], loads.line_start[of], loads.line_end[of]])
        return x[(x > a) & (x < b)]

    def solve(self, axial: Floats, scale: float = 1.0) -> tuple[Floats, Floats]:
        """Displacements under axial forces taken as known, and the axial forces that they make."""
        z, matrix = self.free, self.matrix + self.geometric(axial, scale)
        moved = self.particular + z @ np.linalg.solve(z.T @ matrix @ z, z.T @ (self.right - matrix @ self.particular))
        pull = self.spring * (self.stretch @ moved - self.longer)
        if self.t.rigid.any():
            left = self.right - matrix @ moved
            forces = np.linalg.lstsq(self.fixed.T, left, rcond=1e-10)[0]
            pull[self.t.rigid] = forces[len(forces) - np.count_nonzero(self.t.rigid) :]
        return moved, pull

    def settle(self, most: int = 200) -> ManyElements:
        axial = self.first
        for _ in range(most):
            moved, found = self.solve(axial, 1.0)
            change = float(np.abs(found - axial).max())
            axial = found
            if change <= self.tolerance * np.abs(axial).max():
                break
        else:
            raise AssertionError("the axial forces do not stay")
        self.results(moved, axial)
        return self

    def results(self, moved: Floats, axial: Floats) -> None:
        t = self.t
        self.joints = moved[: 3 * len(self.frame.joints)].reshape(-1, 3) * [1.0, 1.0, -1.0]
        self.ends = np.zeros((len(t.length), 2, 3))
        self.ends[:, 0, 0], self.ends[:, 1, 0] = axial, axial - self.along
        for k in range(len(t.length)):
            self.ends[k, :, 1:] = self._end_actions(k, moved, axial)

    def _end_actions(self, k: int, moved: Floats, axial: Floats) -> Floats:
        """(2, 2) shear and clockwise moment at both joints: what the member's rows ask of its joints."""
        line = self.lines[k]
        own = line.maps.T @ (line.stiffness @ (line.maps @ moved) - line.load)
        for row, spring in line.springs:
            own += spring * row * (row @ moved)
        zone = np.zeros(self.count)
        self._zone_loads(k, zone)
        own += self._geometric(k, axial[k], 1.0) @ moved - zone
        found = np.zeros((2, 2))
        for end in (0, 1):
            j = 3 * self.t.ends[k, end]
            found[end] = -self.t.sin[k] * own[j] + self.t.cos[k] * own[j + 1], -own[j + 2]
        return found

    @property
    def critical(self) -> float:
        """The smallest positive factor on the first-order axial forces, those of loads along members with them, at
        which some movement meets no resistance; infinite where there is none."""
        z = self.free
        softening = -z.T @ self.geometric(self.first, 1.0) @ z
        values = eigh(softening, z.T @ self.matrix @ z, eigvals_only=True)
        return float(1 / values[-1]) if values[-1] > 0 else np.inf


def _one_intensity(loads: LoadTable, q: int, x: Floats, ends: Floats) -> Floats:
    share = (x - loads.line_start[q]) / (loads.line_end[q] - loads.line_start[q])
    inside = (x >= loads.line_start[q]) & (x <= loads.line_end[q])
    return np.where(inside, ends[q, 0] * (1 - share) + ends[q, 1] * share, 0.0)


def _intensity(loads: LoadTable, k: int, x: Floats, ends: Floats) -> Floats:
    found = np.zeros_like(x)
    for q in np.flatnonzero(loads.line_member == k):
        found += _one_intensity(loads, q, x, ends)
    return found


def _along(loads: LoadTable, k: int, x: Floats, whole: bool = False) -> Floats:
    """Sum of the loads along local x between the `from` end and x (one at x itself counts where `whole`)."""
    found = np.zeros_like(x)
    for q in np.flatnonzero(loads.line_member == k):
        a, b = loads.line_start[q], loads.line_end[q]
        p0, p1 = loads.line_along[q]
        s = np.clip(x - a, 0.0, b - a)
        found += p0 * s + (p1 - p0) * s * s / (2 * (b - a))
    for p in np.flatnonzero(loads.point_member == k):
        found += loads.point_along[p] * ((x > loads.point_at[p]) | whole)
    return found
