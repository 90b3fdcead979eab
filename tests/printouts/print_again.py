"""How the printouts in this folder were made: three frames solved by other general-purpose libraries, printed with those
libraries' own means and with pandas, numpy and tabulate, as somebody who uses them would.

Not run by the tests, and none of these is a dependency. In an environment of its own:

    pip install PyNiteFEA==3.2.0 calfem-python-small==3.6.5 pandas prettytable
    python print_again.py

The frames are read from the TOML files beside this one and not by crosscheck. Only loads on joints and uniform loads
"down" occur in them.
"""

from __future__ import annotations

import contextlib
import io
import math
import tomllib
from collections.abc import Callable
from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd

HERE = Path(__file__).parent
SUPPORTS = {"fixed": (1, 1, 1), "pinned": (1, 1, 0), "roller": (0, 1, 0)}
PER = {"GPa": {"kN m": 1e6, "N mm": 1e3}, "cm^4": {"kN m": 1e-8, "N mm": 1e4}, "cm^2": {"kN m": 1e-4, "N mm": 1e2}}


class Frame:
    """One of the frames in plain numbers, in the units that its file names."""

    def __init__(self, name: str) -> None:
        data = tomllib.loads((HERE / f"{name}.toml").read_text(encoding="utf-8"))
        self.units: str = data["units"]
        self.joints = {j: (float(x), float(y)) for j, (x, y) in data["joints"].items()}
        self.members: dict[str, Any] = data["members"]
        self.supports = {j: SUPPORTS[word] for j, word in data["supports"].items()}
        self.E = self.size(next(iter(data["materials"].values()))["E"])
        self.sections = {n: (self.size(s["A"]), self.size(s["I"])) for n, s in data["sections"].items()}
        self.uniform: dict[str, float] = {}
        self.forces: dict[str, tuple[float, float]] = {}
        for entry in next(iter(data["loads"].values()))["apply"]:
            for member in entry.get("members", ()):
                self.uniform[member] = entry["uniform"]
            if "joint" in entry:
                fx = entry["force"] if entry["direction"] == "right" else 0.0
                self.forces[entry["joint"]] = (float(fx), 0.0 if fx else -float(entry["force"]))

    def size(self, value: Any) -> float:
        if not isinstance(value, str):
            return float(value)
        number, unit = value.split()
        return float(number) * PER[unit][self.units]

    def place(self, member: str) -> tuple[tuple[float, float], tuple[float, float]]:
        m = self.members[member]
        return self.joints[m["from"]], self.joints[m["to"]]

    def properties(self, member: str) -> tuple[float, float]:
        return self.sections[self.members[member]["section"]]

    def across_and_along(self, member: str) -> tuple[float, float]:
        """The uniform load "down" along local y and x."""
        (x0, y0), (x1, y1) = self.place(member)
        length, w = math.hypot(x1 - x0, y1 - y0), self.uniform.get(member, 0.0)
        return -w * (x1 - x0) / length, -w * (y1 - y0) / length


def said(show: Callable[[], None]) -> str:
    out = io.StringIO()
    with contextlib.redirect_stdout(out):
        show()
    return out.getvalue()


# --- calfem-python-small: its own displays of arrays


def calfem(frame: Frame) -> tuple[np.ndarray, np.ndarray, dict[str, tuple[np.ndarray, np.ndarray]]]:
    import calfem.core as cfc

    number = {j: n for n, j in enumerate(frame.joints)}
    dofs = 3 * len(number)
    K, f = np.zeros((dofs, dofs)), np.zeros((dofs, 1))
    known: dict[str, tuple[Any, ...]] = {}
    for name, m in frame.members.items():
        (x0, y0), (x1, y1) = frame.place(name)
        A, inertia = frame.properties(name)
        qy, qx = frame.across_and_along(name)
        ex, ey, ep, eq = np.array([x0, x1]), np.array([y0, y1]), [frame.E, A, inertia], [qx, qy]
        edof = np.array([3 * number[j] + k + 1 for j in (m["from"], m["to"]) for k in range(3)])
        Ke, fe = cfc.beam2e(ex, ey, ep, eq)
        K, f = cfc.assem(edof, K, Ke, f, fe)
        known[name] = (ex, ey, ep, eq, edof)
    for j, force in frame.forces.items():
        f[3 * number[j] : 3 * number[j] + 2, 0] += force
    held = np.array([3 * number[j] + k + 1 for j, flags in frame.supports.items() for k in range(3) if flags[k]])
    a, r = cfc.solveq(K, f, held)
    along = {}
    for name, (ex, ey, ep, eq, edof) in known.items():
        es, _, eci = cfc.beam2s(ex, ey, ep, cfc.extract_ed(edof, a), eq, 5)
        along[name] = np.asarray(eci), np.asarray(es)
    return np.asarray(a).reshape(-1, 3), np.asarray(r).reshape(-1, 3), along


