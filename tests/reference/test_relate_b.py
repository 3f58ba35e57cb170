# SPDX-License-Identifier: BSD-2-Clause
"""A clock that reads b: numbers of `relate` against dense matrices, against recorded digits, and its own laws."""
import relational_reference as reference
from common import check, datasets, finish, h5py, np, os, run, tempfile

MODEL = """
clock: {{kind: scalar, from: -{window}, to: {window}, samples: {samples}}}
state: {{profile: gaussian_volume, v0: 96, spread: 12, b0: 1.5707963267948966{more}}}
lattice: {{points: 512}}
output: {{keep: {keep}}}
"""
READINGS = """
readings:
  - {name: power, clock: {observable: b, instrument: cosine_power, power: 64, centres: 96}}
  - {name: sharp, clock: {observable: b, instrument: sharp, bins: 16}}
  - {name: cosine, clock: {observable: b, instrument: cosine, bins: 16}}
  - {name: wide, clock: {observable: b, instrument: cosine, bins: 12}}
"""
# Recorded digits of an independent program with FFTs and cumulative sums, relative tolerance 1e-10; the dense matrices below
# give the same to 11 digits or more.
RECORDED = {
    ("power", 24): dict(dwell=0.00750261648044, median=134.815263738, mean=135.747796281, spread=23.9420242451, leak=6.00019185455e-11),
    ("power", 47): dict(dwell=0.00535110959611, median=96.053520457, mean=96.0580715105, spread=16.5144505269, leak=4.74266103074e-09),
    ("sharp", 4): dict(dwell=0.0415250139743, median=125.137436184, mean=139.825961226, leak=0.0265194271261, purity=0.738359203152),
    ("sharp", 7): dict(dwell=0.0321846063962, median=97.4028948622, mean=113.235033396, leak=0.0362278851152, purity=0.818976264558),
    ("cosine", 4): dict(dwell=0.0416163079973, median=124.608591134, mean=124.957086945, leak=0.000170518827449,
                        purity=0.661563681654, spread=23.4892545012),
    ("cosine", 7): dict(dwell=0.0322148276571, median=96.328943081, mean=96.4144893938, leak=0.000369033101977,
                        purity=0.754115895363, spread=19.8619260293),
    ("wide", 3): dict(spread=21.5736432164),
    ("wide", 5): dict(spread=17.0334645574),
}
ATTRIBUTES = {
    ("sharp", "back_action"): 0.116466755635, ("sharp", "order_violation"): 0.16674395539,
    ("cosine", "back_action"): 0.0447747786538, ("cosine", "order_violation"): 0.109695030506,
    ("power", "resolution"): 0.0880442088934, ("power", "back_action_spread"): 11.3581633205,
}
PRINTED = 1e-10  # relative: the digits recorded


def make(folder, name, window=0.4, samples=161, keep="[state]", more=""):
    model, result = os.path.join(folder, name + ".yaml"), os.path.join(folder, name + ".h5")
    with open(model, "w", encoding="utf-8") as f:
        f.write(MODEL.format(window=window, samples=samples, keep=keep, more=more))
    run("evolve", model, "-o", result)
    return result


def relate(folder, result, text, out, expect, **more):
    readings, path = os.path.join(folder, out + ".yaml"), os.path.join(folder, out + ".h5")
    with open(readings, "w", encoding="utf-8") as f:
        f.write(text)
    return path, run("relate", result, readings, "-o", path, "--force", expect=expect, **more)


def compare(f):
    for (name, outcome), numbers in RECORDED.items():
        for key, wanted in numbers.items():
            found = f[f"relational/{name}/{key}"][outcome]
            check(abs(found / wanted - 1) < PRINTED, f"{name} {outcome} {key}: {found:.12g}, recorded {wanted:.12g}")
    for (name, key), wanted in ATTRIBUTES.items():
        found = f["relational/" + name].attrs[key]
        check(abs(found / wanted - 1) < PRINTED, f"{name} {key}: {found:.12g}, recorded {wanted:.12g}")
    universe, ring = reference.Universe(512), reference.Ring(512)
    for name, outcome, window in (("power", 47, ring.cosine_power(64, 96, 47)), ("sharp", 4, ring.sharp(16, 4)),
                                  ("cosine", 7, ring.cosine(16, 7))):
        dense = reference.conditional(universe, ring, window)
        for key in ("dwell", "median", "mean", "leak"):
            found = f[f"relational/{name}/{key}"][outcome]
            check(abs(found - dense[key]) < 1e-10 * max(abs(dense[key]), 1e-6),  # rounding: eigh of 512 sites
                  f"{name} {outcome} {key}: {found:.13g}, dense matrices {dense[key]:.13g}")


