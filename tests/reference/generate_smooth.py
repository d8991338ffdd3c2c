"""Reference rows for smooth cells, with mpmath at 50 digits.

The Hamiltonian in plane waves exp(i (k + G) x) is a Hermitian matrix with the analytic Fourier coefficients
of V; at k = 0 and k = pi/a a potential that is even about the origin splits it into cosines and sines.
Each level is started from numpy's eigenvalue of the matrix and finished by Rayleigh quotients with
mpmath, the matrix raised until the level no longer moves.

Writes mathieu.csv, optical_lattice.csv, smooth_wells.csv, lame.csv.
"""

import numpy
from mpmath import (
    mp, mpf, matrix, pi, sqrt, exp, sinh, cos, ellipk, ellipe, nstr, fdot,
)

mp.dps = 50


def blocks(fourier, period, size):
    """The four parity blocks (k = 0 even, odd; k = pi/a even, odd); fourier(j) = V_G, G = 2 pi j / a."""
    g = 2 * pi / period
    v = [fourier(j) for j in range(2 * size + 3)]
    made = []
    for shift, sign in ((0, 1), (0, -1), (1, 1), (1, -1)):
        start = 1 if (shift == 0 and sign < 0) else 0
        indices = list(range(start, start + size))
        h = matrix(size, size)
        for r, i in enumerate(indices):
            for c, j in enumerate(indices):
                q = [i, j] if shift == 0 else [i + mpf(1) / 2, j + mpf(1) / 2]
                value = v[abs(i - j)] + sign * v[i + j + shift]
                if shift == 0 and (i == 0) != (j == 0):
                    value *= sqrt(mpf(2)) / 2 * 1
                    value = sqrt(mpf(2)) * v[i + j] if sign > 0 else value
                if shift == 0 and i == 0 and j == 0:
                    value = v[0]
                if r == c:
                    value += (g * q[0]) ** 2
                h[r, c] = value
        made.append(h)
    return made


def refine(h, index):
    """Eigenvalue `index` of a symmetric mpmath matrix by Rayleigh quotients from numpy's pair."""
    n = h.rows
    dense = numpy.array([[float(h[i, j]) for j in range(n)] for i in range(n)])
    values, vectors = numpy.linalg.eigh(dense)
    x = matrix([mpf(float(t)) for t in vectors[:, index]])
    energy = mpf(float(values[index]))
    for _ in range(3):
        shifted = h.copy()
        for i in range(n):
            shifted[i, i] -= energy + mpf(10) ** -48
        x = mp.lu_solve(shifted, x)
        norm = sqrt(fdot(x, x))
        x /= norm
        hx = h * x
        energy = fdot(x, hx)
    return energy


