# SPDX-License-Identifier: BSD-2-Clause
"""One rank against two on the same model: wall time of the whole program and peak memory of a rank, best of three.

The model is inputs/first_bounce.yaml with 2001 clock samples and nothing but moments and quantiles kept, so that the start of
MPI (about 0.4 s) does not hide the work. Prints ratios, asserts nothing. Needs two free cores to mean anything."""
import os
import resource
import subprocess
import sys
import tempfile
import time

PROGRAM = os.environ.get("EBBTURN", "build/ebbturn")
MODEL = os.path.join(os.path.dirname(__file__), "..", "..", "inputs", "first_bounce.yaml")


def child(ranks, out):
    command = [PROGRAM, "evolve", MODEL, "-o", out, "--force", "--progress", "never", "--set", "clock.samples=2001",
               "--set", "output.keep=[moments, quantiles]"]
    if ranks > 1:
        command = ["mpiexec", "-n", str(ranks), *command]
    started = time.perf_counter()
    subprocess.run(command, check=True, stdout=subprocess.DEVNULL, stdin=subprocess.DEVNULL)
    # ru_maxrss of the largest process waited for: one rank, as mpiexec itself is small
    return time.perf_counter() - started, resource.getrusage(resource.RUSAGE_CHILDREN).ru_maxrss / 1024


def main():
    if len(sys.argv) == 3:  # measured in a process of its own, so that the peak is that of one run
        print("{} {}".format(*child(int(sys.argv[1]), sys.argv[2])))
        return
    results = {}
    with tempfile.TemporaryDirectory() as folder:
        for _ in range(3):
            for ranks in (1, 2):
                done = subprocess.run([sys.executable, __file__, str(ranks), os.path.join(folder, "out.h5")], check=True,
                                      capture_output=True, text=True)
                seconds, memory = map(float, done.stdout.split())
                best = results.get(ranks, (1e9, 1e9))
                results[ranks] = (min(best[0], seconds), min(best[1], memory))
    for ranks, (seconds, memory) in results.items():
        print(f"{ranks} rank(s)  {seconds:7.2f} s  peak {memory:7.0f} MB a rank")
    print(f"2 ranks: {results[1][0] / results[2][0]:.2f} times as fast, {results[2][1] / results[1][1]:.2f} of the memory a rank")


main()
