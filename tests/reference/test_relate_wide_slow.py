# SPDX-License-Identifier: BSD-2-Clause
"""Readings of universes that no list of sites holds, and of such as can just be held, by both layouts."""
import re

import relate_support
from common import check, finish, h5py, np, os, run, tempfile
from relate_layouts import alike, both, holds

INPUTS = os.path.join(os.path.dirname(__file__), "..", "..", "inputs")
CLOCK = "readings:\n  - {name: b_fine, clock: {observable: b, instrument: cosine_power, power: 64, centres: 96}}\n"
COARSE = CLOCK.replace("b_fine", "b").replace("power: 64, centres: 96", "power: 24, centres: 30")
PROPAGATOR = "propagator: {at: [-0.1, 0.1], first: [36, 44], clock: {spread: 0.02, half_width: 0.01}}\n"
# 10^5 sites, ten thousand times the bounce volume
BROAD = """
gravity: {prescription: slqc}
clock: {kind: scalar, from: -0.6, to: 0.6, samples: 11}
state: {profile: gaussian_momentum, momentum: 40, relative_spread: 0.05}
lattice: {volume_max: 420000}
output: {keep: [moments]}
"""
SMALL = BROAD.replace("420000", "12000").replace("0.05", "0.1")
# both arms, different on either side
ARMS = """
gravity: {prescription: aps, sector: 1.3}
clock: {kind: scalar, from: -0.4, to: 0.4, samples: 11}
state: {profile: gaussian_momentum, momentum: 40, relative_spread: 0.12}
lattice: {volume_max: 12000}
output: {keep: [moments, state]}
"""
ARMS_CLOCK = "window: {tolerance: 1}\nreadings:\n  - {name: b, clock: {observable: b, instrument: cosine_power, power: 16, centres: 24}}\n"



def worked(folder):
    """The worked universe of clocks, one of 10^5 sites, and two readings of a small one."""
    with open(os.path.join(INPUTS, "clock_universe.yaml"), encoding="utf-8") as f:
        model = re.sub(r"output:.*", "output: {keep: [moments]}\nlattice: {volume_max: 24000}\n", f.read().replace("samples: 201", "samples: 61"))
    full, graded = both(folder, "worked", model, CLOCK, 1)
    alike("b_fine", full, graded, share=0.0)  # it stays below the matching volume
    full, graded = both(folder, "broad", BROAD, "window: {tolerance: 0.05}\n" + COARSE, 1)
    check(full["relational/b/probability"].shape[1] > 1e5, f"{full['relational/b/probability'].shape[1]} sites")
    alike("b", full, graded)
    full, graded = both(folder, "small", SMALL, PROPAGATOR, 0)
    one, two = full["propagator"], graded["propagator"]
    plain = int(np.argmax(two["sites"][()] > 1))
    for key in ("right", "conditional", "kinematical"):
        check(np.abs(one[key][:plain] - two[key][:plain]).max() < 1e-12 and abs(two[key][()].sum() - 1) < 1e-12, f"propagator: {key}")
    for key in ("distance_conditional", "distance_kinematical", "lost", "first_probability", "delay"):
        check(abs(one.attrs[key] - two.attrs[key]) <= two.attrs["distance_error"] + 1e-12, f"propagator: {key} {two.attrs[key]:.12g}")


def order(folder):
    """Order of reading on two arms, by stencils on the states: groups of rows by |v|, each read alone."""
    full, graded = both(folder, "arms", ARMS, ARMS_CLOCK, 1)
    power, centres, found = 16, 24, graded["relational/b"].attrs
    with h5py.File(os.path.join(folder, "arms_full.h5")) as f:
        psi, v = f["state/psi"][()], f["lattice/v"][()]
    psi = psi.view(complex).reshape(len(psi), -1) if psi.dtype != complex else psi
    width = 2 * int(round(found["order_width"] / 4))  # rows: both arms have one in 4
    group = np.minimum(np.argsort(np.argsort(np.abs(v))) // width, 15)
    l = np.arange(-power // 2, power // 2 + 1)
    taps = np.array([1.0])
    for _ in range(power):
        taps = np.convolve(taps, [0.5, 0.5])
    taps /= np.sqrt(centres * (taps**2).sum())
    joint, reversed_ = np.zeros((centres, 16)), np.zeros((centres, 16))
    weight = np.full(len(psi), 0.08)
    weight[[0, -1]] /= 2
    for i in range(centres):
        kernel = (taps * np.exp(2j * l * np.pi * (i + 0.5) / centres))[::-1]  # correlation, not convolution
        for state, w in zip(psi, weight):
            after = np.abs(np.convolve(state, kernel, "same"))**2
            joint[i] += w * np.bincount(group, after, 16)
            for g in range(16):
                at = np.flatnonzero(group == g)
                part = np.where(group == g, state, 0)[at.min():at.max() + 1]
                reversed_[i, g] += w * (np.abs(np.convolve(part, kernel))**2).sum()
    wanted = 0.5 * np.abs(joint - reversed_).sum() / weight.sum()
    check(abs(found["order_violation"] - wanted) < 1e-11, f"order of reading {found['order_violation']:.12g}, by stencils {wanted:.12g}")
    three, _ = relate_support.relate(folder, os.path.join(folder, "arms_graded.h5"), "arms_three", ARMS_CLOCK, 1, ranks=3)
    for key in ("median", "purity", "dwell"):
        a, b = graded["relational/b/" + key][()], three["relational/b/" + key][()]
        check(np.nanmax(np.abs(a / b - 1)) < 1e-11, f"three ranks: {key} to {np.nanmax(np.abs(a / b - 1)):.1e}")
    for f in (full, graded, three):
        f.close()


def wide(folder):
    """v = v_B/sin b within the width of the packet, to v = 10^8 and beyond."""
    result, path = os.path.join(folder, "wide_clock.h5"), os.path.join(folder, "wide_read.h5")
    run("evolve", os.path.join(INPUTS, "wide_clock.yaml"), "-o", result)
    run("relate", result, os.path.join(INPUTS, "wide_readings.yaml"), "-o", path, expect=1)
    f = h5py.File(path)
    g, top = f["relational/b_fine"], f["relational/b_fine/system_centre"][-1]
    check(f["window"].attrs["layout"] == b"graded" and top > 1e8, f"auto takes the graded lattice, up to v = {top:.3g}")
    holds("wide", g)
    good = np.array([text == b"ok" for text in g["status"][()]])
    check(good.sum() > 60, f"{good.sum()} outcomes are given")
    median, curve, (low, _, high) = g["median"][good], g["effective"][good], g["quantiles"][good].T
    check(np.all((low < curve) & (curve < high)), "v_B/sin b lies between the outer quantiles")
    check(np.abs(median / curve - 1).max() < 0.05, f"median to v_B/sin b - 1: at most {np.abs(median / curve - 1).max():.3f}")
    f.close()


with tempfile.TemporaryDirectory() as scratch:
    worked(scratch)
    order(scratch)
    wide(scratch)
finish()