def laws(f):
    for name, group in f["relational"].items():
        for key in ("identity_probability", "identity_dwell", "identity_action"):
            check(abs(group.attrs[key]) < 1e-12, f"{name} {key}: {group.attrs[key]:.1e}")  # rounding: 1000 sites x 161 samples
        status = [text.decode() for text in group["status"][()]]
        good = np.array([text == "ok" for text in status])
        check(not good[0] and not good[-1] and good[len(good) // 2], f"{name}: outcomes at 0 and pi are refused: {status[0]}")
        check(np.all(np.isnan(group["median"][()][~good])) and np.all(np.isfinite(group["dwell"][()])),
              f"{name}: refused outcomes have no median and keep their dwell")
        check(np.all(np.isfinite(group["median"][()][good])), f"{name}: the others have one")
        p = group["probability"][()]
        check(np.allclose(p[good].sum(axis=1), 1, atol=1e-12), f"{name}: probabilities sum to 1")


def shift(one, other, good):
    """Largest total variation between rows."""
    return 0.5 * np.abs(one[good] - other[good]).sum(axis=1).max()


def twirl(folder, result):
    """P(v|b) depends on |c(E)|^2 alone, and is symmetric about pi/2 for every state."""
    text = "readings:\n  - {name: c, clock: {observable: b, instrument: cosine, bins: 16}}\n"
    base, _ = relate(folder, result, text, "base", 1)
    with h5py.File(base) as f:
        p, good = f["relational/c/probability"][()], f["relational/c/window_error"][()] < 1e-7
        good &= np.array([s == b"ok" for s in f["relational/c/status"][()]])
        good &= good[::-1]
        check(good.sum() >= 8, f"{good.sum()} outcomes whose window error is below 1e-7")
        check(shift(p, p[::-1], good) < 1e-7, f"time reversal: P(v|b) = P(v|pi - b) to {shift(p, p[::-1], good):.1e}")
    # the same packet 0.02 later: another state at every parameter value, the same distribution of energies
    late = make(folder, "late", more=", at: 0.02")
    path, _ = relate(folder, late, text, "late_c", 1)
    with h5py.File(path) as f:
        q = f["relational/c/probability"][()]
        check(shift(p, q, good) < 1e-7, f"shifted in time: total variation {shift(p, q, good):.1e}")
        check(shift(q, q[::-1], good) < 1e-7, f"shifted in time, and still symmetric: {shift(q, q[::-1], good):.1e}")


def truncated(folder):
    """A window that is too short does not announce itself; the estimate does."""
    text = "window: {{from: -{0}, to: {0}, samples: {1}}}\nreadings:\n" \
           "  - {{name: c, clock: {{observable: b, instrument: cosine, bins: 16}}}}\n"
    result = make(folder, "short", window=0.2, samples=81, keep="[state]")
    for window, samples, median in ((0.2, 81, 124.61), (0.1, 41, None), (0.048, 25, None), (0.024, 25, None)):
        path, done = relate(folder, result, text.format(window, samples), f"short{samples}_{window}", 1)
        with h5py.File(path) as f:
            group = f["relational/c"]
            status, error = group["status"][4].decode(), group["window_error"][4]
            check((status == "ok") == (median is not None), f"window {window}: bin 4 {status}, estimate {error:.2g}")
            check("window" in done.stderr, f"window {window}: said on stderr")
            if median is None:
                check(error > 1e-3 and "window" in status, f"window {window}: the reason names the window")
            else:
                check(abs(group["median"][4] - median) < 0.005, f"window {window}: median {group['median'][4]:.2f}")


def orientation(folder, result):
    """b > pi/2 while the universe contracts, and the Hubble rate is negative. What integrates over the whole life cannot tell."""
    text = "window: {{from: {0}, to: {1}, samples: 41, tolerance: 1}}\nreadings:\n" \
           "  - {{name: power, clock: {{observable: b, instrument: cosine_power, power: 64, centres: 96}}}}\n" \
           "  - {{name: sharp, clock: {{observable: b, instrument: sharp, bins: 16}}}}\n" \
           "  - {{name: hubble, clock: {{observable: hubble, instrument: sharp, bins: 16}}}}\n" \
           "  - {{name: v, clock: {{observable: v, instrument: sharp, from: 120, to: 160, bins: 1}}, system: {{observable: b, bins: 2}}}}\n"
    for low, high, contracting in ((-0.3, -0.1, True), (0.1, 0.3, False)):
        path, _ = relate(folder, result, text.format(low, high), f"side{contracting}", 1)
        with h5py.File(path) as f:
            for name, sign in (("power", 1), ("sharp", 1), ("hubble", -1)):
                dwell = f[f"relational/{name}/dwell"][()]
                half = len(dwell) // 2
                upper = dwell[half:].sum() / dwell.sum()
                check((upper > 0.97) == (contracting == (sign > 0)) and (upper < 0.03) != (contracting == (sign > 0)),
                      f"{name}, {'contracting' if contracting else 'expanding'}: {upper:.4f} of the dwell in the upper half")
            p = f["relational/v/probability"][0]
            check((p[1] > 0.97) == contracting and (p[0] > 0.97) != contracting, f"P(b|v) on one side: {p}")


def without_time(f):
    """The same probabilities without any integral: N = 2 pi sum_j g_j p_j <j|M^+ P_Q M|j>, g the density of levels."""
    universe, ring = reference.Universe(512), reference.Ring(512)
    weight, omega = np.abs(universe.c)**2, universe.omega
    spacing = np.gradient(omega)
    spacing[2:-2] = (omega[:-4] - 8 * omega[1:-3] + 8 * omega[3:-1] - omega[4:]) / 12
    used = weight > 1e-13
    for outcome in (5, 7):
        mass, _ = ring.read(ring.cosine(16, outcome), universe.mode[:, used])
        mass = mass @ (2 * np.pi * weight[used] / spacing[used])
        p = f["relational/cosine/probability"][outcome]
        off = 0.5 * np.abs(mass / mass.sum() - p).sum()  # truncation: the density of levels by a difference of 4th order
        check(off < 1e-5, f"bin {outcome}: no time integral, the same P: {off:.1e}")
        check(abs(mass.sum() / f["relational/cosine/dwell"][outcome] - 1) < 5e-5, f"bin {outcome}: and the same dwell")


def lengths(folder):
    """Sharp and cosine windows reach far in v, and see the clock's values one by one: error bars hold what a lattice without
    an end would change. b on cells of the circle, sin^2 b by the operator's eigenvalues on the sites that there are."""
    text = "window: {tolerance: 1}\nreadings:\n" \
           "  - {name: sharp, clock: {observable: b, instrument: sharp, bins: 14}}\n" \
           "  - {name: cosine, clock: {observable: b, instrument: cosine, bins: 14}}\n" \
           "  - {name: sin2, clock: {observable: sin2_b, instrument: cosine, bins: 12}}\n"
    found = []
    for points in (512, 651, 1400):
        name = f"length{points}"
        with open(os.path.join(folder, name + ".yaml"), "w", encoding="utf-8") as f:
            f.write(MODEL.format(window=0.3, samples=41, keep="[state]", more="").replace("points: 512", f"points: {points}"))
        run("evolve", os.path.join(folder, name + ".yaml"), "-o", os.path.join(folder, name + ".h5"))
        path, _ = relate(folder, os.path.join(folder, name + ".h5"), text, name + "_r", 1)
        with h5py.File(path) as f:
            found.append({k: (f[f"relational/{k}/median"][()], f[f"relational/{k}/median_error"][()]) for k in f["relational"]})
    for few in found[:2]:
        for name, (median, error) in few.items():
            other, error_other = found[2][name]
            good = np.isfinite(median) & np.isfinite(other)
            pull = (np.abs(median - other) / (error + error_other))[good]
            check(good.sum() >= 10 and pull.max() < 1.0, f"{name}: a longer lattice moves medians by {pull.max():.2f} of their errors")


with tempfile.TemporaryDirectory() as folder:
    result = make(folder, "run")
    path, _ = relate(folder, result, READINGS, "stored", 1)
    with h5py.File(path) as f:
        compare(f)
        laws(f)
        without_time(f)
        check(f.attrs["states"] == b"from the result" or f.attrs["states"] == "from the result", "stored states are used")
    bare = make(folder, "bare", keep="[moments]")
    again, _ = relate(folder, bare, READINGS, "again", 1)
    one, other = datasets(path), datasets(again)
    check(all(np.array_equal(one[k], other[k], equal_nan=one[k].dtype.kind == "f") for k in one if "error" not in k),
          "evolved again from the model, the numbers are the same")
    orientation(folder, result)
    twirl(folder, result)
    truncated(folder)
    lengths(folder)
finish()
