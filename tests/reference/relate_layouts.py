# SPDX-License-Identifier: BSD-2-Clause
"""The same state read on a lattice with a row for every site and on a graded one."""
import relate_support
from common import check, np, os, run

# Of the largest number of a kind, beside the stated errors: sums over 10^5 sites and 10^2 samples, one after the other.
ROUNDING = 1e-11
NUMBERS = ("dwell", "median", "mean", "spread", "quantiles")


def both(folder, name, model, readings, expect):
    """Two open outputs, the full lattice's first."""
    found = []
    for layout in ("full", "graded"):
        path, result = relate_support.write(folder, name + ".yaml", model), os.path.join(folder, f"{name}_{layout}.h5")
        run("evolve", path, "-o", result, "--set", "lattice.layout=" + layout)
        f, _ = relate_support.relate(folder, result, f"{name}_{layout}_read", readings, expect)
        check(f["window"].attrs["layout"] == layout.encode(), f"{name}: the file says that its lattice is {layout}")
        found.append(f)
    return found


def ok(reading):
    return np.array([text == b"ok" for text in reading["status"][()]])


def largest(values):
    return max(np.nanmax(np.abs(values), initial=0.0), 1e-300)


def alike(name, full, graded, share=0.001):
    """Every number of a reading within what both say of themselves; share: least probability on nodes, or it proves little."""
    one, two = full["relational/" + name], graded["relational/" + name]
    check(np.array_equal(ok(one), ok(two)), f"{name}: the same outcomes are refused")
    for key in NUMBERS:
        a, b = one[key][()], two[key][()]
        good = np.isfinite(a) & np.isfinite(b)
        allowed = one[key + "_error"][()] + two[key + "_error"][()] + ROUNDING * largest(a)
        worst = (np.abs(a - b)[good] / allowed[good]).max(initial=0.0)
        check(np.array_equal(np.isfinite(a), np.isfinite(b)) and worst <= 1, f"{name}: {key} to {worst:.2g} of what is allowed")
    for key in ("purity", "leak", "window_error", "clock_spread", "stretches"):
        a, b = one[key][()], two[key][()]
        good = np.isfinite(a) & np.isfinite(b) & ok(one)
        check(np.abs(a - b)[good].max(initial=0.0) <= ROUNDING * max(largest(a), 1.0), f"{name}: {key}")
    for key in ("back_action", "order_violation"):
        error = two.attrs.get("back_action_error", 0.0) + ROUNDING
        check(abs(one.attrs[key] - two.attrs[key]) <= error, f"{name}: {key} {two.attrs[key]:.12g}, {one.attrs[key]:.12g}")
    if "system_sites" in two:
        dwell, nodes = two["system_dwell"][()], two["system_sites"][()] > 1
        on_nodes = dwell[nodes].sum() / dwell.sum()
        check(on_nodes >= share, f"{name}: {on_nodes:.3g} of the probability is on nodes")
    holds(name, two)


def holds(name, reading):
    """Identities, and probabilities that sum to 1."""
    for key in ("identity_probability", "identity_dwell", "identity_action"):
        check(reading.attrs[key] < 1e-11, f"{name}: {key} {reading.attrs[key]:.1e}")  # rounding, as above
    good, p = ok(reading), reading["probability"][()]
    lost = 1 - p[good].sum(axis=1)
    most = reading["leak"][()][good].max(initial=0.0) if reading.attrs["system"] == b"lnv" else 0.0  # v = 0 has no ln v
    most += 1e-11 + reading.file["window"].attrs["edge_probability"]  # beyond the lattice
    check(np.all(lost > -1e-11) and np.all(lost < most), f"{name}: probabilities of {good.sum()} outcomes sum to 1")