def print_calfem(name: str) -> None:
    import calfem.utils as cfu

    frame = Frame(name)
    a, r, along = calfem(frame)
    numbers = np.arange(1, len(a) + 1)
    held = [k for k, j in enumerate(frame.joints) if j in frame.supports]

    def show() -> None:
        cfu.disp_h2("Displacements")
        cfu.disp_array(np.column_stack([numbers, a]), headers=["node", "ux", "uy", "rz"])
        cfu.disp_h2("Reactions")
        cfu.disp_array(np.column_stack([numbers, r])[held], headers=["node", "Rx", "Ry", "M"], fmt=".3f", tablefmt="simple")

    (HERE / f"{name}.calfem nodes.txt").write_text(said(show), encoding="utf-8")

    def sections() -> None:
        for member, (x, es) in along.items():
            cfu.disp_h2(f"Element {member}")
            cfu.disp_array(np.column_stack([x.ravel(), es]), headers=["x", "N", "V", "M"])

    (HERE / f"{name}.calfem elements.txt").write_text(said(sections), encoding="utf-8")


# --- PyNiteFEA: its results in pandas tables and a printed table


def pynite(frame: Frame) -> Any:
    from Pynite import FEModel3D

    model = FEModel3D()
    model.add_material("material", frame.E, frame.E / 2.6, 0.3, 0)
    for section, (A, inertia) in frame.sections.items():
        model.add_section(section, A, inertia, inertia, inertia)
    for j, (x, y) in frame.joints.items():
        model.add_node(f"N{j}", x, y, 0)
        held = frame.supports.get(j, (0, 0, 0))
        model.def_support(f"N{j}", bool(held[0]), bool(held[1]), True, True, True, bool(held[2]))
    for name, m in frame.members.items():
        model.add_member(f"M{name}", f"N{m['from']}", f"N{m['to']}", "material", m["section"])
    for name, w in frame.uniform.items():
        model.add_member_dist_load(f"M{name}", "FY", -w, -w)
    for j, force in frame.forces.items():
        for direction, value in zip(("FX", "FY"), force, strict=True):
            if value:
                model.add_node_load(f"N{j}", direction, value)
    model.analyze_linear(log=False)
    return model


def print_pynite(name: str) -> None:
    from prettytable import PrettyTable

    model, combo = pynite(Frame(name)), "Combo 1"
    nodes = pd.DataFrame(
        {n.name: {q: getattr(n, q)[combo] for q in ("DX", "DY", "RZ", "RxnFX", "RxnFY", "RxnMZ")}
         for n in model.nodes.values()}
    ).T  # fmt: skip
    (HERE / f"{name}.pynite nodes.txt").write_text(str(nodes) + "\n", encoding="utf-8")

    table = PrettyTable(["Member", "Node", "Axial", "Shear Fy", "Moment Mz"])
    table.float_format = ".3"
    for m in model.members.values():
        F = m.f(combo).ravel()
        table.add_row([m.name, m.i_node.name, float(F[0]), float(F[1]), float(F[5])])
        table.add_row([m.name, m.j_node.name, float(F[6]), float(F[7]), float(F[11])])
    (HERE / f"{name}.pynite end forces.txt").write_text(f"{table}\n", encoding="utf-8")

    most = pd.DataFrame([
        {"member": m.name, "max moment": m.max_moment("Mz", combo), "min moment": m.min_moment("Mz", combo),
         "max shear": m.max_shear("Fy", combo), "min shear": m.min_shear("Fy", combo),
         "max axial": m.max_axial(combo), "min axial": m.min_axial(combo)}
        for m in model.members.values()
    ])  # fmt: skip
    (HERE / f"{name}.pynite extremes.txt").write_text(most.to_markdown(index=False) + "\n", encoding="utf-8")
    rows = []
    for m in model.members.values():
        V, M, N = m.shear_array("Fy", 5, combo), m.moment_array("Mz", 5, combo), m.axial_array(5, combo)
        rows += [(m.name, V[0, k], N[1, k], V[1, k], M[1, k]) for k in range(5)]
    stations = pd.DataFrame(rows, columns=["Member", "x", "Axial", "Shear", "Moment"])
    (HERE / f"{name}.pynite stations.csv").write_text(stations.to_csv(index=False), encoding="utf-8")


if __name__ == "__main__":
    for which in ("bent", "beam", "storeys"):
        print_calfem(which)
        print_pynite(which)
