"""Reference levels of simple lattices; writes lattices_levels.json.

separable: V = s cos^2(x) per axis, period pi, H = -d^2/dx^2 + V (recoil units). Band edges by Mathieu's equation,
  E = s/2 + a, q = s/4 (DLMF chapter 28): the edges are eigenvalues of Fourier matrices at k = 0 and k = 1, taken at
  40 digits with mpmath. Rows: s -> [bottom 1, top 1, bottom 2, top 2, bottom 3, top 3].
hexagonal: V(r) = 2 v (cos b1.r + cos b2.r + cos (b1-b2).r) with |b| = sqrt 3 and b1, b2 at 60 degrees, zero mean;
  v > 0 honeycomb, v < 0 triangular. Dense numpy solve of all |k+G|^2 <= 300. Rows: v -> point -> 8 lowest.
empty: [value, degeneracy] of |k+G|^2 in (2 pi/a)^2, exact fractions counted.
gaussian: square lattice, edge 1, V = -depth sum exp(-|r-R|^2 / 2 sigma^2): dense solve of all |k+G|^2 <= cut.
"""
import itertools
import json
import os
from collections import Counter
from fractions import Fraction

import numpy as np
from mpmath import mp, mpf, matrix, eigsy

mp.dps = 40


def edges(s):
    s = mpf(s)
    size = 24

    def levels(start):
        n = 2 * size + 1
        h = matrix(n, n)
        for i in range(n):
            h[i, i] = (start + 2 * (i - size)) ** 2 + s / 2
            if i:
                h[i, i - 1] = h[i - 1, i] = s / 4
        return sorted(eigsy(h, eigvals_only=True))[:4]

    centre = levels(mpf(0))
    n = 2 * size
    h = matrix(n, n)
    for i in range(n):
        h[i, i] = (2 * (i - size) + 1) ** 2 + s / 2
        if i:
            h[i, i - 1] = h[i - 1, i] = s / 4
    edge = sorted(eigsy(h, eigvals_only=True))[:4]
    return [float(x) for x in (centre[0], edge[0], edge[1], centre[1], centre[2], edge[2])]


def dense(b, k, cut, components):
    reach = 40
    grid = np.array(list(itertools.product(range(-reach, reach + 1), repeat=2)))
    square = (((grid + np.array(k)) @ b) ** 2).sum(axis=1)
    waves = grid[square <= cut]
    h = np.diag((((waves + np.array(k)) @ b) ** 2).sum(axis=1))
    d = waves[:, None, :] - waves[None, :, :]
    return h + components(d)


def hexagonal(v):
    b = np.sqrt(3) * np.array([[1, 0], [0.5, np.sqrt(3) / 2]])
    star = [(1, 0), (-1, 0), (0, 1), (0, -1), (1, -1), (-1, 1)]

    def components(d):
        out = np.zeros(d.shape[:2])
        for g in star:
            out[(d[:, :, 0] == g[0]) & (d[:, :, 1] == g[1])] = v
        return out

    points = {"G": (0, 0), "M": (0.5, 0), "K": (1 / 3, 1 / 3)}
    return {p: [float(x) for x in np.linalg.eigvalsh(dense(b, k, 300, components))[:8]] for p, k in points.items()}


def gaussian(depth, sigma, cut):
    b = 2 * np.pi * np.eye(2)

    def components(d):
        g2 = ((d @ b) ** 2).sum(axis=2)
        return -depth * 2 * np.pi * sigma**2 * np.exp(-g2 * sigma**2 / 2)

    points = {"G": (0, 0), "X": (0.5, 0), "M": (0.5, 0.5)}
    return {p: [float(x) for x in np.linalg.eigvalsh(dense(b, k, cut, components))[:6]] for p, k in points.items()}


def empty(kind, k, count=5):
    k = [Fraction(x) for x in k]
    values = Counter()
    for g in itertools.product(range(-8, 9), repeat=3):
        parity = {x % 2 for x in g}
        if kind == "fcc" and len(parity) != 1:
            continue
        if kind == "bcc" and sum(g) % 2:
            continue
        values[sum((x + y) ** 2 for x, y in zip(k, g))] += 1
    return [[float(x), values[x]] for x in sorted(values)[:count]]


def main():
    half, quarter = Fraction(1, 2), Fraction(1, 4)
    rows = {
        "separable": {str(s): edges(s) for s in (0.5, 1, 2, 3, 5, 8, 10, 15, 20)},
        "hexagonal": {str(v): hexagonal(v) for v in (0.1, 0.5, 1, 2, 5, 10, 20, -0.1, -0.5, -1, -2, -5, -10)},
        "gaussian": {"40 0.15": gaussian(40, 0.15, 9000), "120 0.2": gaussian(120, 0.2, 9000)},
        "empty": {
            "fcc": {
                "G": empty("fcc", (0, 0, 0)),
                "X": empty("fcc", (1, 0, 0)),
                "L": empty("fcc", (half, half, half)),
                "W": empty("fcc", (1, half, 0)),
                "K": empty("fcc", (3 * quarter, 3 * quarter, 0)),
                "U": empty("fcc", (1, quarter, quarter)),
            },
            "bcc": {
                "G": empty("bcc", (0, 0, 0)),
                "H": empty("bcc", (1, 0, 0)),
                "N": empty("bcc", (half, half, 0)),
                "P": empty("bcc", (half, half, half)),
            },
        },
    }
    out = os.path.join(os.path.dirname(os.path.abspath(__file__)), "lattices_levels.json")
    with open(out, "w") as file:
        json.dump(rows, file, indent=0)
        file.write("\n")


if __name__ == "__main__":
    main()
