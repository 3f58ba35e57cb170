#!/usr/bin/env python3
# SPDX-License-Identifier: BSD-2-Clause
"""Time against the largest volume at fixed accuracy: bounce-symmetric packets of momentum 100, ever sharper in momentum and so wider
in volume, at one tolerance. Each state says itself how far its lattice has to reach; graded lattices follow it, full ones while they
are below --full (default 4e6). Prints a table; --plot PREFIX draws it. Program: $EBBTURN or build/ebbturn. Asserts that every ratio
agrees with the closed form within its error bar."""
import argparse
import os
import re
import subprocess
import sys
import tempfile
import time

SIGMA = (5.0, 4.4, 3.9, 3.4, 2.9, 2.5, 2.2, 1.9, 1.7, 1.5, 1.35)
MODEL = """gravity: {{prescription: slqc}}
clock: {{from: -0.3, to: 0.3, samples: 9}}
state: {{profile: gaussian_momentum, momentum: 100, relative_spread: {spread!r}}}
lattice: {{layout: {layout}}}
output: {{keep: [moments]}}
"""
PROGRAM = os.environ.get("EBBTURN", "build/ebbturn")


def measure(folder, sigma, layout):
    """(largest v, rows, seconds, ratio, its error) of one run."""
    path = os.path.join(folder, "model.yaml")
    with open(path, "w", encoding="utf-8") as f:
        f.write(MODEL.format(spread=sigma / 100, layout=layout))
    start = time.perf_counter()
    done = subprocess.run([PROGRAM, "evolve", path, "--force", "-o", os.path.join(folder, "out.h5")], capture_output=True, text=True,
                          timeout=3600, check=False)
    seconds = time.perf_counter() - start
    size = re.search(r"size +(\d+) .* up to v = (\S+),", done.stdout)
    ratio = re.search(r"ratio +(\S+) \+- (\S+)", done.stdout)
    if not size or not ratio:
        sys.exit(done.stdout + done.stderr)
    return float(size[2]), int(size[1]), seconds, float(ratio[1]), float(ratio[2])


def closed_form(sigma, p=100.0, points=20001):
    """exp(kappa^2/8 sigma^2) <sqrt(k^2 + 1/4)>/<k>: the volume law of Ashtekar, Corichi, Singh (2008), trapezoidal rule."""
    import math
    kappa = math.sqrt(12 * math.pi)
    k0, s = p / kappa, sigma / kappa
    low, high = max(k0 - 12 * s, 0.0), k0 + 12 * s
    k = [low + (high - low) * i / (points - 1) for i in range(points)]
    w = [math.exp(-0.5 * ((x - k0) / s) ** 2) for x in k]
    root = sum(a * math.sqrt(x * x + 0.25) for a, x in zip(w, k))
    return math.exp(1 / (8 * s * s)) * root / sum(a * x for a, x in zip(w, k))


def draw(table, prefix):
    import matplotlib
    matplotlib.use("Agg")
    import matplotlib.pyplot as plt
    figure, axes = plt.subplots(figsize=(6.4, 4.4), layout="constrained")
    for layout, style in (("graded", "o-"), ("full", "s--")):
        points = [(v, t) for l, v, t in table if l == layout]
        axes.loglog(*zip(*points), style, label=f"{layout} lattice")
    axes.set_xlabel("largest volume v")
    axes.set_ylabel("time of a whole run [s]")
    axes.legend()
    figure.savefig(prefix + ".png", dpi=150)
    figure.savefig(prefix + ".pdf", metadata={"CreationDate": None})
    print(f"wrote '{prefix}.pdf' and '{prefix}.png'")


def main():
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--full", type=float, default=4e6, help="largest v up to which full lattices run beside")
    parser.add_argument("--plot", metavar="PREFIX", help="draw the table")
    options = parser.parse_args()
    table, failures = [], 0
    print(" sigma   largest v      rows   seconds          ratio     error      | full rows   seconds")
    with tempfile.TemporaryDirectory() as folder:
        for sigma in SIGMA:
            v, rows, seconds, ratio, error = measure(folder, sigma, "graded")
            table.append(("graded", v, seconds))
            line = f"{sigma:6.2f} {v:11.3g} {rows:9d} {seconds:9.2f} {ratio:14.9g} {error:9.1e}      |"
            failures += not abs(ratio - closed_form(sigma)) <= error + 1e-11 * ratio
            if v <= options.full:
                v, rows, seconds, other, other_error = measure(folder, sigma, "full")
                table.append(("full", v, seconds))
                line += f" {rows:9d} {seconds:9.2f}"
                failures += not abs(ratio - other) <= error + other_error
            print(line, flush=True)
    if options.plot:
        draw(table, options.plot)
    return 1 if failures else 0


if __name__ == "__main__":
    sys.exit(main())
