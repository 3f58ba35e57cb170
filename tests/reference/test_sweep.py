#!/usr/bin/env python3
# SPDX-License-Identifier: BSD-2-Clause
"""Sweeps: the table against closed forms, against single runs, killed and resumed, extended, with a case that fails, with
clocks that are read, and on two ranks. Program: $EBBTURN. Tolerances: the errors that the table states (a stated error that is too small is a bug), and
rounding, 1e-13, for the slope of a massless flat model, which is 1 identically: V = 2 pi gamma lambda G v, and the state in
v does not know lambda."""
import csv
import math
import os
import signal
import subprocess
import tempfile
import time

import h5py
import numpy as np
from common import MPIEXEC, PROGRAM, check, finish

ROUNDING = 1e-13
BASE = """title: flat
gravity: {prescription: slqc}
clock: {kind: scalar, from: -0.2, to: 0.2, samples: 11}
state: {profile: gaussian_momentum, momentum: 100.0, relative_spread: 0.1}
output: {keep: [moments, quantiles]}
"""
PLAN = """base: flat.yaml
vary:
  gravity.polymer_scale: {{from: 0.5, to: 8.0, count: 3, spacing: log}}
  gravity.prescription: [slqc, aps]
  state.momentum: {momenta}
{more}output: {{file: scales.h5}}
"""


def sweep(folder, *arguments, ranks=0, expect=0):
    command = ([MPIEXEC, "-n", str(ranks)] if ranks else []) + [PROGRAM, "sweep", *arguments]
    done = subprocess.run(command, cwd=folder, capture_output=True, text=True, timeout=110, stdin=subprocess.DEVNULL, check=False)
    check(done.returncode == expect, f"sweep {' '.join(arguments)}: exit {done.returncode}, expected {expect} {done.stderr}")
    return done


def prepare(top, name, momenta="[150, 200]", more=""):
    folder = os.path.join(top, name)
    os.makedirs(folder, exist_ok=True)
    for file, text in (("flat.yaml", BASE), ("plan.yaml", PLAN.format(momenta=momenta, more=more))):
        with open(os.path.join(folder, file), "w", encoding="utf-8") as f:
            f.write(text)
    return folder


def table(folder, name="scales.h5"):
    with h5py.File(os.path.join(folder, name)) as f:
        return {k: v[()] for k, v in f["sweep"].items()}, {k: v[()] for k, v in f["provenance"].items()}


def closed_form(p):
    """R = exp(kappa^2/8 sigma^2) <sqrt(k^2 + 1/4)>/<k> over a Gaussian |c|^2 (bounce-symmetric packet, solvable ordering)."""
    kappa, sigma = math.sqrt(12 * math.pi), 0.1 * p
    x, w = np.polynomial.hermite.hermgauss(60)
    k = (p + math.sqrt(2) * sigma * x) / kappa
    return math.exp(kappa**2 / (8 * sigma**2)) * np.sum(w * np.sqrt(k * k + 0.25)) / np.sum(w * k)


def numbers(top):
    folder = prepare(top, "whole")
    sweep(folder, "plan.yaml", "--csv", "table.csv")
    t, _ = table(folder)
    check(len(t["bounce_v"]) == 12 and np.all(t["status"] == b"done") and np.all(t["verdict"] == b"yes"), "twelve cases, all done")
    worst = np.max(np.abs(t["slope"] - 1))
    check(worst < ROUNDING and np.nanmax(np.abs(t["slope_local"] - 1)) < ROUNDING, f"slopes are 1 to rounding ({worst:.1e})")
    for p in (150, 200):
        here = (t["gravity.prescription"] == b"slqc") & (t["state.momentum"] == p)
        off = np.abs(t["bounce_ratio"][here] - closed_form(p)) / t["bounce_ratio_error"][here]
        # exact up to the Gaussian's weight below k = 0, exp(-50), at k0 = 10 sigma_k
        check(here.sum() == 3 and off.max() < 1, f"the ratio to the effective bounce is the closed form, to {off.max():.2g} errors")
    with open(os.path.join(folder, "table.csv"), newline="", encoding="utf-8") as f:
        rows = list(csv.DictReader(f))
    check([float(r["bounce_volume"]) for r in rows] == list(t["bounce_volume"]), "the csv holds the same digits")
    subprocess.run([PROGRAM, "evolve", "flat.yaml", "--set", "gravity.polymer_scale=2", "--set", "gravity.prescription=aps",
                    "--set", "state.momentum=150", "-o", "one.h5"], cwd=folder, check=True, capture_output=True)
    with h5py.File(os.path.join(folder, "one.h5")) as f:
        here = (t["gravity.prescription"] == b"aps") & (t["state.momentum"] == 150) & (t["gravity.polymer_scale"] == 2)
        check(t["bounce_v"][here] == f["bounce/v"][()], "a case equals a run of evolve bit for bit")
    return folder, t


