"""Shapes summed over all images of a chain of period 1, to 30 digits with mpmath, by the images alone.

Run: python3 images.py > images.csv
Rows: shape, width, distance from the centre, sum.
"""
from mpmath import cosh, exp, mp, mpf, nsum, pi, sin, sinh, tanh

mp.dps = 40


def images(bell, u, reach):
    total = bell(u)
    n = 1
    while n <= reach:
        total += bell(u - n) + bell(u + n)
        n += 1
    return total


print("# shape,width,distance,sum")
for width in ["0.03", "0.1", "0.3", "0.44", "0.46", "0.7", "1.5", "4"]:
    w = mpf(width)
    for place in ["0", "0.11", "0.25", "0.5", "0.73"]:
        u = mpf(place)
        gauss = images(lambda x: exp(-x * x / (2 * w * w)), u, int(15 * w) + 20)
        sech2 = images(lambda x: cosh(x / w) ** -2, u, int(45 * w) + 25)
        # The images of a Lorentzian fall off too slowly to be added up: nsum extrapolates their sum.
        lorentz = 1 / (1 + (u / w) ** 2) + nsum(
            lambda n: 1 / (1 + ((u - n) / w) ** 2) + 1 / (1 + ((u + n) / w) ** 2), [1, mp.inf]
        )
        for name, value in [("gaussian", gauss), ("sech2", sech2), ("lorentzian", lorentz)]:
            print(f"{name},{width},{place},{mp.nstr(value, 25)}")
