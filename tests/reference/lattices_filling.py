"""Fermi levels of squares and cubes of V = s sum cos^2 x_i (period pi, H = -laplacian + V); writes lattices_filling.json.

E is a sum of one chain's energies, so the number of states is a convolution,

    N_d(E) = sum_n integral_0^1 N_(d-1)(E - e_n(k)) dk,   N_1(E) = sum_n k_n(E) (0 below, 1 above the band),

k in units of the zone's edge. Bands e_n by dense Fourier matrices with numpy; k_n(E) by a cubic spline in
arccos((middle - E)/half width), in which it is smooth; the square by scipy's adaptive quadrature between the points at
which the argument meets a band's edge, the cube by midpoint sums, which are then also taken with half the points.

Rows: [dimension, s, levels filled per cell, Fermi level, the difference that the quadrature leaves open].
"""
import json
import os

import numpy as np
from scipy.integrate import quad
from scipy.interpolate import CubicSpline
from scipy.optimize import brentq

SIZE, BANDS, NODES = 20, 3, 4001


class Chain:
    def __init__(self, s):
        n = np.arange(-SIZE, SIZE + 1)
        couple = s / 4 * (np.eye(len(n), k=1) + np.eye(len(n), k=-1))
        ks = np.linspace(0, 1, NODES)
        e = np.array([np.linalg.eigvalsh(np.diag((k + 2 * n) ** 2 + s / 2) + couple)[:BANDS] for k in ks])
        self.low, self.high = e.min(axis=0), e.max(axis=0)
        self.forward = [CubicSpline(ks, e[:, b]) for b in range(BANDS)]
        self.back = []
        for b in range(BANDS):
            t, k = self.angle(b, e[:, b]), ks
            if t[0] > t[-1]:
                t, k = t[::-1], k[::-1]
            self.back.append(CubicSpline(t, k))

    def angle(self, b, energy):
        middle, half = 0.5 * (self.low[b] + self.high[b]), 0.5 * (self.high[b] - self.low[b])
        return np.arccos(np.clip((middle - energy) / half, -1, 1))

    def wave(self, b, energy):
        return self.back[b](self.angle(b, energy))

    def filled(self, energy):
        """N_1; odd bands (counted from 0) fall from the zone's centre, so that their states lie beyond k."""
        total = 0.0
        for b in range(BANDS):
            k = self.wave(b, energy)
            part = k if b % 2 == 0 else 1 - k
            total = total + np.where(energy <= self.low[b], 0.0, np.where(energy >= self.high[b], 1.0, part))
        return total

    def square(self, energy):
        total = 0.0
        for b in range(BANDS):
            stops = [0.0, 1.0]
            for edge in np.concatenate([self.low, self.high]):
                if self.low[b] < energy - edge < self.high[b]:
                    stops.append(float(self.wave(b, energy - edge)))
            stops.sort()
            for one, other in zip(stops, stops[1:]):
                if other - one > 1e-12:
                    total += quad(lambda k: self.filled(energy - self.forward[b](k)), one, other, epsabs=1e-11, epsrel=1e-11, limit=200)[0]
        return total

    def cube(self, energy, points):
        k = (np.arange(points) + 0.5) / points
        e = np.concatenate([spline(k) for spline in self.forward])
        total = 0.0
        for row, own in enumerate(e):
            # Each pair of waves once; the diagonal by halves.
            others = self.filled(energy - own - e[row:])
            total += 2 * others.sum() - others[0]
        return total / points**2


rows = []
for s in (1.0, 5.0):
    chain = Chain(s)
    for levels in (0.3, 0.5, 1.5, 2.2):
        found = brentq(lambda e: chain.square(e) - levels, 2 * chain.low[0], 2 * chain.low[0] + 14, xtol=1e-11)
        rows.append([2, s, levels, found, 1e-9])
    for levels in (0.3, 0.5, 1.5, 2.2):
        rough, fine = (
            brentq(lambda e: chain.cube(e, points) - levels, 3 * chain.low[0], 3 * chain.low[0] + 12, xtol=1e-9)
            for points in (240, 480)
        )
        rows.append([3, s, levels, fine, abs(fine - rough)])
    print(*rows[-8:], sep="\n")
with open(os.path.join(os.path.dirname(os.path.abspath(__file__)), "lattices_filling.json"), "w") as file:
    json.dump(rows, file, indent=0)
    file.write("\n")