def interrupted(top, reference):
    folder = prepare(top, "killed")
    kills = 0
    for attempt in range(8):
        journal = any("journal" in n for n in os.listdir(folder))
        process = subprocess.Popen([PROGRAM, "sweep", "plan.yaml", *(("--resume", "scales.h5") if journal else ())], cwd=folder,
                                   stdout=subprocess.DEVNULL, stderr=subprocess.PIPE, text=True)
        before = sum(os.path.getsize(os.path.join(folder, n)) for n in os.listdir(folder) if "journal" in n)
        while attempt < 3 and process.poll() is None:  # until two or three more cases are in the journal
            if sum(os.path.getsize(os.path.join(folder, n)) for n in os.listdir(folder) if "journal" in n) > before + 7000:
                process.send_signal((signal.SIGKILL, signal.SIGUSR1, signal.SIGKILL)[attempt])
                break
            time.sleep(0.002)
        _, err = process.communicate(timeout=110)
        kills += process.returncode != 0
        if process.returncode == 0:
            break
        check(process.returncode in (-signal.SIGKILL, 75), f"stopped: {process.returncode} {err}")
        if process.returncode == 75:
            check(err.strip().splitlines()[-1].endswith("'ebbturn sweep plan.yaml --resume scales.h5'"), "the last line says how to go on")
    t, p = table(folder)
    check(kills == 3, f"the sweep was stopped {kills} times")
    check(all(np.array_equal(t[k], reference[k], equal_nan=t[k].dtype.kind == "f") for k in reference), "the table is that of an uninterrupted sweep, bit for bit")
    check(p["case_attempts"].sum() <= 12 + kills and p["case_attempts"].min() == 1, f"no finished case ran again: {p['case_attempts']}")
    prepare(top, "killed", "[150, 200, 250]")
    sweep(folder, "plan.yaml", expect=4)
    sweep(folder, "plan.yaml", "--resume", "scales.h5")
    t, later = table(folder)
    old = t["state.momentum"] < 250
    check(len(old) == 18 and np.array_equal(later["case_finished"][old], p["case_finished"]) and
          np.array_equal(later["case_attempts"][old], p["case_attempts"]), "an extended plan runs its new cases only")
    prepare(top, "killed", "[150, 250]")
    done = sweep(folder, "plan.yaml", "--resume", "scales.h5", expect=2)
    check("6 finished cases" in done.stderr, "a plan that lost cases is refused")


def failures(top):
    folder = prepare(top, "fails", "[150]", "  lattice.volume_max: [10, 20000]\n")
    done = sweep(folder, "plan.yaml", expect=1)
    t, _ = table(folder)
    few = t["lattice.volume_max"] == 10
    check(np.all(t["status"][few] == b"failed") and all(b"sites" in r for r in t["reason"][few]), f"a case that fails says why: {t['reason'][0]}")
    check(np.all(t["status"][~few] == b"done") and np.all(np.isnan(t["bounce_v"][few])) and "6 done" in done.stdout, "and the rest goes on")
    with open(os.path.join(folder, "bad.yaml"), "w", encoding="utf-8") as f:
        f.write("base: flat.yaml\nvary:\n  state.momentm: [1, 2]\n  gravity.immirzi: [0.2, -1]\narange: grid\n")
    done = sweep(folder, "bad.yaml", expect=2)
    check(all(s in done.stderr for s in ("3 problems", "line 3", "'state.momentum'", "line 4", "gravity.immirzi = -1", "'arrange'")),
          f"a plan's problems are told together: {done.stderr}")


