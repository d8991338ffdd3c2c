"""8 bands at 100 wave vectors of about 150 plane waves: numpy.linalg.eigh against this crate, on the same matrices.

Run from the project's root, in one go: python3 benches/eigh_ratio.py. Both sides run on one thread and are charged
their processor time, so that a busy machine does not decide. If OPENBLAS_CORETYPE or OPENBLAS_L2_SIZE is set, both are
unset together for the numpy part (one without the other misleads that library's blocking).
"""
import os
import subprocess
import sys
import time

if os.environ.get("OPENBLAS_NUM_THREADS") != "1" or "OPENBLAS_CORETYPE" in os.environ or "OPENBLAS_L2_SIZE" in os.environ:
    for name in ("OPENBLAS_CORETYPE", "OPENBLAS_L2_SIZE"):
        os.environ.pop(name, None)
    os.environ["OPENBLAS_NUM_THREADS"] = "1"
    os.execv(sys.executable, [sys.executable] + sys.argv)

ROOT = os.path.join(os.path.dirname(os.path.abspath(__file__)), "..")
sys.path.insert(0, os.path.join(ROOT, "tests", "reference"))
import numpy as np  # noqa: E402
from epm_generate import MODELS, hamiltonian  # noqa: E402

B = np.array([[-1, 1, 1], [1, -1, 1], [1, 1, -1]], dtype=float)
STEPS = np.array([0.618033988, 0.754877666, 0.569840291])
FRACTIONS = [np.modf(STEPS * (i + 1))[0] - 0.5 for i in range(100)]


def ours(kind, repeats):
    """Processor seconds and the sum of the eighth levels."""
    command = ["cargo", "bench", "--quiet", "--bench", "planewaves", "--", "--repeat", kind, str(repeats)]
    before = os.times()
    out = subprocess.run(command, capture_output=True, text=True, check=True).stdout.split()
    after = os.times()
    return after.children_user + after.children_system - before.children_user - before.children_system, out


def best(work, repeats=5):
    times = []
    for _ in range(repeats):
        start = time.process_time()
        total = work()
        times.append(time.process_time() - start)
    return min(times), total


ours("real", 0)
for kind, model in (("real", "Si"), ("complex", "GaAs")):
    a, form = MODELS[model]
    matrices = [hamiltonian(f @ B, 27.3, a, form) for f in FRACTIONS]
    if kind == "real":
        # The origin is the centre of inversion, so the matrices are real.
        matrices = [m.real.copy() for m in matrices]
    vectors, total = best(lambda: sum(np.linalg.eigh(m)[0][7] for m in matrices))
    values, _ = best(lambda: sum(np.linalg.eigvalsh(m)[7] for m in matrices))
    idle = min(ours(kind, 0)[0] for _ in range(3))
    spent, sums = min((ours(kind, 20) for _ in range(3)), key=lambda pair: pair[0])
    each = (spent - idle) / 20
    assert abs(float(sums[0]) - total) < 1e-9, (sums[0], total)
    print(
        f"{kind}: {np.mean([len(m) for m in matrices]):.0f} waves; per 100 k numpy eigh {vectors * 1e3:.0f} ms, eigvalsh "
        f"{values * 1e3:.0f} ms; ours, filling the matrices, with 8 vectors {each * 1e3:.0f} ms; "
        f"ratio to eigh {each / vectors:.2f}, to eigvalsh {each / values:.2f}"
    )
