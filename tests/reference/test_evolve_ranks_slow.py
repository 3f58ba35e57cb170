# SPDX-License-Identifier: BSD-2-Clause
"""evolve on 1, 2 and 3 ranks gives the same numbers to rounding; two equal runs give the same bytes."""
from common import PACKET, check, datasets, finish, h5py, model, np, os, run, tempfile

# numbers that measure rounding itself differ from rank count to rank count by their own size
NOISE = ("_error", "budget/", "law/residual")
CASES = [("slqc", 4, "auto"), ("slqc", 4, "auto", "full"), ("aps", 1, "auto", "full"), ("aps", 1, "auto"), ("mmo", 1.5, "auto"), ("slqc", 4, "chebyshev"), ("aps", 1.0, "chebyshev"),
         ("smmo", 3, "krylov")]


def compare(folder, prescription, sector, propagator, layout="graded"):
    # stepping propagators keep to a small lattice: their cost grows with its square
    small = propagator in ("chebyshev", "krylov")
    path = model(folder, prescription=prescription, sector=sector, propagator=propagator,
                 lattice="{volume_max: 2400}" if small else f"{{layout: {layout}}}", tolerance="1.0e-9" if small else "1.0e-10",
                 state=PACKET.replace("spread: 0.08", "spread: 0.12") if small else PACKET)
    results = []
    for ranks in (1, 2, 3):
        out = os.path.join(folder, f"r{ranks}.h5")
        run("evolve", path, "-o", out, "--force", ranks=ranks)
        results.append(datasets(out))
    for ranks, other in zip((2, 3), results[1:]):
        worst, where = 0.0, ""
        check(results[0].keys() == other.keys(), f"{prescription} {sector} {propagator}: same datasets on {ranks} ranks")
        for name, value in results[0].items():
            if any(word in name for word in NOISE):
                continue
            value, theirs = np.asarray(value), np.asarray(other[name])
            finite = np.isfinite(value)
            if not np.array_equal(finite, np.isfinite(theirs)):
                check(False, f"{name}: NaN in other places on {ranks} ranks")
                continue
            if not finite.any():
                continue
            scale = np.abs(value[finite]).max() or 1.0
            off = np.abs(value[finite] - theirs[finite]).max() / scale
            limit = results[0].get(name + "_error")
            # a stated error covers what rounding does to a badly conditioned number (a spread, a flat minimum)
            allowed = 1e-12 if limit is None else 1e-12 + 2 * np.nanmax(np.abs(limit)) / scale
            if off > allowed and off > worst:
                worst, where = off, name
        check(worst == 0.0, f"{prescription} {sector} {propagator}: {ranks} ranks agree to rounding {where} {worst:.1e}")


def equal_bytes(folder):
    path = model(folder)
    for ranks in (1, 2):
        outs = [os.path.join(folder, f"same{i}.h5") for i in range(2)]
        for out in outs:
            run("evolve", path, "-o", os.path.join(folder, "same.h5"), "--force", ranks=ranks)
            os.replace(os.path.join(folder, "same.h5"), out)
        a, b = datasets(outs[0]), datasets(outs[1])
        check(all(np.asarray(a[k]).tobytes() == np.asarray(b[k]).tobytes() for k in a), f"equal bytes twice on {ranks} ranks")
        with h5py.File(outs[0]) as f, h5py.File(outs[1]) as g:
            same = all(np.array_equal(f.attrs[k], g.attrs[k]) for k in f.attrs)
        check(same, f"equal root attributes twice on {ranks} ranks")


with tempfile.TemporaryDirectory() as scratch:
    for case in CASES:
        compare(scratch, *case)
    equal_bytes(scratch)
finish()