CLOCKS = """window: {from: -0.2, to: 0.2, tolerance: 1.0e-2}
readings:
  - {name: b_fine, clock: {observable: b, instrument: cosine_power, power: 20, centres: 24}}
  - {name: never, clock: {observable: b, instrument: sharp, bins: 2}}
histories: {v_star: [30, 60.5], at: [-0.15, 0.2]}
propagator: {at: [-0.1, 0.1], first: [40, 80], clock: {spread: 0.02, half_width: 0.01}}
"""
READ = """base: flat.yaml
readings: clocks.yaml
vary:
  state.momentum: {momenta}
  gravity.prescription: [slqc, aps]
{more}output: {{file: scales.h5}}
"""


def prepare_readings(folder, momenta, more="", clocks=CLOCKS):
    for file, text in (("clocks.yaml", clocks), ("read.yaml", READ.format(momenta=momenta, more=more))):
        with open(os.path.join(folder, file), "w", encoding="utf-8") as f:
            f.write(text)


def by_hand(folder, t):
    """The last case by `evolve` and `relate`: the same numbers, to the last bit."""
    row = len(t["status"]) - 1
    settings = [f"--set={s}" for s in t["case"][row].decode().split("; ")]
    subprocess.run([PROGRAM, "evolve", "flat.yaml", *settings, "-o", "one.h5"], cwd=folder, check=True, capture_output=True)
    subprocess.run([PROGRAM, "relate", "one.h5", "clocks.yaml", "-o", "clocks.h5"], cwd=folder, check=False, capture_output=True)
    with h5py.File(os.path.join(folder, "clocks.h5")) as f:
        c, read = f["comparison"], f["relational/b_fine"]
        at = list(c["reading"]).index(b"b_fine")
        here = int(np.flatnonzero(read["centre"][()] == c["at"][at])[0])
        for column, value in (("bounce", c["median"][at]), ("bounce_error", c["median_error"][at]), ("bounce_at", c["at"][at]),
                              ("bounce_low", c["low"][at]), ("bounce_high", c["high"][at]), ("bounce_effective", c["effective"][at]),
                              ("bounce_dwell", c["dwell"][at]), ("window_error", read["window_error"][here]),
                              ("verdict", c["verdict"][at]), ("refused", sum(s != b"ok" for s in read["status"])),
                              ("back_action", read.attrs["back_action"]), ("order_violation", read.attrs["order_violation"])):
            check(t["relational_b_fine_" + column][row] == value, f"{column} of a clock is that of evolve and relate: {value}")
        for i, v in enumerate(("30", "60.5")):
            same = [t[f"histories_{v}_{name}"][row] == f["histories/" + path][i] for name, path in
                    (("p_ll", "p_ll"), ("p_ll_error", "error"), ("consistency", "consistency"), ("bound_low", "bound_low"), ("bound_high", "bound_high"))]
            check(all(same), f"histories at v_star {v} are those of relate")
        x = f["propagator"].attrs
        check(t["propagator_distance_conditional"][row] == x["distance_conditional"] and t["propagator_verdict"][row] == x["verdict"], "and the propagator")
        check(t["relational_never_status"][row] == b"refused" and np.isnan(t["relational_never_bounce"][row]) and
              t["relational_never_reason"][row] == f["relational/never/status"][0], "a clock that reads nothing is recorded with the reason")


