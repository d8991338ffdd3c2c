"""Edges of overlapping bands of a separable potential: sorted sums of one-dimensional levels, extremal over the zone.

-d2/dx2 + s cos^2 x in each of d directions, period pi; k in fractions of the reciprocal vector. One-dimensional levels by
numpy on 41 plane waves (exact to rounding); extrema of the d-dimensional bands by a grid over the wedge kx >= ky >= kz and
finer and finer grids around its best points. Writes lattices_overlaps.json: for each "d s", a row a band: bottom, top.

    python3 tests/reference/lattices_overlaps.py
"""
import itertools
import json
import pathlib

import numpy as np


def levels(s, k):
    """The lowest eight levels at each of an array of k."""
    n = np.arange(-20, 21)
    h = np.zeros((len(k), 41, 41))
    h[:, n + 20, n + 20] = (2 * (n[None, :] + k[:, None])) ** 2 + s / 2
    for i in range(40):
        h[:, i, i + 1] = h[:, i + 1, i] = s / 4
    return np.linalg.eigvalsh(h)[:, :8]


def bands(s, axes, count):
    """Sorted sums over a product grid of one array of k an axis."""
    total = np.zeros((1,) * len(axes) + (1,))
    for axis, k in enumerate(axes):
        shape = [1] * len(axes)
        shape[axis] = len(k)
        e = levels(s, k)
        total = (total[..., :, None] + e.reshape(shape + [1, 8])).reshape(
            np.broadcast_shapes(total.shape[:-1], tuple(shape)) + (-1,)
        )
    return np.sort(np.partition(total, count, axis=-1)[..., :count], axis=-1)


def extremum(s, d, band, sign):
    """The least of sign times the band."""
    size = 161 if d == 2 else 33
    grid = np.linspace(0, 0.5, size)
    values = sign * bands(s, [grid] * d, band + 1)[..., band]
    best = np.inf
    for place in np.argsort(values, axis=None)[:24]:
        centre = grid[list(np.unravel_index(place, values.shape))]
        width = grid[1]
        least = values.flat[place]
        for _ in range(26):
            axes = [np.clip(c + width * np.linspace(-1, 1, 9), 0, 0.5) for c in centre]
            near = sign * bands(s, axes, band + 1)[..., band]
            here = np.unravel_index(np.argmin(near), near.shape)
            centre = [axis[i] for axis, i in zip(axes, here)]
            least = min(least, near[here])
            width *= 0.5
        best = min(best, least)
    return sign * best


rows = {}
for d, s, count in itertools.chain([(2, s, 5) for s in (1.0, 5.0, 12.0)], [(3, s, 4) for s in (2.0, 6.0)]):
    rows[f"{d} {s:g}"] = [[extremum(s, d, band, 1), extremum(s, d, band, -1)] for band in range(count)]
    print(d, s, rows[f"{d} {s:g}"], flush=True)
path = pathlib.Path(__file__).with_name("lattices_overlaps.json")
path.write_text(json.dumps(rows, indent=1) + "\n")
