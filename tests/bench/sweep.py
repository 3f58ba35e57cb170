# SPDX-License-Identifier: BSD-2-Clause
"""A sweep of a thousand cases: what a case costs beside its computing time, and one rank against two.

    EBBTURN=build/ebbturn python3 tests/bench/sweep.py [PLAN]      default: inputs/thousand_cases.yaml

Overhead is what the program takes beyond the sum of /provenance/case_seconds, by the clock on the wall, divided by the cases;
it holds the start of MPI. Both ranks together should need no more processor time than one: the ratio, 2 x one rank's time over that
of both, tells on a busy machine too, where the ratio of wall times needs two free cores. Prints, asserts nothing."""
import os
import resource
import subprocess
import sys
import tempfile
import time

import h5py
import numpy as np

PROGRAM = os.environ.get("EBBTURN", "build/ebbturn")
PLAN = os.path.join(os.path.dirname(os.path.abspath(__file__)), "..", "..", "inputs", "thousand_cases.yaml")


def child(plan, ranks, out):
    command = [PROGRAM, "sweep", plan, "-o", out, "--progress", "never"]
    if ranks > 1:
        command = ["mpiexec", "-n", str(ranks), *command]
    started, used = time.perf_counter(), resource.getrusage(resource.RUSAGE_CHILDREN)
    subprocess.run(command, check=False, stdout=subprocess.DEVNULL, stdin=subprocess.DEVNULL)
    wall, now = time.perf_counter() - started, resource.getrusage(resource.RUSAGE_CHILDREN)
    return wall, now.ru_utime + now.ru_stime - used.ru_utime - used.ru_stime


def main():
    plan = sys.argv[1] if len(sys.argv) > 1 else PLAN
    results, tables = {}, []
    with tempfile.TemporaryDirectory() as folder:
        for ranks in (1, 2):
            out = os.path.join(folder, f"{ranks}.h5")
            wall, cpu = results[ranks] = child(plan, ranks, out)
            with h5py.File(out) as f:
                seconds = f["provenance/case_seconds"][()]
                tables.append({k: v[()] for k, v in f["sweep"].items()})
            beside = (wall * ranks - seconds.sum()) / len(seconds)
            print(f"{ranks} rank(s)  {len(seconds)} cases in {wall:.1f} s, processor time {cpu:.1f} s; in cases {seconds.sum():.1f} s "
                  f"(median {1e3 * np.median(seconds):.0f} ms), beside them {1e3 * beside:.2f} ms a case")
    same = all(np.array_equal(tables[0][k], tables[1][k], equal_nan=tables[0][k].dtype.kind == "f") for k in tables[0])
    print(f"2 ranks: {results[1][0] / results[2][0]:.2f} times as fast; by processor time {2 * results[1][1] / results[2][1]:.2f}; "
          f"the same table: {'yes' if same else 'no'}")


main()
