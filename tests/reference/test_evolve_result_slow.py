# SPDX-License-Identifier: BSD-2-Clause
"""What a user does with a result: read it, go on from a stored state, change the propagator, meet the exit codes."""
from common import PACKET, VECTOR, check, datasets, finish, h5py, model, np, os, run, tempfile

KAPPA = np.sqrt(12 * np.pi)


def layout(folder):
    path = model(folder)
    out = os.path.join(folder, "out.h5")
    done = run("evolve", path)
    check("bounce         yes" in done.stdout, "summary names the verdict")
    with h5py.File(out) as f:
        check(f["state/psi"].dtype == np.complex128, "psi is complex in h5py")
        p = f["probability/v"][()]
        check(np.abs(np.abs(f["state/psi"][()]) ** 2 - p).max() < 1e-15, "probability is |psi|^2")
        check(np.abs(p @ f["lattice/weight"][()] - 1).max() < 1e-12, "probability sums to 1 with the weights")
        v = f["lattice/v"][()]
        check(np.abs(p @ np.abs(v) / f["moments/v_mean"][()] - 1).max() < 1e-12, "v_mean is the mean of the stored probability")
        for name in ("program", "version", "layout", "title", "command", "model_text", "settings_json", "libraries", "ranks",
                     "complete"):
            check(name in f.attrs, f"root attribute {name}")
        check(f.attrs["complete"] == 1, "complete")
        check("out.h5" in f.attrs["model_text"].decode() if isinstance(f.attrs["model_text"], bytes) else True, "model text kept")
        for group in ("moments", "bounce", "effective", "law"):
            for name, item in f[group].items():
                if not name.endswith("_error") and name not in ("turning_v", "turning_bounce", "residual"):
                    check(name + "_error" in f[group], f"{group}/{name} has an error beside it")
                check("units" in item.attrs and "long_name" in item.attrs, f"{group}/{name} has units and a long name")
    run("evolve", path, expect=4)  # exists, not overwritten
    run("evolve", path, "--force")


def quantile(v, p, level):
    """Mass of a site spread uniformly over its cell; linear inverse of the cumulative sum."""
    edges = np.concatenate([[v[0] - 2], v + 2])
    return np.interp(level, np.concatenate([[0.0], np.cumsum(p)]), edges)


def quantiles(folder):
    d = datasets(os.path.join(folder, "out.h5"))
    for s in (0, 12, 30):
        for q, level in enumerate(d["quantiles/level"]):
            want = quantile(d["lattice/v"], d["probability/v"][s], level)
            check(abs(d["quantiles/v"][s, q] / want - 1) < 1e-11, f"quantile {level} of sample {s}")


def from_file(folder):
    d = datasets(os.path.join(folder, "out.h5"))
    at = d["state/clock"][7]
    path = os.path.join(folder, "again.yaml")
    with open(path, "w", encoding="utf-8") as f:
        f.write(f"""
gravity: {{prescription: slqc}}
clock: {{kind: scalar, from: -0.4, to: 0.5, samples: 31}}
state: {{profile: file, file: out.h5, at: {at!r}}}
output: {{file: again.h5}}
""")
    run("evolve", path)
    again = datasets(os.path.join(folder, "again.h5"))
    off = np.abs(again["moments/v_mean"] / d["moments/v_mean"] - 1).max()
    check(off < 1e-9, f"a state from a file goes on as it was ({off:.1e})")
    check(abs(again["bounce/clock"] - 0.05) < 1e-9, "and bounces at the same clock value")


def propagators(folder, state, others):
    results = {}
    for name, lattice in (("modes", "{volume_max: 8000}"), *others):
        path = model(folder, propagator=name, lattice=lattice, tolerance="1.0e-9", state=state)
        out = os.path.join(folder, "p.h5")
        run("evolve", path, "-o", out, "--force")
        results[name, lattice] = datasets(out)
    one = results["modes", "{volume_max: 8000}"]
    for key, other in results.items():
        for name in ("v_mean", "v_spread", "lnv_mean", "density_mean", "hubble_mean", "momentum_mean", "dressed_a4", "theta_mean",
                     "norm"):
            x, y = one["moments/" + name], other["moments/" + name]
            allowed = one[f"moments/{name}_error"] + other[f"moments/{name}_error"]
            check((np.abs(x - y) <= allowed).all(),
                  f"{key}: {name} agrees within the stated errors (worst {np.max(np.abs(x - y) / allowed):.2f} of them)")
        check(abs(one["bounce/v"] - other["bounce/v"]) <= one["bounce/v_error"] + other["bounce/v_error"], f"{key}: bounce v")


def verdicts(folder):
    path = os.path.join(folder, "wdw.yaml")
    for branch in ("contracting", "expanding", "both"):
        with open(path, "w", encoding="utf-8") as f:
            f.write(f"""
gravity: {{prescription: wdw}}
clock: {{kind: scalar, from: -0.8, to: 0.8, samples: 33}}
state: {{profile: gaussian_momentum, momentum: 200, relative_spread: 0.08, lnv0: 5.0, at: 0.0, branch: {branch}}}
lattice: {{lnv_min: -12, lnv_max: 22, points: 2048}}
output: {{file: wdw.h5}}
""")
        run("evolve", path, "--force")
        with h5py.File(os.path.join(folder, "wdw.h5")) as f:
            verdict = f["bounce"].attrs["verdict"]
            check(verdict in (b"no", "no"), f"wdw {branch} does not bounce")
            if branch != "both":  # ln v moves at the rate kappa exactly
                sign = -1 if branch == "contracting" else 1
                phi, lnv = f["clock/value"][()], f["moments/lnv_mean"][()]
                check(np.abs(lnv - 5 - sign * KAPPA * phi).max() < 1e-11, f"wdw {branch}: ln v moves at the rate kappa")
    done = run("evolve", model(folder, prescription="wdw_lattice"), "-o", os.path.join(folder, "wl.h5"))
    check("the grid's" in done.stdout, "wdw_lattice says that the turning point is the grid's")
    run("evolve", model(folder, lattice="{volume_max: 150}"), "-o", os.path.join(folder, "small.h5"), expect=3)


with tempfile.TemporaryDirectory() as scratch:
    layout(scratch)
    quantiles(scratch)
    from_file(scratch)
    propagators(scratch, PACKET, (("chebyshev", "{volume_max: 8000}"), ("krylov", "{volume_max: 8000}"), ("chebyshev", "{points: 2000}")))
    propagators(scratch, VECTOR, (("eigenpairs", "{points: 2000}"), ("chebyshev", "{points: 2000}")))
    verdicts(scratch)
finish()
