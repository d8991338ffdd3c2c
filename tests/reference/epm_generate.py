"""Levels of fourteen local form-factor models by a dense Hermitian solve (LAPACK through numpy).

Form factors: Cohen & Bergstresser, Phys. Rev. 141, 789 (1966), Table II, in Ry; lattice constants in angstrom, same
table. H(G,G') on all |k+G|^2 <= cut (2 pi/a)^2; V(G) = VS(G^2) cos(G.t) - i VA(G^2) sin(G.t), t = a/8 (1,1,1),
V(0) = 0. Energies in units of (2 pi/a)^2 (hbar^2/2m = 1) to all digits.

Writes epm_levels.json: {material: {"a", "form", "cuts": {cut: {point: [size, [ten lowest]]}}}}.
"""
import itertools
import json
import os

import numpy as np

RYDBERG_BOHR2 = 1.0  # Ry times bohr^2 is 1 in units of hbar^2/2m
BOHR = 0.529177210544  # angstrom, CODATA 2022

MODELS = {
    "Si": (5.43, [-0.21, 0.04, 0.08, 0, 0, 0]),
    "Ge": (5.66, [-0.23, 0.01, 0.06, 0, 0, 0]),
    "Sn": (6.49, [-0.20, 0.00, 0.04, 0, 0, 0]),
    "GaP": (5.44, [-0.22, 0.03, 0.07, 0.12, 0.07, 0.02]),
    "GaAs": (5.64, [-0.23, 0.01, 0.06, 0.07, 0.05, 0.01]),
    "AlSb": (6.13, [-0.21, 0.02, 0.06, 0.06, 0.04, 0.02]),
    "InP": (5.86, [-0.23, 0.01, 0.06, 0.07, 0.05, 0.01]),
    "GaSb": (6.12, [-0.22, 0.00, 0.05, 0.06, 0.05, 0.01]),
    "InAs": (6.04, [-0.22, 0.00, 0.05, 0.08, 0.05, 0.03]),
    "InSb": (6.48, [-0.20, 0.00, 0.04, 0.06, 0.05, 0.01]),
    "ZnS": (5.41, [-0.22, 0.03, 0.07, 0.24, 0.14, 0.04]),
    "ZnSe": (5.65, [-0.23, 0.01, 0.06, 0.18, 0.12, 0.03]),
    "ZnTe": (6.07, [-0.22, 0.00, 0.05, 0.13, 0.10, 0.01]),
    "CdTe": (6.41, [-0.20, 0.00, 0.04, 0.15, 0.09, 0.04]),
}
POINTS = {"G": (0, 0, 0), "X": (1, 0, 0), "L": (0.5, 0.5, 0.5), "K": (0.75, 0.75, 0), "W": (1, 0.5, 0)}
CUTS = (11, 16, 21, 30, 50, 80)


def fcc_waves(k, cut):
    reach = int(np.ceil(np.sqrt(cut))) + 2
    grid = range(-reach, reach + 1)
    waves = [g for g in itertools.product(grid, grid, grid) if len({x % 2 for x in g}) == 1]
    waves = np.array(waves, dtype=float)
    square = ((waves + np.array(k)) ** 2).sum(axis=1)
    return waves[square <= cut * (1 + 1e-9)]


def hamiltonian(k, cut, a, form):
    waves = fcc_waves(k, cut)
    unit = (2 * np.pi / (a / BOHR)) ** 2 * RYDBERG_BOHR2
    d = waves[:, None, :] - waves[None, :, :]
    square = np.rint((d**2).sum(axis=2)).astype(int)
    symmetric = np.zeros(square.shape)
    antisymmetric = np.zeros(square.shape)
    for q, vs in zip((3, 8, 11), form[:3]):
        symmetric[square == q] = vs / unit
    for q, va in zip((3, 4, 11), form[3:]):
        antisymmetric[square == q] = va / unit
    turn = np.pi / 4 * d.sum(axis=2)
    h = symmetric * np.cos(turn) - 1j * antisymmetric * np.sin(turn)
    h += np.diag(((waves + np.array(k)) ** 2).sum(axis=1))
    return h


def main():
    rows = {}
    for name, (a, form) in MODELS.items():
        cuts = {}
        for cut in CUTS:
            cuts[cut] = {}
            for point, k in POINTS.items():
                h = hamiltonian(k, cut, a, form)
                cuts[cut][point] = [len(h), [float(x) for x in np.linalg.eigvalsh(h)[:10]]]
        rows[name] = {"a": a, "form": form, "cuts": cuts}
    out = os.path.join(os.path.dirname(os.path.abspath(__file__)), "epm_levels.json")
    with open(out, "w") as file:
        json.dump(rows, file, indent=0)
        file.write("\n")


if __name__ == "__main__":
    main()
