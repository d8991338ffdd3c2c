"""Reference rows for layered cells, by the closed form, with mpmath at 60 digits.

A two-layer cell (and a comb of deltas) is mirror symmetric about the middle of each layer, so its
band edges are the levels of half a cell with psi' = 0 (N) or psi = 0 (D) at either end:
NN and DD belong to k = 0, ND and DN to k = pi/a. Each is a simple root of an entry of the half-cell
matrix, also where a gap is closed or a band is 1e-25 wide.

Closed form: Kronig & Penney, Proc. R. Soc. A 130, 499 (1931); matching psi and psi'/m: BenDaniel & Duke,
Phys. Rev. 152, 683 (1966), Bastard, Phys. Rev. B 24, 5693 (1981).

Writes kronig_penney.csv and delta_combs.csv.
"""

from mpmath import mp, mpf, cosh, sinh, sqrt, pi, findroot, diff, nstr

mp.dps = 60


def layer(length, depth, mass):
    """Matrix of a layer for (psi, psi'/m), depth = V - E."""
    z = mass * depth * length**2
    root = sqrt(z)
    c = cosh(root).real
    s = (sinh(root) / root).real if root != 0 else mpf(1)
    return (c, mass * length * s, depth * length * s, c)


def times(x, y):
    return (
        x[0] * y[0] + x[1] * y[2],
        x[0] * y[1] + x[1] * y[3],
        x[2] * y[0] + x[3] * y[2],
        x[2] * y[1] + x[3] * y[3],
    )


def half_cell(energy, cell):
    """Middle of layer 1 (half of the delta there) to middle of layer 2."""
    a, v1, m1, b, v2, m2, c, strength = cell
    m1, m2 = m1 / c, m2 / c
    start = (mpf(1), mpf(0), strength / 2, mpf(1))
    return times(layer(b / 2, v2 - energy, m2), times(layer(a / 2, v1 - energy, m1), start))


def discriminant(energy, cell):
    h = half_cell(energy, cell)
    return 2 * (h[0] * h[3] + h[1] * h[2])


def edges(cell, count):
    """The lowest `count` band edges, ascending."""
    a, v1, m1, b, v2, m2, c, strength = cell
    optical = (a * sqrt(m1 / c) + b * sqrt(m2 / c)) / 2
    lowest = min(v1, v2 if b else v1) - (strength**2 * m1 / c / 4 + abs(strength) / (a + b) * 2 if strength < 0 else 0)
    lowest -= mpf("0.0123456789") * (pi / optical) ** 2 / 100
    step = pi / optical / 97
    found = []
    previous, k = None, mpf(0)
    while True:
        energy = lowest + k * k
        now = half_cell(energy, cell)
        if previous is not None:
            for entry in range(4):
                if (now[entry] > 0) != (previous[1][entry] > 0):
                    f = lambda e: half_cell(e, cell)[entry]
                    root = findroot(f, (previous[0], energy), solver="anderson", tol=mpf(10) ** -110, maxsteps=400, verify=False)
                    found.append(root)
        previous = (energy, now)
        k += step
        # a few more modes than wanted: the four kinds come in groups
        if len(found) >= count + 4:
            return sorted(found)[:count]


def rows(cell, bands):
    e = edges(cell, 2 * bands + 1)
    period = cell[0] + cell[3]
    mass = lambda n, energy: -((-1) ** n) * diff(lambda x: discriminant(x, cell), energy) * cell[6] / period**2
    for n in range(bands):
        bottom, top, above = e[2 * n], e[2 * n + 1], e[2 * n + 2]
        gap = above - top
        if abs(gap) < mpf(10) ** -45:
            gap = mpf(0)
        below = n and abs(bottom - e[2 * n - 1]) < mpf(10) ** -45
        m_bottom = "" if below else nstr(mass(n, bottom), 20)
        m_top = "" if gap == 0 else nstr(mass(n + 1, top), 20)
        yield [str(n), nstr(bottom, 36), nstr(top, 36), nstr(top - bottom, 20), nstr(gap, 20), m_bottom, m_top]


