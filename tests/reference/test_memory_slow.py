#!/usr/bin/env python3
# SPDX-License-Identifier: BSD-2-Clause
"""Peak memory of a rank as `check` estimates it, and as the run measures it (/provenance, resident pages at most), for a spread
of models and propagators on one and two ranks; where sites are what it holds, it falls with the ranks. Program: $EBBTURN.
Tolerance: 20 % (the estimate's own claim), 0.7 for half of the sites beside libraries of some 45 MB."""
import os
import re
import tempfile

import h5py
from common import check, finish, run

CLAIM, FALLS = 0.2, 0.7
SHARED = ("everything kept",)  # what such a model holds is shared out by sites
PACKET = "state: {{profile: gaussian_momentum, momentum: {}, relative_spread: {}}}\n"
CLOCK = "clock: {{kind: scalar, from: {}, to: {}, samples: {}}}\n"


def text(gravity, clock, packet, lattice, keep, propagator="auto"):
    return (f"gravity: {{{gravity}}}\n" + CLOCK.format(*clock) + PACKET.format(*packet) + f"lattice: {{{lattice}}}\n"
            f"numerics: {{propagator: {propagator}}}\noutput: {{keep: [{keep}]}}\n")


MODELS = {
    "few modes": text("prescription: slqc", (-0.3, 0.3, 21), (60, 0.08), "volume_max: 3000", "moments"),
    "many modes": text("prescription: slqc", (-0.2, 0.2, 41), (1000, 0.1), "volume_max: 5.0e+4, layout: full", "moments"),
    "many sites": text("prescription: aps", (-0.4, 0.4, 161), (100, 0.05), "volume_max: 4.0e+5, layout: full", "moments, quantiles"),
    "everything kept": text("prescription: mmo", (-0.4, 0.4, 64), (100, 0.05), "volume_max: 4.0e+5",
                            "moments, quantiles, probability, state"),
    "chebyshev": text("prescription: slqc", (-0.01, 0.01, 3), (200, 0.05), "volume_max: 6.0e+4", "moments, quantiles", "chebyshev"),
    "eigenpairs": text("prescription: slqc", (-0.2, 0.2, 41), (100, 0.08), "points: 2000", "moments, quantiles", "eigenpairs"),
    "levels": text("prescription: slqc, curvature: closed", (-0.2, 0.2, 41), (800, 0.05), "volume_max: auto", "moments, quantiles"),
    "a further field": open(os.path.join(os.path.dirname(os.path.abspath(__file__)), "..", "..", "inputs", "dust_and_scalar.yaml"),
                            encoding="utf-8").read(),
}


def measure(folder, name, ranks):
    path = os.path.join(folder, "model.yaml")
    with open(path, "w", encoding="utf-8") as f:
        f.write(MODELS[name])
    said = run("check", path, ranks=ranks).stdout
    estimate = 1e6 * float(re.search(r"memory +([\d.e+]+) MB per rank at the peak", said)[1])
    result = os.path.join(folder, "result.h5")
    run("evolve", path, "-o", result, "--force", ranks=ranks)
    with h5py.File(result) as f:
        peak = float(f["provenance"].attrs["peak_memory"])
    off = estimate / peak - 1
    check(abs(off) < CLAIM, f"{name}, {ranks} ranks: estimated {1e-6 * estimate:.1f} MB, measured {1e-6 * peak:.1f} MB, off by {100 * off:+.1f} %")
    return peak


def main():
    with tempfile.TemporaryDirectory() as folder:
        for name in MODELS:
            one = measure(folder, name, 1)
            two = measure(folder, name, 2) if name in SHARED or name == "levels" else one
            if name in SHARED:
                check(two < FALLS * one, f"{name}: two ranks hold {two / one:.2f} of what one held, each")
    finish()


main()
