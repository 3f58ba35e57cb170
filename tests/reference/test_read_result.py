#!/usr/bin/env python3
# SPDX-License-Identifier: BSD-2-Clause
"""Other programs read a result: h5py (complex numbers, scales, texts), a netCDF-style reader where there is one, the
loader of scripts/, and json for `show --json`. Program: $EBBTURN. Tolerance: none; what was stored is what is read, and
sums over sites are held to rounding (1e-12 for some thousand terms of size 1 and less)."""
import json
import os
import subprocess
import sys
import tempfile

import h5py
import numpy as np

HERE = os.path.dirname(os.path.abspath(__file__))
sys.path.insert(0, os.path.join(HERE, "..", "..", "scripts"))
from ebbturn_result import Result  # noqa: E402

MODEL = """title: readers' test γ
gravity: {prescription: slqc, immirzi: 0.2375, sector: 4.0}
clock: {kind: scalar, from: -0.2, to: 0.2, samples: 9}
state: {profile: gaussian_momentum, momentum: 100.0, relative_spread: 0.05, bounce_at: 0.0}
output: {keep: [moments, quantiles, probability, state], every: 4, quantiles: [0.05, 0.5, 0.95]}
"""
ROUNDING = 1e-12
failures = []


def expect(truth, what):
    print("PASS" if truth else "FAIL", what)
    if not truth:
        failures.append(what)


def run(*arguments):
    return subprocess.run([os.environ["EBBTURN"], *arguments], capture_output=True, text=True)


def check_h5py(path):
    with h5py.File(path, "r") as f:
        psi, p = f["state/psi"], f["probability/v"]
        expect(psi.dtype == np.complex128, "h5py reads /state/psi as complex128")
        expect(isinstance(f["complex128"], h5py.Datatype), "the complex type is named in the root")
        every = p[::4]
        expect(np.allclose(np.abs(psi[()]) ** 2, every, rtol=1e-9, atol=1e-300), "|psi|^2 is the stored probability")
        expect(np.all(np.abs((p[()] * f["lattice/weight"][()]).sum(axis=1) - 1) < 1e-9), "probabilities sum to 1")
        for name in ("moments/v_mean", "effective/v", "probability/v", "quantiles/v"):
            expect(f[name].dims[0][0] == f["clock/value"], f"first scale of /{name} is /clock/value")
        expect(p.dims[1][0] == f["lattice/v"], "second scale of /probability/v is /lattice/v")
        expect(psi.dims[0][0] == f["state/clock"], "first scale of /state/psi is /state/clock")
        bare = []
        f.visititems(lambda n, o: bare.append(n) if isinstance(o, h5py.Dataset) and "/" in n
                     and not ("units" in o.attrs and "long_name" in o.attrs) else None)
        expect(not bare, f"every dataset has units and long_name {bare}")
        title = f.attrs["title"].decode("utf-8")
        expect(title == "readers' test γ", "title is UTF-8")


def check_xarray(path):
    try:
        import xarray
        import h5netcdf  # noqa: F401
    except ImportError as missing:
        print(f"SKIP netCDF-style reading: no module '{missing.name}'")
        return
    with h5py.File(path, "r") as f:
        groups = ["/"]
        f.visititems(lambda n, o: groups.append(n) if isinstance(o, h5py.Group) else None)
    for group in groups:
        if group == "state":  # complex numbers: promised to h5py only
            continue
        try:
            with xarray.open_dataset(path, engine="h5netcdf", group=group) as data:
                data.load()
                expect(not any("phony" in str(d) for d in data.sizes), f"h5netcdf opens {group}, dimensions {dict(data.sizes)}")
        except Exception as reason:  # whatever it raises is the finding
            expect(False, f"h5netcdf opens {group}: {type(reason).__name__} {reason}")


def check_loader(path):
    r = Result(path)
    expect(r.complete and r.settings["gravity"]["prescription"] == "slqc", "loader: completeness and settings")
    expect(r["state/psi"].dtype == np.complex128 and np.isnan(r["no/such"]), "loader: arrays, NaN where missing")
    expect(0 <= r.error("bounce/v") < 1e-3 * r["bounce/v"], "loader: error beside the value")


def check_show(path):
    shown = json.loads(run("show", path, "--json").stdout)
    with h5py.File(path, "r") as f:
        expect(shown["bounce"]["v"] == f["bounce/v"][()], "show --json gives every digit")
        expect(shown["attributes"]["title"] == f.attrs["title"].decode(), "show --json gives the title")
        for d in shown["datasets"]:
            if tuple(d["shape"]) != f[d["path"]].shape:
                expect(False, f"shape of {d['path']}")
        found = []
        f.visititems(lambda n, o: found.append("/" + n) if isinstance(o, h5py.Dataset) and "/" in n else None)
        expect(sorted(found) == [d["path"] for d in shown["datasets"]], "show --json lists every dataset")


def main():
    with tempfile.TemporaryDirectory() as folder:
        model, path = os.path.join(folder, "model.yaml"), os.path.join(folder, "result.h5")
        with open(model, "w", encoding="utf-8") as f:
            f.write(MODEL)
        done = run("evolve", model, "-o", path)
        expect(done.returncode == 0, f"evolve: {done.returncode} {done.stderr}")
        if done.returncode == 0:
            check_h5py(path)
            check_xarray(path)
            check_loader(path)
            check_show(path)
    return bool(failures)


if __name__ == "__main__":
    sys.exit(main())
