"""Hopping and mass of a standing wave of depth s, with their derivatives by s.

-d2/dx2 + s sin^2 x, recoil energy 1, period pi. In plane waves e^{i(Q+2m)x} the diagonal is (Q+2m)^2 + s/2 and its
neighbours are -s/4. J = -(1/2) int_{-1}^{1} E(Q) cos(pi Q) dQ by the trapezoidal rule, dE/ds = 1/2 - (1/2) sum c_m c_{m+1}
(Hellmann-Feynman), mass 2/E''(0) in bare masses, its derivative by a central difference at 50 digits.

    python3 optical_slopes.py        (mpmath 1.3)   writes optical_slopes.csv
"""

import mpmath as mp

mp.mp.dps = 50
HALF = 12
POINTS = 96


def lowest(s, q):
    size = 2 * HALF + 1
    matrix = mp.zeros(size)
    for i in range(size):
        matrix[i, i] = (q + 2 * (i - HALF)) ** 2 + s / 2
        if i:
            matrix[i, i - 1] = matrix[i - 1, i] = -s / 4
    values, vectors = mp.eigsy(matrix)
    c = vectors[:, 0]
    slope = mp.mpf(1) / 2 - sum(c[i] * c[i + 1] for i in range(size - 1)) / 2
    return values[0], slope


def hopping(s):
    value = slope = mp.mpf(0)
    for i in range(POINTS):
        q = mp.mpf(2 * i) / POINTS - 1
        energy, rise = lowest(s, q)
        weight = -mp.cos(mp.pi * q) / POINTS
        value += weight * energy
        slope += weight * rise
    return value, slope


def mass(s):
    h = mp.mpf("1e-12")
    bend = 2 * (lowest(s, h)[0] - lowest(s, mp.mpf(0))[0]) / h**2
    return 2 / bend


def main():
    rows = ["# -d2/dx2 + s sin^2 x, recoil energy 1; made by optical_slopes.py", "# s, J, dJ/ds, mass, dmass/ds"]
    for s in map(mp.mpf, ["1", "2", "5", "9"]):
        step = mp.mpf("1e-8")
        rise = (mass(s + step) - mass(s - step)) / (2 * step)
        numbers = [*hopping(s), mass(s), rise]
        rows.append(",".join([mp.nstr(s, 4)] + [mp.nstr(x, 16) for x in numbers]))
    with open("optical_slopes.csv", "w") as out:
        out.write("\n".join(rows) + "\n")


main()