def edges(fourier, period, count, size):
    found = []
    for h in blocks(fourier, period, size):
        found += [refine(h, i) for i in range(count // 4 + 2)]
    return sorted(found)[:count]


def band_rows(e):
    for n in range((len(e) - 1) // 2):
        yield [str(n), nstr(e[2 * n], 32), nstr(e[2 * n + 1], 32), nstr(e[2 * n + 1] - e[2 * n], 20), nstr(e[2 * n + 2] - e[2 * n + 1], 20)]


def write(name, comments, lines):
    with open(name, "w") as out:
        for text in comments + ["made by generate_smooth.py"]:
            out.write(f"# {text}\n")
        for line in lines:
            out.write(",".join(line) + "\n")


def cosine(q):
    """y'' + (a - 2 q cos 2z) y = 0: V = 2 q cos 2z, period pi."""
    return lambda j: mpf(q) if j == 1 else mpf(0)


def mathieu():
    for q in ("0.5", "1", "2", "5", "10", "15", "20", "25", "50", "100"):
        e = edges(cosine(q), pi, 21, 40)
        for row in band_rows(e):
            yield ["band", q] + row


def tridiagonal_level(q, k, band, size=24):
    """a of band `band` at wave number k in [0, 1] (units of the recoil wave number), by Newton's step on
    the determinant's logarithm (Sturm sequence with derivative) from numpy's eigenvalue."""
    waves = [k + 2 * i for i in range(-size, size + 1)]
    diagonal = [w * w for w in waves]
    dense = numpy.diag([float(d) for d in diagonal]) + float(q) * (numpy.eye(2 * size + 1, k=1) + numpy.eye(2 * size + 1, k=-1))
    energy = mpf(float(numpy.linalg.eigvalsh(dense)[band]))
    x = None
    for _ in range(4):
        # inverse iteration by the tridiagonal solve, Rayleigh quotient
        n = len(diagonal)
        if x is None:
            x = [mpf(float(t)) for t in numpy.linalg.eigh(dense)[1][:, band]]
        shift = energy + mpf(10) ** -49
        c, d = [mpf(0)] * n, [mpf(0)] * n
        for i in range(n):
            denominator = diagonal[i] - shift - (q * c[i - 1] if i else 0)
            c[i] = q / denominator
            d[i] = (x[i] - (q * d[i - 1] if i else 0)) / denominator
        for i in reversed(range(n)):
            x[i] = d[i] - (c[i] * x[i + 1] if i + 1 < n else 0)
        norm = sqrt(sum(t * t for t in x))
        x = [t / norm for t in x]
        energy = sum(diagonal[i] * x[i] ** 2 for i in range(n)) + 2 * q * sum(x[i] * x[i + 1] for i in range(n - 1))
    return energy


DEPTHS = ["0.5", "1", "2", "3", "4", "5", "6", "8", "10", "12", "14", "15", "16", "18", "20", "25", "30", "40", "50"]


def lattice():
    """V = s cos^2 x, recoil energy 1, period pi."""
    for s in DEPTHS:
        q = mpf(s) / 4
        e = [x + mpf(s) / 2 for x in edges(cosine(q), pi, 13, 40)]
        for row in band_rows(e):
            yield ["band", s] + row
        # J_m from the trapezoidal rule over the zone, doubled until settled
        count, last = 24, None
        while True:
            nodes = [mpf(i) / count for i in range(count + 1)]
            level = [tridiagonal_level(q, k, 0) for k in nodes]
            ends = lambda i: mpf(1) / 2 if i in (0, count) else mpf(1)
            hop = [-sum(ends(i) * level[i] * cos(pi * m * nodes[i]) for i in range(count + 1)) / count for m in range(1, 6)]
            if last and max(abs(a - b) for a, b in zip(hop, last)) < mpf(10) ** -40:
                break
            last, count = hop, 2 * count
            if count > 800:
                break
        yield ["hop", s] + [nstr(h, 20) for h in hop]
        for states in ("0.25", "0.5", "0.75", "1.25", "1.5", "1.75"):
            n = int(float(states))
            share = mpf(states) - n
            k = share if n % 2 == 0 else 1 - share
            yield ["fill", s, states, nstr(tridiagonal_level(q, k, n) + mpf(s) / 2, 30)]


def wells():
    for kind, depth, w, d in (
        ("gauss", "5", "0.3", "2"), ("gauss", "20", "0.3", "2"), ("gauss", "-5", "0.3", "2"), ("gauss", "8", "0.25", "1"),
        ("sech", "6", "0.5", "2"), ("sech", "12", "0.5", "3"), ("sech", "3", "0.4", "1.5"),
    ):
        v, wide, period = mpf(depth), mpf(w), mpf(d)
        if kind == "gauss":
            fourier = lambda j: -v * wide * sqrt(2 * pi) / period * exp(-((2 * pi * j / period * wide) ** 2) / 2)
        else:
            def fourier(j):
                g = 2 * pi * j / period
                return -v / period * (2 * wide if j == 0 else pi * g * wide**2 / sinh(pi * g * wide / 2))
        size = 40 if kind == "gauss" else 60
        e = edges(fourier, period, 11, size)
        for row in band_rows(e):
            yield ["band", f"{kind}:{depth}:{w}:{d}"] + row


def lame():
    """Closed forms of the 2l + 1 edges of V = l(l+1) m sn^2(x|m)."""
    for l in (1, 2, 3):
        for m in ("0.1", "0.3", "0.5", "0.8", "0.95", "0.99", "0.999"):
            k = mpf(m)
            if l == 1:
                e = [k, mpf(1), 1 + k]
            elif l == 2:
                r = 2 * sqrt(1 - k + k * k)
                e = [2 * (1 + k) - r, 1 + k, 1 + 4 * k, 4 + k, 2 * (1 + k) + r]
            else:
                r, s, t = 2 * sqrt(4 - 7 * k + 4 * k * k), 2 * sqrt(4 - k + k * k), 2 * sqrt(1 - k + 4 * k * k)
                e = [5 + 5 * k - r, 5 + 2 * k - s, 2 + 5 * k - t, 4 * (1 + k), 2 + 5 * k + t, 5 + 2 * k + s, 5 + 5 * k + r]
            yield ["edges", str(l), m, nstr(2 * ellipk(k), 30)] + [nstr(x, 30) for x in sorted(e)]


if __name__ == "__main__":
    write("mathieu.csv", [
        "V = 2q cos 2x on period pi: edges are the characteristic values a_0, b_1, a_1, b_2, a_2, ...",
        "Abramowitz & Stegun (NBS 1964) Table 20.1; Zhang & Jin; Computation of Special Functions (Wiley 1996); DLMF ch. 28",
        "band, q, n, bottom, top, width, gap above"], mathieu())
    write("lame.csv", ["V = l(l+1) m sn^2(x|m), period 2K(m): exactly l open gaps; closed forms of the edges",
        "Ince, Proc. R. Soc. Edinburgh 60; 47 (1940); DLMF ch. 29", "edges, l, m, period, edges ascending"], lame())
    write("smooth_wells.csv", ["V = -V0 sum exp(-(x-jd)^2/(2w^2)) or -V0 sum sech^2((x-jd)/w); computed", "band, kind:V0:w:d, n, bottom, top, width, gap above"], wells())
    write("optical_lattice.csv", ["V = s cos^2 x, recoil energy 1, period pi; q = s/4",
        "Bloch, Dalibard & Zwerger, Rev. Mod. Phys. 80; 885 (2008) Table I, for 4J and W of s = 3 to 20",
        "band, s, n, bottom, top, width, gap above; hop, s, J1..J5; fill, s, states per cell and spin, Fermi energy"], lattice())
