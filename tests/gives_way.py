"""How much of its load a frame of many elements can bear: the tests' own way along its balances, from no load on.

A balance is a share of the load and the axial forces that, put in as known, come out again. As the consistent geometric
matrix is linear in the axial forces, how the balance changes is known exactly; unit tangents of the curve of balances
are followed by Euler's steps, each put right at right angles (H. B. Keller 1977). The way ends where the load on it is
largest, or where the matrix under the axial forces is no longer positive definite.
"""

from __future__ import annotations

import numpy as np
from scipy.linalg import LinAlgError, cho_factor, cho_solve

from crosscheck.frame.model import Floats, Frame
from tests.many_elements import ManyElements

STEP, LEAST, CLOSE = 0.1, 2e-5, 2e-6


class Bearing:
    """The balances of one case of a frame."""

    def __init__(self, frame: Frame, name: str, parts: int) -> None:
        self.elements = e = ManyElements(frame, name, parts)
        # Unknowns in any units: each is measured by its own stiffness, and what is fixed by its own row.
        stiff = e.matrix.diagonal()
        even = 1 / np.sqrt(np.where(stiff > 1e-16 * stiff.max(), stiff, stiff.max()))
        own = 1 / np.linalg.norm(e.fixed * even, axis=1)
        held = own[:, None] * e.fixed * even
        back, m = np.linalg.pinv(held, rcond=1e-10), len(frame.members)
        _, values, turned = np.linalg.svd(held)
        self.free = z = even[:, None] * turned[int(np.sum(values > 1e-9)) :].T
        self.particular = even * (back @ (own * e.fixed_value))
        unit = np.eye(m)
        self.whole = np.array([*(e.geometric(unit[k], 0.0) for k in range(m)), e.geometric(np.zeros(m), 1.0)])
        self.stiff, self.more = z.T @ e.matrix @ z, z.T @ self.whole @ z
        self.load = z.T @ (e.right - e.matrix @ self.particular)
        self.held = (self.whole @ self.particular) @ z
        self.back = (own[:, None] * back.T * even)[-m:] if frame.analysis.axial == "rigid" else None
        self.size = float(max(np.abs(e.first).max(), 1e-9 * np.abs(e.right).max()))

    def came(self, x: Floats) -> tuple[Floats, Floats] | None:
        """What comes out less what was put in (m,), and how it changes with the axial forces and the load (m, m + 1); x
        holds axial forces as shares of the largest in first order, then the share of the load. None where unstable."""
        e, share = self.elements, x[-1]
        much = np.append(x[:-1] * self.size, share)
        try:
            factor = cho_factor(self.stiff + np.tensordot(much, self.more, 1))
        except LinAlgError:
            return None
        moved = self.particular + self.free @ cho_solve(factor, self.load - much @ self.held)
        pushed = self.whole @ moved
        change = -self.free @ cho_solve(factor, self.free.T @ pushed.T)
        if self.back is None:
            pull, by = e.spring * (e.stretch @ moved - e.longer), e.spring[:, None] * (e.stretch @ change)
        else:
            matrix = e.matrix + np.tensordot(much, self.whole, 1)
            pull, by = self.back @ (e.right - matrix @ moved), -self.back @ (pushed.T + matrix @ change)
        rows = share * by
        rows[:, -1] = (rows[:, -1] + pull) / self.size
        rows[:, :-1] -= np.eye(len(pull))
        return share * pull / self.size - x[:-1], rows

    def borne(self) -> tuple[float, Floats]:
        """The greatest share of the load, up to 1, and the axial forces (m,) that it comes with."""
        here, step = np.zeros(len(self.elements.first) + 1), STEP
        way = np.append(self.elements.first / self.size, 1.0)
        way /= np.linalg.norm(way)
        while step > LEAST:
            ahead = self._ahead(here, way, step)
            if ahead is None or ahead[1][-1] < 0.0:
                step /= 2
                continue
            if ahead[0][-1] >= 1.0:
                level = np.append(np.zeros(len(here) - 1), 1.0)
                whole = self._put_right(here + (ahead[0] - here) * (1 - here[-1]) / (ahead[0][-1] - here[-1]), level)
                if whole is not None:
                    return 1.0, whole[0][:-1] * self.size
                step /= 2
                continue
            here, way = ahead
        return float(here[-1]), here[:-1] * self.size

    def _ahead(self, here: Floats, way: Floats, step: float) -> tuple[Floats, Floats] | None:
        """The balance a step further and the unit tangent there; None where none is found near."""
        found = self._put_right(here + step * way, way)
        return None if found is None or np.linalg.norm(found[0] - here - step * way) > 0.5 * step else found

    def _put_right(self, x: Floats, way: Floats) -> tuple[Floats, Floats] | None:
        """The balance at right angles to `way` from x, and the unit tangent there."""
        for _ in range(8):
            found = self.came(x)
            if found is None:
                return None
            off, rows = found
            matrix = np.vstack([rows, way])
            if np.abs(off).max() < CLOSE:
                tangent = np.linalg.solve(matrix, np.append(np.zeros(len(off)), 1.0))
                return x, tangent / np.linalg.norm(tangent)
            x = x - np.linalg.solve(matrix, np.append(off, 0.0))
        return None