C_EV_NM = "0.03809982110968583731"  # hbar^2 / 2 m_e in eV nm^2, CODATA 2022
P2 = pi**2
LAYERS = [
    ("KP01", 8, "equal masses", "1", "0", "1", "1", "10", "1", "1"),
    ("KP02", 8, "square wave of Meissner", pi / 2, "0", "1", pi / 2, "4", "1", "1"),
    ("KP03", 6, "empty lattice, all gaps closed", "1", "0", "1", "0.7", "0", "1", "1"),
    ("KP04", 8, "gap 2 closed: phases 2 pi and pi", "1", "0", "1", "1", 3 * P2, "1", "1"),
    ("KP05", 8, "gap 4 closed: phases 4 pi and pi", "1", "0", "1", "0.5", 12 * P2, "1", "1"),
    ("KP06", 8, "gap 2 closed with unequal masses", "1", "0", "1", "1", 7 * P2 / 2, "2", "1"),
    ("KP07", 8, "gap 2 closed: impedances and phases match", "1", "0", "2", "1", P2, "1", "1"),
    ("KP08", 8, "gap 2 closed: impedances match", "1", "0", "2", "2", 9 * P2 / 16, "1", "1"),
    ("KP09", 8, "masses only, even gaps closed", "1", "0", "1", "2", "0", "0.25", "1"),
    ("KP10", 5, "thick wall", "1", "0", "1", "3", "100", "1", "1"),
    ("KP11", 4, "thicker wall, band 0 is 6e-25 wide", "1", "0", "1", "6", "100", "1", "1"),
    ("KP12", 6, "thin high wall near a delta", "1", "0", "1", "0.001", 3000 * pi, "1", "1"),
    ("KP13", 8, "mass ratio 10", "1", "0", "1", "1", "20", "10", "1"),
    ("KP14", 8, "mass ratio 0.1", "1", "0", "1", "1", "20", "0.1", "1"),
    ("KP15", 8, "narrow well, wide low wall", "0.2", "0", "1", "5", "3", "1", "1"),
    ("KP16", 8, "well below zero", "1", "-25", "1", "1", "0", "1", "1"),
    ("SL01", 5, "eV nm me: 10/2.2, 0.25", "10", "0", "0.067", "2.2", "0.25", "0.067", C_EV_NM),
    ("SL02", 4, "eV nm me: 4/4, 0.23", "4", "0", "0.067", "4", "0.23", "0.092", C_EV_NM),
    ("SL03", 4, "eV nm me: 6.5/2.5, 0.25", "6.5", "0", "0.067", "2.5", "0.25", "0.092", C_EV_NM),
    ("SL04", 4, "eV nm me: 6.5/2.5, equal masses", "6.5", "0", "0.067", "2.5", "0.25", "0.067", C_EV_NM),
    ("SL05", 5, "eV nm me: 8/8, 0.25", "8", "0", "0.041", "8", "0.25", "0.077", C_EV_NM),
    ("SL06", 4, "eV nm me: 5/3, 1.0", "5", "0", "0.067", "3", "1.0", "0.15", C_EV_NM),
    ("SL07", 5, "eV nm me: 10/30, 0.3", "10", "0", "0.067", "30", "0.3", "0.0919", C_EV_NM),
]
COMBS = [
    ("DC01", 3 * pi / 2), ("DC02", 10), ("DC03", "0.5"), ("DC04", "-0.5"), ("DC05", -1),
    ("DC06", -2), ("DC07", -10), ("DC08", 1000), ("DC09", pi),
]


def write(name, source, cells):
    with open(name, "w") as out:
        out.write(f"# {source}\n# made by generate_layers.py\n")
        out.write("# cell: name, a, V1, m1, b, V2, m2, C, delta in the middle of layer 1 (H = -C d(1/m)d + V)\n")
        out.write("# band: name, n, bottom, top, width, gap above, mass at bottom, mass at top (empty: touching)\n")
        for label, bands, text, cell in cells:
            out.write(f"note,{label},{text.replace(',', ';')}\n")
            out.write(f"cell,{label}," + ",".join(nstr(x, 30) for x in cell) + "\n")
            for row in rows(cell, bands):
                out.write(f"band,{label}," + ",".join(row) + "\n")


write(
    "kronig_penney.csv",
    "computed from the closed form of Kronig & Penney (Proc. R. Soc. A 130; 499 (1931)); masses matched as BenDaniel & Duke (Phys. Rev. 152; 683 (1966))",
    [(n, k, t, tuple(mpf(x) for x in p) + (mpf(0),)) for n, k, t, *p in LAYERS],
)
write(
    "delta_combs.csv",
    "computed from the closed form cos Ka = cos z + P sin z / z; E = z^2; delta = 2P (Kronig & Penney 1931)",
    [(n, 8, f"P = {nstr(mpf(p), 12)}", (mpf(1), mpf(0), mpf(1), mpf(0), mpf(0), mpf(1), mpf(1), 2 * mpf(p))) for n, p in COMBS],
)
