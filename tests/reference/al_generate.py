"""Levels of nearly-free aluminium: fcc, a = 4.05 angstrom, V111 = 0.0179 Ry, V200 = 0.0562 Ry (Ashcroft, Phil. Mag. 8,
2055 (1963)). Dense numpy solve of all |k+G|^2 <= cut, in (2 pi/a)^2. Writes al_levels.json: {cut: {point: levels}}.
"""
import json
import os

import numpy as np

from epm_generate import BOHR, POINTS, fcc_waves


def levels(k, cut, a=4.05, v111=0.0179, v200=0.0562):
    unit = (2 * np.pi / (a / BOHR)) ** 2
    waves = fcc_waves(k, cut)
    square = np.rint(((waves[:, None, :] - waves[None, :, :]) ** 2).sum(axis=2)).astype(int)
    h = np.where(square == 3, v111 / unit, 0) + np.where(square == 4, v200 / unit, 0)
    h = h + np.diag(((waves + np.array(k)) ** 2).sum(axis=1))
    return [float(x) for x in np.linalg.eigvalsh(h)[:8]]


rows = {cut: {p: levels(k, cut) for p, k in POINTS.items()} for cut in (11, 24, 40)}
with open(os.path.join(os.path.dirname(os.path.abspath(__file__)), "al_levels.json"), "w") as file:
    json.dump(rows, file, indent=0)
    file.write("\n")
