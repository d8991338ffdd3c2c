#!/usr/bin/env python3
"""The lowest gap of sample.cren, written to expected.lua, from the closed form of two layers a cell.

With a and b the widths, m and M the masses of well and wall, at the energy E the zone condition is
  cos kd = cos(qa) cosh(pb) - (1/2) (qM/(pm) - pm/(qM)) sin(qa) sinh(pb),
q and p the wave numbers in well and wall (p imaginary above the wall), as follows from
continuity of the wave function and of its derivative over the mass. A gap is where |cos kd| > 1.
Constants: CODATA 2022.
"""
import cmath
import pathlib

HBAR, ELECTRON, EV = 1.054571817e-34, 9.1093837139e-31, 1.602176634e-19


def cosine(energy, well, wall=2.6, m=0.067, M=0.092, height=0.235):
    q = cmath.sqrt(2 * m * ELECTRON * energy * EV) / HBAR * 1e-9
    p = cmath.sqrt(2 * M * ELECTRON * (height - energy) * EV) / HBAR * 1e-9
    ratio = q * M / (p * m)
    value = cmath.cos(q * well) * cmath.cosh(p * wall)
    value -= (ratio - 1 / ratio) / 2 * cmath.sin(q * well) * cmath.sinh(p * wall)
    return value.real


def edge(well, low, high):
    """The energy between low and high where |cos kd| crosses 1."""
    inside = abs(cosine(low, well)) <= 1
    for _ in range(80):
        middle = (low + high) / 2
        if (abs(cosine(middle, well)) <= 1) == inside:
            low = middle
        else:
            high = middle
    return (low + high) / 2


def gap(well):
    """The lowest gap in meV: after the first stretch of allowed energies."""
    step, energy, edges = 1e-4, 1e-5, []
    while len(edges) < 3:
        if (abs(cosine(energy, well)) <= 1) != (abs(cosine(energy + step, well)) <= 1):
            edges.append(edge(well, energy, energy + step))
        energy += step
    return (edges[2] - edges[1]) * 1e3


text = "-- Written by expected.py; the lowest gap in meV before and after the edit.\n"
text += f"return {{ before = {gap(5.4):.4f}, after = {gap(8.4):.4f}, within = 0.06 }}\n"
pathlib.Path(__file__).with_name("expected.lua").write_text(text)
print(text)
