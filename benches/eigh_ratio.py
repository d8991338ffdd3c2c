"""8 bands at 100 wave vectors by numpy.linalg.eigh and by the bench `planewaves`, on the same matrices, in one run.

Run from the project's root: python3 benches/eigh_ratio.py. If OPENBLAS_CORETYPE or OPENBLAS_L2_SIZE is set, both are
unset together for the numpy part (a core type without its cache size misleads that library's blocking).
"""
import os
import subprocess
import sys
import time

if "OPENBLAS_CORETYPE" in os.environ or "OPENBLAS_L2_SIZE" in os.environ:
    for name in ("OPENBLAS_CORETYPE", "OPENBLAS_L2_SIZE"):
        os.environ.pop(name, None)
    os.execv(sys.executable, [sys.executable] + sys.argv)

sys.path.insert(0, os.path.join(os.path.dirname(os.path.abspath(__file__)), "..", "tests", "reference"))
import numpy as np  # noqa: E402
from epm_generate import MODELS, hamiltonian  # noqa: E402

B = np.array([[-1, 1, 1], [1, -1, 1], [1, 1, -1]], dtype=float)
fractions = [np.modf(np.array([0.618033988, 0.754877666, 0.569840291]) * (i + 1))[0] - 0.5 for i in range(100)]
ours = {}
lines = subprocess.run(
    ["cargo", "bench", "--bench", "planewaves", "--", "8 bands", "--quick"], capture_output=True, text=True
).stdout
print(lines)
for name, model in (("real", "Si"), ("complex", "GaAs")):
    a, form = MODELS[model]
    matrices = [hamiltonian(f @ B, 27.3, a, form) for f in fractions]
    if name == "real":
        # The origin is the centre of inversion, so the matrices are real.
        matrices = [m.real.copy() for m in matrices]
    best = 1e9
    for _ in range(5):
        start = time.perf_counter()
        total = sum(np.linalg.eigh(m)[0][7] for m in matrices)
        best = min(best, time.perf_counter() - start)
    values = 1e9
    for _ in range(5):
        start = time.perf_counter()
        sum(np.linalg.eigvalsh(m)[7] for m in matrices)
        values = min(values, time.perf_counter() - start)
    line = next(x for x in lines.split("\n") if x.startswith(f"8 bands at 100 k, {name}"))
    number, unit = line.split("[")[1].split()[2:4]
    ours = float(number) * {"ms": 1e-3, "s": 1.0, "µs": 1e-6}[unit]
    print(
        f"{name}: sum of eighth levels {total:.12f}, numpy eigh {best * 1e3:.1f} ms, eigvalsh {values * 1e3:.1f} ms, "
        f"ours (matrices filled, 8 vectors) {ours * 1e3:.1f} ms, ratio to eigh {ours / best:.2f}"
    )