def readings(top):
    folder = prepare(top, "readings")
    prepare_readings(folder, "[80, 100]")
    done = sweep(folder, "read.yaml", "--dry-run")
    check("2 clocks, histories, the propagator" in done.stdout, "a dry run tells the readings")
    process = subprocess.Popen([PROGRAM, "sweep", "read.yaml"], cwd=folder, stdout=subprocess.DEVNULL, stderr=subprocess.DEVNULL)
    journal, limit = os.path.join(folder, "scales.h5.journal-0"), time.monotonic() + 60
    while process.poll() is None and time.monotonic() < limit:  # until the second case is in the journal
        if os.path.exists(journal) and os.path.getsize(journal) > 9000:
            process.kill()
        time.sleep(0.002)
    check(process.wait(timeout=60) == -signal.SIGKILL, "a sweep with readings was killed")
    prepare_readings(folder, "[80, 100]", clocks=CLOCKS.replace("power: 20", "power: 22"))
    done = sweep(folder, "read.yaml", "--resume", "scales.h5", expect=2)
    check("other readings" in done.stderr, "other readings do not go on with it")
    prepare_readings(folder, "[80, 100]")
    sweep(folder, "read.yaml", "--resume", "scales.h5")
    t, before = table(folder)
    check(len(t["status"]) == 4 and before["case_attempts"].sum() <= 5 and np.all(t["relational_b_fine_status"] == b"ok"), "resumed, all cases read")
    by_hand(folder, t)
    prepare_readings(folder, "[80, 90, 100]")
    sweep(folder, "read.yaml", "--resume", "scales.h5", "--csv", "table.csv", ranks=2)
    more, after = table(folder)
    old = more["state.momentum"] != 90
    same = all(np.array_equal(more[k][old], t[k], equal_nan=t[k].dtype.kind == "f") for k in t if not k.startswith("slope"))
    check(same and np.array_equal(after["case_finished"][old], before["case_finished"]), "extended on two ranks: old cases and their readings stay")
    with open(os.path.join(folder, "table.csv"), newline="", encoding="utf-8") as f:
        rows = list(csv.DictReader(f))
    check([float(r["relational_b_fine_bounce"]) for r in rows] == list(more["relational_b_fine_bounce"]), "the csv holds the readings")


def bad_readings(top):
    folder = prepare(top, "bad_readings")
    for old, new, words in (("power: 20", "power: 30", "above power = 30"), ("{observable: b, instrument: sharp", "{observable: phi2, instrument: cosine, from: -1, to: 1", "readings[1] ('never')"),
                            ("to: 0.2", "to: 0.9", "window from -0.2 to 0.9")):
        prepare_readings(folder, "[80]", clocks=CLOCKS.replace(old, new, 1))
        done = sweep(folder, "read.yaml", expect=2)
        check(words in done.stderr and not os.path.exists(os.path.join(folder, "scales.h5.journal-0")), f"bad readings, nothing computed: {done.stderr}")
    prepare_readings(folder, "[80]", more="  clock.to: [0.2, 0.15]\n", clocks=CLOCKS.split("histories")[0])
    done = sweep(folder, "read.yaml", expect=1)
    t, _ = table(folder)
    short = t["clock.to"] == 0.15
    check(np.all(t["relational_b_fine_status"][short] == b"failed") and np.all(t["status"] == b"done") and
          all(b"window from" in r for r in t["relational_b_fine_reason"][short]) and "4 failed" in done.stdout, "a reading that one case cannot give")


def alone(top):
    """Runs without a launcher, side by side: none may lean on what another one takes away at its end."""
    folder = prepare(top, "alone")
    script = 'for i in 1 2 3; do "$0" evolve flat.yaml -o "$1.h5" --force > /dev/null || exit; done'
    runs = [subprocess.Popen(["sh", "-c", script, PROGRAM, str(i)], cwd=folder, stderr=subprocess.PIPE, text=True) for i in range(5)]
    said = [run.communicate(timeout=110)[1] for run in runs]
    check(all(run.returncode == 0 for run in runs) and not any(said), f"runs side by side say nothing: {''.join(said)}")


def main():
    with tempfile.TemporaryDirectory() as top:
        _, t = numbers(top)
        interrupted(top, t)
        failures(top)
        readings(top)
        bad_readings(top)
        alone(top)
        folder = prepare(top, "two")
        sweep(folder, "plan.yaml", "--dry-run", ranks=2)
        sweep(folder, "plan.yaml", ranks=2)
        two, _ = table(folder)
        check(all(np.array_equal(t[k], two[k], equal_nan=t[k].dtype.kind == "f") for k in t), "two ranks, one case each: the same table")
        command = [PROGRAM, "compare", os.path.join(folder, "scales.h5"), os.path.join(top, "whole", "scales.h5")]
        check(subprocess.run(command, capture_output=True, check=False).returncode == 0, "compare finds them equal")
    finish()


main()
