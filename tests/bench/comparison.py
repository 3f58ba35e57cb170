# SPDX-License-Identifier: BSD-2-Clause
"""Ratios in one run on the same work: the state at the end of a clock range whose lattice reaches v = 1e4, 1e5, 1e6.

Modes against PETSc TS and SLEPc MFN (comparison.c) and scipy.sparse.linalg.expm_multiply on the same first-order system.
Processor time, one thread. The others are measured over a part of the clock range and scaled by it: the column
`extrapolated` says by how much. `state off` is the distance from the modes at the end of that part, relative to the norm;
1e-8 is asked of all. Takes about two minutes.
Arguments: largest volumes, if not these. $EBB_BENCH: folder of bench_comparison. Asserts nothing."""
import os
import resource
import subprocess
import sys
import tempfile
import time

import numpy as np
from scipy.sparse import bmat, diags, identity
from scipy.sparse.linalg import expm_multiply

PROGRAM = os.path.join(os.environ.get("EBB_BENCH", "build/tests"), "bench_comparison")
EBBTURN = os.environ.get("EBBTURN", "build/ebbturn")
NAMES = (("ts", "PETSc TS, RK 5(4) adaptive"), ("mfn", "SLEPc MFN, exp times vector"), ("scipy", "scipy expm_multiply"),
         ("krylov", "ebbturn's own krylov"), ("chebyshev", "ebbturn's own chebyshev"))


def by_scipy(folder, found):
    """exp(t A) on real and imaginary part together; adds its seconds and its distance to found."""
    diagonal, link, psi, root, after = (np.fromfile(os.path.join(folder, name))
                                        for name in ("diagonal", "link", "psi", "root", "after"))
    r, t = found["root"], found["scipy_part"]
    theta = diags([link[:-1], diagonal, link[:-1]], [-1, 0, 1])
    system = bmat([[None, r * identity(len(diagonal))], [-theta / r, None]], format="csr")
    start_psi, start_w = psi.view(complex), 1j * root.view(complex) / r
    vectors = np.concatenate([start_psi, start_w])
    vectors = np.stack([vectors.real, vectors.imag], axis=1)
    start = time.process_time()
    end = expm_multiply(t * system, vectors, traceA=0.0)
    found["scipy_seconds"] = time.process_time() - start
    found["scipy_off"] = np.linalg.norm((end[:, 0] + 1j * end[:, 1])[:len(diagonal)] - after.view(complex))


def whole_program(folder, clock):
    """Processor time of `ebbturn evolve` on the same state and clock range, graded lattice, with every error bar."""
    path = os.path.join(folder, "model.yaml")
    with open(path, "w", encoding="utf-8") as f:
        f.write(f"clock: {{from: 0, to: {clock!r}, samples: 21}}\nlattice: {{layout: graded}}\noutput: {{keep: [moments]}}\n"
                "state: {profile: gaussian_momentum, momentum: 50, relative_spread: 0.1}\n")
    before = resource.getrusage(resource.RUSAGE_CHILDREN)
    subprocess.run([EBBTURN, "evolve", path, "-o", os.path.join(folder, "out.h5")], check=False, capture_output=True)
    after = resource.getrusage(resource.RUSAGE_CHILDREN)
    return after.ru_utime + after.ru_stime - before.ru_utime - before.ru_stime


def duration(seconds):
    for unit, size in (("d", 86400.0), ("h", 3600.0), ("s", 1.0)):
        if seconds >= size:
            return f"{seconds / size:.3g} {unit}"
    return f"{seconds:.3g} s"


def compare(v_max):
    with tempfile.TemporaryDirectory() as folder:
        done = subprocess.run([PROGRAM, repr(v_max), folder], check=True, capture_output=True, text=True)
        found = {name: float(value) for name, value in (line.split() for line in done.stdout.splitlines())}
        by_scipy(folder, found)
        graded = whole_program(folder, found["clock"])
    print(f"\nv_max = {found['v_max']:.3e}: {found['sites']:.0f} sites, {found['modes']:.0f} modes, "
          f"clock 0 to {found['clock']:.3f}, sqrt(Theta_max) t = {found['root'] * found['clock']:.2e}")
    print(f"  {'modes, plan and normalisation included':40s} {duration(found['state_seconds']):>10s}   "
          f"({found['samples']:.0f} states with all their sums: {duration(found['samples_seconds'])})")
    print(f"  {'ebbturn evolve, graded lattice, errors':40s} {duration(graded):>10s}   (the whole program, from its start)")
    print(f"  {'':40s} {'whole range':>10s}   {'times modes':>11s}   extrapolated   state off   steps in the part")
    for key, title in NAMES:
        factor = found["clock"] / found[f"{key}_part"]
        whole = factor * found[f"{key}_seconds"]
        scaled = f"x {factor:.3g}" if factor > 1.001 else "no"
        steps = f"{found[key + '_steps']:.0f}" if key + "_steps" in found else ""
        print(f"  {title:40s} {duration(whole):>10s}   {whole / found['state_seconds']:11.3g}   {scaled:>12s}   "
              f"{found[key + '_off']:9.1e}   {steps}", flush=True)


for largest in [float(a) for a in sys.argv[1:]] or [1e4, 1e5, 1e6]:
    compare(largest)
