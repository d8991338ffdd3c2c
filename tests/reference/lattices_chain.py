"""The chain V = s cos^2 x (period pi, H = -d^2/dx^2 + V) by dense Fourier matrices with numpy; writes lattices_chain.json.

Rows: s -> {"hopping": [J1, J2, J3] of band 1 (512-point sum over the zone, E = E0 - 2 sum J cos),
"inverse_bottom": 1/m of the bottom of band 1, "inverse_top": of its top, free particle = 1 (k.p sum over all levels)}.
Bloch, Dalibard & Zwerger, Rev. Mod. Phys. 80, 885 (2008), Table I has 4J = 0.263069 at s = 5 and 0.076730 at s = 10
(from memory; reproduced here).
"""
import json
import os

import numpy as np

SIZE = 20


def solve(s, k):
    n = np.arange(-SIZE, SIZE + 1)
    p = k + 2 * n
    h = np.diag(p**2 + s / 2) + s / 4 * (np.eye(len(n), k=1) + np.eye(len(n), k=-1))
    return p, *np.linalg.eigh(h)


def inverse(s, k):
    p, e, v = solve(s, k)
    m = v.T @ (2 * p[:, None] * v)
    return 0.5 * (2 + 2 * sum(m[j, 0] ** 2 / (e[0] - e[j]) for j in range(1, len(e))))


rows = {}
for s in (1, 3, 5, 10, 15):
    ks = np.arange(512) / 256 - 1
    e = np.array([solve(s, k)[1][0] for k in ks])
    hopping = [float(-np.mean(e * np.cos(np.pi * m * ks))) for m in (1, 2, 3)]
    rows[s] = {"hopping": hopping, "inverse_bottom": float(inverse(s, 0.0)), "inverse_top": float(inverse(s, 1.0))}
print({s: 4 * r["hopping"][0] for s, r in rows.items()})
with open(os.path.join(os.path.dirname(os.path.abspath(__file__)), "lattices_chain.json"), "w") as file:
    json.dump(rows, file, indent=0)
    file.write("\n")
