"""The two-layer cell by scipy plane waves beside crenate, in one run.

The same cell as `benches/solve.rs` has: 5.4 nm at 0 and 2.6 nm at 235 meV, 0.067 electron masses throughout, gap 1.
Plane waves are added until the gap has six digits (held against crenate's own, which knows twelve); that size is timed,
k = 0 and k = pi/a both, against `cargo bench --bench solve` for the same four bands with masses and widths.

    python3 benches/plane_wave_ratio.py
"""

import json
import pathlib
import re
import subprocess
import sys
import tempfile
import time

import numpy
import scipy.linalg

ROOT = pathlib.Path(__file__).resolve().parent.parent
HBAR2_OVER_2ME = 0.038_099_821_109_685_837  # eV nm^2, CODATA 2022
WELL, WALL, HEIGHT, MASS = 5.4, 2.6, 0.235, 0.067
TEXT = f"""crystal cell
  mass {MASS} me
  layer {WELL} nm at 0 meV
  layer {WALL} nm at {1e3 * HEIGHT} meV
"""


def matrix(waves, k):
    """H on the plane waves -waves..waves; k in units of 2 pi / a."""
    period = WELL + WALL
    n = numpy.arange(-waves, waves + 1)
    difference = n[:, None] - n[None, :]
    share = WALL / period
    # The wall centred on the origin makes V(G) real: V share sinc(G share).
    h = HEIGHT * share * numpy.sinc(difference * share)
    h[numpy.diag_indices_from(h)] += HBAR2_OVER_2ME / MASS * (2 * numpy.pi / period * (n + k)) ** 2
    return h


def edges(waves):
    return [scipy.linalg.eigh(matrix(waves, k), eigvals_only=True, subset_by_index=[0, 4]) for k in (0.0, 0.5)]


def gap(waves):
    return edges(waves)[1][1] - edges(waves)[1][0]


def crenate_gap():
    with tempfile.TemporaryDirectory() as folder:
        path = pathlib.Path(folder) / "cell.cren"
        path.write_text(TEXT)
        shown = subprocess.run(
            ["cargo", "run", "--release", "--quiet", "--", "show", "--format", "json", str(path)],
            cwd=ROOT, check=True, capture_output=True, text=True,
        ).stdout
    return json.loads(shown)["crystals"][0]["gaps"][0]["size_eV"]


def crenate_seconds():
    printed = subprocess.run(
        ["cargo", "bench", "--bench", "solve", "--", "two", "--quick"], cwd=ROOT, capture_output=True, text=True
    ).stdout
    found = re.search(r"time:\s+\[\S+ \S+ ([\d.]+) (ns|µs|us|ms)", printed)
    if not found:
        sys.exit("no figure in the bench's output:\n" + printed)
    return float(found.group(1)) * {"ns": 1e-9, "µs": 1e-6, "us": 1e-6, "ms": 1e-3}[found.group(2)]


def main():
    exact = crenate_gap()
    waves = next(n for n in range(4, 2000) if abs(gap(n) - exact) < 0.5e-6 * exact)
    repeats = []
    for _ in range(30):
        start = time.perf_counter()
        edges(waves)
        repeats.append(time.perf_counter() - start)
    theirs, ours = min(repeats), crenate_seconds()
    print(f"gap 1 {exact:.12f} eV; plane waves for six digits: {2 * waves + 1}")
    print(f"scipy eigh, edges alone: {1e6 * theirs:.0f} µs; crenate, edges, gaps, widths and masses: {1e6 * ours:.0f} µs")
    print(f"ratio {theirs / ours:.1f}")


if __name__ == "__main__":
    main()
