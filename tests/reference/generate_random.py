"""Random layered cells without symmetry, with mpmath at 50 digits: edges, and their derivatives by every number.

Cells of 2 to 6 layers and deltas, half of them with an energy-dependent mass value + slope E. Each band edge is
bracketed by the number of zeros of the solution that vanishes at x = 0 (Sturm) and then found as a root of
D(E) -+ 2; derivatives are -(dD/dp)/(dD/dE) with D differentiated by mpmath. Also linear ramps, by Airy functions.

Writes random_layers.csv and ramps.csv.
"""

import random

from mpmath import mp, mpf, sqrt, cosh, sinh, sin, cos, pi, acos, floor, findroot, diff, nstr, airyai, airybi

mp.dps = 50
EPS = mpf(10) ** -40


def factor(piece, energy):
    """Matrix for (psi, psi'/m) and the phase across it."""
    if piece[0] == "delta":
        return (mpf(1), mpf(0), piece[1], mpf(1)), mpf(0)
    _, length, v, value, slope = piece
    m = value + slope * energy
    w = v - energy
    z = m * w * length**2
    if z >= 0:
        r = sqrt(z)
        c, s, phase = cosh(r), (sinh(r) / r if r else mpf(1)), mpf(0)
    else:
        r = sqrt(-z)
        c, s, phase = cos(r), sin(r) / r, r
    return (c, m * length * s, w * length * s, c), phase


def sweep(cell, energy):
    """D, and the integrated states N = ka / pi extended over the bands."""
    a, b, c, d = mpf(1), mpf(0), mpf(0), mpf(1)
    zeros = 0
    for piece in cell:
        (p, q, r, s), phase = factor(piece, energy)
        u, v = b, d
        a, b, c, d = p * a + q * c, p * b + q * d, r * a + s * c, r * b + s * d
        before = u > 0 if u else v > 0
        after = b > 0 if b else d > 0
        n = int(floor(phase / pi))
        zeros += n if (n % 2 == 1) == (before != after) else n + 1
    trace = a + d
    if abs(trace) >= 2:
        return trace, mpf(zeros + ((zeros % 2 == 0) != (trace > 0)))
    return trace, zeros + acos(trace / 2 if zeros % 2 == 0 else -trace / 2) / pi


def bracket(cell, low, high, states):
    """low, high with N(low) <= states < N(high), close."""
    while high - low > mpf(10) ** -7 * max(1, abs(high)):
        middle = (low + high) / 2
        if sweep(cell, middle)[1] > states:
            high = middle
        else:
            low = middle
    return low, high


def edge(cell, states, upper, low, high):
    """The edge where N = states: the upper end of the gap, or its lower end."""
    shift = mpf(10) ** -30 if upper else -mpf(10) ** -30
    low, high = bracket(cell, low, high, states + shift)
    sign = 1 if states % 2 == 0 else -1
    f = lambda e: sign * sweep(cell, e)[0] - 2
    if f(low) * f(high) > 0:
        return None  # a gap this narrow is left out of the table
    return findroot(f, (low, high), solver="anderson", tol=mpf(10) ** -90, maxsteps=200, verify=False)


def number(low, high):
    return mpf(round(random.uniform(low, high), 3))


def random_cell():
    pieces = []
    bent = random.random() < 0.5
    for _ in range(random.randint(2, 6)):
        length, v, m = number(0.1, 1.5), number(-8, 25), number(0.2, 2)
        slope = number(0.001, 0.01) if bent else mpf(0)
        pieces.append(("flat", length, v, m, slope))
        if random.random() < 0.25:
            pieces.append(("delta", number(-4, 6)))
    return pieces


def changed(cell, i, j, x):
    piece = list(cell[i])
    piece[j] = x
    return cell[:i] + [tuple(piece)] + cell[i + 1 :]


def gradient(cell, energy):
    slope = diff(lambda e: sweep(cell, e)[0], energy)
    for i, piece in enumerate(cell):
        for j in range(1, len(piece)):
            yield -diff(lambda x: sweep(changed(cell, i, j, x), energy)[0], piece[j]) / slope


def write_layers():
    random.seed(20240517)
    with open("random_layers.csv", "w") as out:
        out.write("# computed; made by generate_random.py\n# cell, id, pieces (flat:length:V:m:slope or delta:strength)\n")
        out.write("# edge, id, N there, upper end of the gap (1) or lower (0), energy\n# slope, id, N, upper, dE/d(each number of each piece in order)\n")
        for label in range(60):
            cell = random_cell()
            text = ",".join(":".join([p[0]] + [nstr(x, 12) for x in p[1:]]) for p in cell)
            out.write(f"cell,{label},{text}\n")
            high = mpf(60)
            while sweep(cell, high)[1] < 6:
                high *= 2
            low = mpf(-40)
            for states in range(5):
                for upper in (False, True):
                    if states == 0 and not upper:
                        continue
                    e = edge(cell, states, upper, low, high)
                    if e is None:
                        continue
                    out.write(f"edge,{label},{states},{int(upper)},{nstr(e, 30)}\n")
                    if label < 12 and states in (1, 3):
                        out.write(f"slope,{label},{states},{int(upper)}," + ",".join(nstr(x, 20) for x in gradient(cell, e)) + "\n")


def airy_matrix(length, left, right, mass, energy):
    """-psi''/m + V psi = E psi with V linear: Airy functions of (m F)^(1/3) (x - (E - left)/F)."""
    force = (right - left) / length
    scale = mp.cbrt(mass * abs(force)) * (1 if force > 0 else -1)
    at = lambda x: scale * (x - (energy - left) / force)
    values = lambda x: (airyai(at(x)), airybi(at(x)), scale * airyai(at(x), derivative=1) / mass, scale * airybi(at(x), derivative=1) / mass)
    a0, b0, c0, d0 = values(mpf(0))
    a1, b1, c1, d1 = values(length)
    det = a0 * d0 - b0 * c0
    return ((a1 * d0 - b1 * c0) / det, (b1 * a0 - a1 * b0) / det, (c1 * d0 - d1 * c0) / det, (d1 * a0 - c1 * b0) / det)


def write_ramps():
    """D of a sawtooth: one ramp and one layer."""
    with open("ramps.csv", "w") as out:
        out.write("# ramp of length L from V1 to V2 and mass m, then a layer of length 1 at 0 with mass 1; D at E by Airy functions (DLMF 9.2)\n")
        out.write("# made by generate_random.py\n# L, V1, V2, m, E, D\n")
        for length, v1, v2, m in (("1", "0", "10", "1"), ("2", "30", "-5", "0.5"), ("0.3", "5", "5.5", "1.5"), ("4", "0", "400", "1"), ("6", "1", "90", "2")):
            for e in ("-3", "0.7", "4.9", "12.5", "47", "150"):
                mp.dps = 80
                p = tuple(mpf(x) for x in (length, v1, v2, m, e))
                x = airy_matrix(p[0], p[1], p[2], p[3], p[4])
                y, _ = factor(("flat", mpf(1), mpf(0), mpf(1), mpf(0)), p[4])
                trace = y[0] * x[0] + y[1] * x[2] + y[2] * x[1] + y[3] * x[3]
                out.write(",".join((length, v1, v2, m, e, nstr(trace, 28))) + "\n")
                mp.dps = 50


write_ramps()
write_layers()
