# SPDX-License-Identifier: BSD-2-Clause
"""`relate` on 1, 2 and 3 ranks gives the same numbers to rounding, every kind of reading."""
from common import check, datasets, finish, np, os, run, tempfile

MODEL = """
clock: {kind: scalar, from: -0.4, to: 0.4, samples: 161}
state: {profile: gaussian_volume, v0: 96, spread: 12, b0: 1.5707963267948966}
lattice: {points: 512}
output: {keep: [state]}
"""
READINGS = """
readings:
  - {name: power, clock: {observable: b, instrument: cosine_power, power: 64, centres: 96}}
  - {name: power_log, clock: {observable: b, instrument: cosine_power, power: 16, centres: 24}, system: {bins: {log: 50}}}
  - {name: sharp, clock: {observable: b, instrument: sharp, bins: 16}}
  - {name: cosine, clock: {observable: b, instrument: cosine, bins: 16}, system: {observable: density, bins: 10}}
  - {name: density, clock: {observable: density, instrument: cosine, bins: 10}}
  - {name: hubble, clock: {observable: hubble, instrument: cosine, bins: 10}}
  - {name: v, clock: {observable: v, instrument: sharp, from: 0, to: 640, bins: 16}, system: {observable: b, bins: 8}}
  - {name: phi, clock: {observable: phi}}
histories: {v_star: [96, 144, 288], at: [-0.35, 0.35], times: 5}
propagator: {at: [-0.2, 0.05], first: [164, 188], clock: {spread: 0.02, half_width: 0.01}}
"""

with tempfile.TemporaryDirectory() as folder:
    model, readings, result = (os.path.join(folder, name) for name in ("m.yaml", "r.yaml", "m.h5"))
    with open(model, "w", encoding="utf-8") as f:
        f.write(MODEL)
    with open(readings, "w", encoding="utf-8") as f:
        f.write(READINGS)
    run("evolve", model, "-o", result)
    found = {}
    for n in (0, 2, 3):
        out = os.path.join(folder, f"r{n}.h5")
        run("relate", result, readings, "-o", out, ranks=n, expect=1)
        found[n] = datasets(out)
    for n in (2, 3):
        check(found[n].keys() == found[0].keys(), f"{n} ranks: the same datasets")
        for name, value in found[0].items():
            if value.dtype.kind != "f" or "error" in name or "identity" in name:
                continue
            a, b = np.nan_to_num(np.atleast_1d(value)), np.nan_to_num(np.atleast_1d(found[n][name]))
            # relative to the largest of the dataset: the median of a tiny tail is a ratio of roundings
            worst = np.abs(a - b).max() / max(np.abs(a).max(), 1e-300)
            check(worst < 1e-11, f"{n} ranks, {name}: {worst:.1e}")  # rounding: order of sums
finish()
