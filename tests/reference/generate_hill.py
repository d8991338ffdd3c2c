"""D(E) = y1(P) + y2'(P) of -y'' + V y = E y over P = pi, by Taylor series on 32 segments at 60 digits; and
Fermi energies of two layered cells from their closed forms. Writes hill.csv and filling.csv."""

from mpmath import mp, mpf, pi, cos, sin, sqrt, cosh, sinh, findroot, nstr

mp.dps = 60
POTENTIALS = {  # constant and (amplitude, frequency) of cosines
    "0;2;2": (0, [(2, 2)]),
    "0;10;2": (0, [(10, 2)]),
    "0;2;2;1.5;4": (0, [(2, 2), (mpf("1.5"), 4)]),
    "4;4;2": (4, [(4, 2)]),
}
ENERGIES = ["-6", "-2", "0", "0.5", "1", "2.25", "4", "6.25", "10", "20", "50", "100"]


def discriminant(constant, terms, energy):
    segments, order = 32, 70
    h = pi / segments
    trace = 0
    for column, (y, dy) in enumerate(((mpf(1), mpf(0)), (mpf(0), mpf(1)))):
        for s in range(segments):
            x = s * h
            v = []
            for k in range(order):
                total = mpf(constant) - energy if k == 0 else mpf(0)
                for amplitude, w in terms:
                    wave = (cos(w * x), -sin(w * x), -cos(w * x), sin(w * x))[k % 4]
                    total += amplitude * wave * mpf(w) ** k / mp.factorial(k)
                v.append(total)
            c = [y, dy]
            for k in range(order - 2):
                c.append(sum(v[i] * c[k - i] for i in range(k + 1)) / ((k + 1) * (k + 2)))
            y = sum(ck * h**k for k, ck in enumerate(c))
            dy = sum(k * ck * h ** (k - 1) for k, ck in enumerate(c) if k)
        trace += y if column == 0 else dy
    return trace


with open("hill.csv", "w") as out:
    out.write("# V = constant + sum of amplitude cos(frequency x), period pi; computed\n# made by generate_hill.py\n# V (constant;amplitude;frequency;...), E, D\n")
    for name, (constant, terms) in POTENTIALS.items():
        for e in ENERGIES:
            out.write(f"{name},{e},{nstr(discriminant(constant, terms, mpf(e)), 28)}\n")


def layered(energy, v):
    """Two layers of length 1, potentials 0 and v."""
    p, q = sqrt(mp.mpc(-energy)), sqrt(mp.mpc(v - energy))
    return (2 * cosh(p) * cosh(q) + (p / q + q / p) * sinh(p) * sinh(q)).real


def comb(energy, strength):
    z = sqrt(mpf(energy))
    return 2 * cos(z) + 2 * strength * sin(z) / z


CELLS = {  # name: D, brackets of bands 0 and 1 (kronig_penney.csv, delta_combs.csv)
    "KP01": (lambda e: layered(e, 10), ("3.2172806698", "3.8507681527"), ("9.9563657460", "14.2476916288")),
    "DC01": (lambda e: comb(e, 3 * pi / 2), ("5.0647665146", "9.8696044011"), ("22.2066099024", "39.4784176044")),
}
with open("filling.csv", "w") as out:
    out.write("# Fermi energy at n states per cell and spin (n = ka/pi); closed forms as in the cells' own files\n# made by generate_hill.py\n")
    for name, (d, *brackets) in CELLS.items():
        for n in ("0.25", "0.5", "0.75", "1.25", "1.5", "1.75"):
            low, high = brackets[int(float(n))]
            f = lambda e: d(e) - 2 * cos(mpf(n) * pi)
            root = findroot(f, (mpf(low), mpf(high)), solver="anderson", tol=mpf(10) ** -100, maxsteps=300, verify=False)
            out.write(f"{name},{n},{nstr(root, 30)}\n")
