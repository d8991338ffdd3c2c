"""The gap above the fourth band of the fourteen models of epm_generate.py, sought over the whole zone.

A mesh of the irreducible wedge of fcc (0 <= kz <= ky <= kx <= 1, kx + ky + kz <= 3/2, in 2 pi/a) at cut-off 21; from its three
best points a simplex search (Nelder and Mead, scipy) in all three components at cut-off 30; at the end cut-off 80, along the
axis Gamma-X where the edge lies on it and moves, else where it stands. Energies in eV, k in 2 pi/a.

Writes epm_gaps.json: {material: {"gap", "top", "bottom"}}, the last two the points of the band edges.
"""
import json
import os

import numpy as np
from scipy.linalg import eigh
from scipy.optimize import minimize, minimize_scalar

from epm_generate import BOHR, MODELS, hamiltonian

RYDBERG_EV = 13.605693122990
SPECIAL = [(0, 0, 0), (1, 0, 0), (0.5, 0.5, 0.5)]


def level(k, cut, a, form, n):
    return eigh(hamiltonian(k, cut, a, form), eigvals_only=True, subset_by_index=[n, n])[0]


def edge(sign, n, a, form):
    """Point and energy of the least of sign * E_n."""
    steps = np.linspace(0, 1, 9)
    mesh = [(x, y, z) for x in steps for y in steps for z in steps if z <= y <= x and x + y + z <= 1.5 + 1e-9]
    values = [sign * level(k, 21, a, form, n) for k in mesh]
    best = []
    for start in np.argsort(values)[:3]:
        found = minimize(
            lambda k: sign * level(k, 30, a, form, n),
            mesh[start],
            method="Nelder-Mead",
            options={"xatol": 1e-4, "fatol": 1e-9, "initial_simplex": np.array(mesh[start]) + 0.06 * np.vstack([np.zeros(3), np.eye(3)])},
        )
        best.append((found.fun, found.x))
    _, k = min(best, key=lambda one: one[0])
    k = np.sort(np.abs(k))[::-1]
    for point in SPECIAL:
        if np.abs(k - point).max() < 3e-3:
            return list(point), level(point, 80, a, form, n)
    assert k[1] < 3e-3, k
    k[0] = min(k[0], 2 - k[0])  # (2, 0, 0) is a reciprocal vector
    around = minimize_scalar(
        lambda x: sign * level((x, 0, 0), 80, a, form, n), bounds=(k[0] - 0.03, min(k[0] + 0.03, 1)), method="bounded",
        options={"xatol": 1e-5},
    )
    return [float(around.x), 0, 0], sign * around.fun


def main():
    rows = {}
    for name, (a, form) in MODELS.items():
        unit = (2 * np.pi / (a / BOHR)) ** 2 * RYDBERG_EV
        top, valence = edge(-1, 3, a, form)
        bottom, conduction = edge(1, 4, a, form)
        rows[name] = {"gap": (conduction - valence) * unit, "top": top, "bottom": bottom}
        print(name, rows[name], flush=True)
    out = os.path.join(os.path.dirname(os.path.abspath(__file__)), "epm_gaps.json")
    with open(out, "w") as file:
        json.dump(rows, file, indent=0)
        file.write("\n")


if __name__ == "__main__":
    main()
