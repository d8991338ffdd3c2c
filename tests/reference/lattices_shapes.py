"""Fourier integrals of shapes at 30 digits, for the unit tests of `planewaves/shapes.rs`. Cell volume 2."""
from mpmath import mp, mpf, quad, linspace, exp, cos, sin, pi, besselj

mp.dps = 30
O = mpf(2)
s = mpf("0.4")


def gauss(d, g):
    if d == 1:
        return quad(lambda x: exp(-x * x / 2 / s / s) * cos(g * x), linspace(-4, 4, 21)) / O
    if d == 2:
        return quad(lambda r: exp(-r * r / 2 / s / s) * 2 * pi * r * besselj(0, g * r), linspace(0, 5, 21)) / O
    return quad(lambda r: exp(-r * r / 2 / s / s) * 4 * pi * r * sin(g * r) / g, linspace(0, 5, 21)) / O


def disk(g, R=mpf("0.7")):
    return quad(lambda r: 2 * pi * r * besselj(0, g * r), linspace(0, R, 21)) / O


def sphere(g, R=mpf("0.7")):
    return quad(lambda r: 4 * pi * r * sin(g * r) / g, linspace(0, R, 21)) / O


for d in (1, 2, 3):
    print("gaussian", d, gauss(d, mpf("1.3")))
for g in ("0.0001", "1.3", "25"):
    print("disk", g, disk(mpf(g)))
for g in ("0.2", "0.42", "1.3", "25"):
    print("sphere", g, sphere(mpf(g)))
x = quad(lambda x: cos(mpf("1.3") * x), [mpf("-0.35"), mpf("0.35")])
y = quad(lambda x: cos(mpf("0.00001") * x), [mpf("-0.2"), mpf("0.2")])
print("block", x * y / O)
