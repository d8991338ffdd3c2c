"""The periodic cubic spline through uneven samples, by scipy.interpolate.CubicSpline.

Run: python3 spline.py
Writes samples.csv (position in nm, potential in meV) and spline.csv (position in nm, value in meV, slope in meV/nm).
"""
import numpy as np
from scipy.interpolate import CubicSpline

period = 10.0
x = np.array([0.0, 0.9, 2.1, 3.3, 4.0, 5.2, 6.6, 7.1, 8.4, 9.3])
y = np.round(40 * np.cos(2 * np.pi * x / period) + 12 * np.sin(6 * np.pi * x / period), 6)
with open("samples.csv", "w") as out:
    out.write("position, potential\n")
    out.writelines(f"{a!r}, {b!r}\n" for a, b in zip(x.tolist(), y.tolist()))
spline = CubicSpline(np.append(x, period), np.append(y, y[0]), bc_type="periodic")
with open("spline.csv", "w") as out:
    out.write("# position,value,slope\n")
    for place in np.linspace(0.05, 9.95, 34).tolist():
        out.write(f"{place!r},{float(spline(place))!r},{float(spline(place, 1))!r}\n")
