# SPDX-License-Identifier: BSD-2-Clause
"""bench_slicing on 1, 2 and 4 ranks: all 200 eigenvalues of 20,000 sites in an interval, proven complete by inertia, and the
time beside LAPACK's tridiagonal solver in the same run. Prints, asserts only what the program does."""
import os
import subprocess

PROGRAM = os.path.join(os.path.dirname(os.environ.get("EBBTURN", "build/ebbturn")), "tests", "bench_slicing")

for ranks in (1, 2, 4):
    subprocess.run(["mpiexec", "-n", str(ranks), PROGRAM], check=True, stdin=subprocess.DEVNULL, timeout=900)
