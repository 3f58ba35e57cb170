# SPDX-License-Identifier: BSD-2-Clause
"""Graded lattices as a user meets them: what the file says of its rows, the same numbers on 1, 2 and 3 ranks, what may be done with
such a result and what may not."""
from common import check, datasets, finish, h5py, np, os, run, tempfile

MODEL = """
gravity: {{prescription: {prescription}, sector: {sector}}}
clock: {{kind: scalar, from: -0.3, to: 0.25, samples: 9}}
state: {{profile: gaussian_momentum, momentum: 40, relative_spread: 0.08, bounce_at: 0.03}}
lattice: {{layout: {layout}}}
output: {{keep: [{keep}]}}
"""
READINGS = "readings:\n  - {name: b, clock: {observable: b, instrument: sharp, bins: 8}}\n"


def write(folder, name, prescription="aps", sector=1.3, layout="graded", keep="moments, quantiles, probability, state"):
    path = os.path.join(folder, name)
    with open(path, "w", encoding="utf-8") as f:
        f.write(MODEL.format(prescription=prescription, sector=sector, layout=layout, keep=keep))
    return path


def rows(folder):
    out = os.path.join(folder, "graded.h5")
    run("evolve", write(folder, "graded.yaml"), "-o", out)
    with h5py.File(out) as f:
        v, weight, p = f["lattice/v"][()], f["lattice/weight"][()], f["probability/v"][()]
        check(f["lattice"].attrs["layout"] == b"graded", "the file says that its lattice is graded")
        plain = np.abs(v) < f["lattice"].attrs["graded_from"]
        check((weight[plain] == 1).all() and (weight[~plain] > 1).all(), "sites weigh 1, nodes more")
        check(np.abs(np.diff(v[plain & (v > 0)]) - 4).max() < 1e-12, "up to there every site has its row")
        for arm in (v > 0, v < 0):
            check(abs(weight[arm].sum() / ((f["lattice"].attrs["last_v"] - 1.3) / 4 + 1) - 1) < 1e-9,
                  "the weights count the sites of an arm")
        check(np.abs(p @ weight - 1).max() < 1e-12, "probabilities sum to 1 with the weights")
        check(np.abs(p @ (weight * np.abs(v)) / f["moments/v_mean"][()] - 1).max() < 1e-12, "and give the mean volume")
        check(np.abs(np.abs(f["state/psi"][()]) ** 2 - p).max() < 1e-15, "a stored state is psi at the rows")


def ranks(folder):
    one = datasets(os.path.join(folder, "graded.h5"))
    for n in (2, 3):
        out = os.path.join(folder, f"r{n}.h5")
        run("evolve", os.path.join(folder, "graded.yaml"), "-o", out, ranks=n)
        other, worst, where = datasets(out), 0.0, ""
        for name, value in one.items():
            if name.endswith("_error") or name.startswith("budget/") or name == "law/residual":
                continue
            value, theirs = np.asarray(value), np.asarray(other[name])
            finite = np.isfinite(value)
            check(np.array_equal(finite, np.isfinite(theirs)), f"{name}: NaN in the same places on {n} ranks")
            if not finite.any():
                continue
            scale = np.abs(value[finite]).max() or 1.0
            limit = one.get(name + "_error")
            allowed = 1e-12 if limit is None else 1e-12 + 2 * np.nanmax(np.abs(limit)) / scale
            off = np.abs(value[finite] - theirs[finite]).max() / scale / allowed
            worst, where = max((worst, where), (off, name))
        check(worst <= 1, f"{n} ranks give the same numbers ({where}: {worst:.2g} of what is allowed)")


def uses(folder):
    graded, readings = os.path.join(folder, "graded.h5"), os.path.join(folder, "readings.yaml")
    with open(readings, "w", encoding="utf-8") as f:
        f.write(READINGS)
    run("show", graded)
    done = run("relate", graded, readings, "-o", os.path.join(folder, "x.h5"), expect=2)
    check("lattice.layout full" in done.stderr, "what needs every site is refused on a lattice that was graded on demand")
    path = os.path.join(folder, "file.yaml")
    with open(path, "w", encoding="utf-8") as f:
        f.write("clock: {from: -0.1, to: 0.1}\nstate: {profile: file, file: graded.h5, at: -0.3}\n")
    done = run("evolve", path, expect=4)
    check("graded lattice, not on every site" in done.stderr, "a state on a graded lattice is no start")
    auto = os.path.join(folder, "auto.h5")
    run("evolve", write(folder, "auto.yaml", prescription="slqc", sector=4, layout="auto", keep="moments"), "-o", auto)
    with h5py.File(auto) as f:
        check(f["lattice"].attrs["layout"] == b"graded", "auto grades where no states are kept")
    done = run("relate", auto, readings, "-o", os.path.join(folder, "y.h5"), expect=1)
    with h5py.File(os.path.join(folder, "y.h5")) as f:
        check(f.attrs["complete"] == 1, "readings of such a result are evolved on the full lattice")


with tempfile.TemporaryDirectory() as scratch:
    rows(scratch)
    ranks(scratch)
    uses(scratch)
finish()
