"""Fermi level of nearly-free aluminium by dense LAPACK solves on uniform meshes; writes al_filling.json.

The potential of al_generate.py, solved at the wave vectors of the wedge x >= y >= z >= 0 of a mesh of M points along every
reciprocal vector, all levels linear in tetrahedra between mesh points, three levels filled by halves. What linear
tetrahedra leave is of second order in 1/M: M and 3M/4 are extrapolated, and held against 3M/4 and M/2 extrapolated. Energies in (2 pi/a)^2.

Rows: {"cut": plane waves up to there, "mesh": M, "level": extrapolated, "open": by how much the extrapolations differ}.
"""
import json
import os

import numpy as np
from scipy.optimize import brentq

from epm_generate import BOHR, fcc_waves

CUT, LEVELS, BANDS = 20.0, 1.5, 5
EDGE, V111, V200 = 4.05, 0.0179, 0.0562
RECIPROCAL = np.array([[-1, 1, 1], [1, -1, 1], [1, 1, -1]], dtype=float)


def hamiltonian(k, cut):
    unit = (2 * np.pi / (EDGE / BOHR)) ** 2
    waves = fcc_waves(k, cut)
    square = np.rint(((waves[:, None, :] - waves[None, :, :]) ** 2).sum(axis=2)).astype(int)
    h = np.where(square == 3, V111 / unit, 0) + np.where(square == 4, V200 / unit, 0)
    return h + np.diag(((waves + np.array(k)) ** 2).sum(axis=1))


def folded(size):
    """Cubic coordinates (twice, in 2 pi/a / size) of every mesh point, moved into the first zone and then into the wedge."""
    n = np.stack(np.meshgrid(*[np.arange(size)] * 3, indexing="ij"), axis=-1).reshape(-1, 3)
    k = np.rint(n @ RECIPROCAL).astype(int)
    best, square = k.copy(), np.full(len(k), np.iinfo(int).max)
    shifts = np.stack(np.meshgrid(*[[-2, -1, 0, 1, 2]] * 3, indexing="ij"), axis=-1).reshape(-1, 3)
    for shift in shifts:
        other = k + size * np.rint(shift @ RECIPROCAL).astype(int)
        length = (other**2).sum(axis=1)
        better = length < square
        best[better], square[better] = other[better], length[better]
    return np.sort(np.abs(best), axis=1)[:, ::-1]


def energies(size):
    wedge, of = np.unique(folded(size), axis=0, return_inverse=True)
    solved = np.array([np.linalg.eigvalsh(hamiltonian(k / size, CUT))[:BANDS] for k in wedge])
    return solved[of.ravel()].reshape(size, size, size, BANDS)


def tetrahedra(e):
    """Sorted corner energies of the six tetrahedra of every cell, cut along a shortest diagonal, b1 + b2 + b3."""
    found = []
    for order in ([0, 1, 2], [0, 2, 1], [1, 0, 2], [1, 2, 0], [2, 0, 1], [2, 1, 0]):
        corners, at = [e], e
        for axis in order:
            at = np.roll(at, -1, axis=axis)
            corners.append(at)
        found.append(np.sort(np.stack(corners, axis=-1), axis=-1).reshape(-1, 4))
    return np.concatenate(found)


def number(t, x):
    """Shares of tetrahedra below x (Bloechl, Jepsen & Andersen, Phys. Rev. B 49, 16223 (1994), appendix B)."""
    a, b, c, d = t.T
    with np.errstate(divide="ignore", invalid="ignore"):
        low = (x - a) ** 3 / ((b - a) * (c - a) * (d - a))
        high = 1 - (d - x) ** 3 / ((d - a) * (d - b) * (d - c))
        y = x - b
        bend = ((c - a) + (d - b)) / ((c - b) * (d - b))
        middle = ((b - a) ** 2 + 3 * (b - a) * y + 3 * y**2 - bend * y**3) / ((c - a) * (d - a))
    return np.where(x <= a, 0, np.where(x >= d, 1, np.where(x < b, low, np.where(x < c, middle, high)))).mean()


def level(size):
    e = energies(size)
    bands = [tetrahedra(e[..., b]) for b in range(BANDS)]
    return brentq(lambda x: sum(number(t, x) for t in bands) - LEVELS, 1.0, 1.6, xtol=1e-10)


if __name__ == "__main__":
    meshes = [36, 54, 72]
    found = [level(size) for size in meshes]
    pairs = [(found[j] * (m2 := meshes[j] ** 2) - found[i] * (m1 := meshes[i] ** 2)) / (m2 - m1) for i, j in ((0, 1), (1, 2))]
    row = {"cut": CUT, "mesh": meshes[-1], "level": pairs[1], "open": abs(pairs[1] - pairs[0])}
    print(found, pairs, row)
    with open(os.path.join(os.path.dirname(os.path.abspath(__file__)), "al_filling.json"), "w") as file:
        json.dump(row, file, indent=0)
        file.write("\n")
