#!/usr/bin/env python3
# SPDX-License-Identifier: BSD-2-Clause
"""A rank that dies, by a signal or for want of memory, takes the job down within seconds, with a message; the resumed job ends
with the bytes of one that was not interrupted. A signal where there is no safe point (a set-up, histories at many times) ends
the run in time. Program: $EBBTURN. Tolerance: none."""
import os
import signal
import subprocess
import tempfile
import time

from checkpoints import MODES, checkpoints, end, prepare, same, start, whole_run
from checkpoints_relate import READINGS, RELATE, universe
from checkpoints_relate import prepare as prepare_readings
from common import MPIEXEC, PROGRAM, check, finish

PROMPT = 30.0  # seconds; a job that hangs would stay for ever
SETUP = """gravity: {prescription: slqc, curvature: closed}
clock: {kind: scalar, from: -0.1, to: 0.1, samples: 11}
state: {profile: gaussian_volume, v0: 6000, spread: 120, b0: 1.2}
lattice: {points: 12000}
output: {file: out.h5, keep: [moments]}
"""
LARGE = """clock: {kind: scalar, from: -0.5, to: 0.5, samples: 401}
state: {profile: gaussian_momentum, momentum: 200, relative_spread: 0.08}
lattice: {volume_max: 1.0e+6, layout: full}
output: {file: out.h5, keep: [moments, quantiles]}
"""
TOO_LITTLE = 700000  # kB of address space: the program and its libraries fit, the states of LARGE do not


def write(folder, name, text):
    os.makedirs(folder, exist_ok=True)
    with open(os.path.join(folder, name), "w", encoding="utf-8") as f:
        f.write(text)
    return folder


def ranks_of(process):
    """Process numbers of the ranks, from the table of processes: children of mpiexec that run the program."""
    found = []
    for name in os.listdir("/proc"):
        try:
            with open(f"/proc/{name}/stat", encoding="utf-8") as f:
                fields = f.read().rsplit(")", 1)
            if name.isdigit() and int(fields[1].split()[1]) == process.pid and "ebbturn" in fields[0]:
                found.append(int(name))
        except (OSError, ValueError):
            continue
    return sorted(found)


def until(process, condition, seconds=60):
    deadline = time.monotonic() + seconds
    while process.poll() is None and time.monotonic() < deadline and not condition():
        time.sleep(0.005)


def killed_rank(top):
    values = dict(MODES, samples=241)
    reference = prepare(os.path.join(top, "whole"), **values)
    whole_run(reference, ranks=2)
    for number in (signal.SIGKILL, signal.SIGSEGV):
        folder = prepare(os.path.join(top, f"killed{int(number)}"), **values)
        process = start(folder, "model.yaml", "--force", ranks=2)
        until(process, lambda: len(checkpoints(folder)) == 2 and len(ranks_of(process)) == 2)
        os.kill(ranks_of(process)[1], number)
        begin = time.monotonic()
        code, _, err = end(process, timeout=120)
        check(code not in (0, 75) and time.monotonic() - begin < PROMPT,
              f"a rank that dies of {number.name} ends the job with {code} after {time.monotonic() - begin:.1f} s")
        check("signal" in err or "MPI_ABORT" in err, f"with a message {err}")
        code, _, err = end(start(folder, "--resume", "out.h5", ranks=2))
        check(code == 0, f"which goes on from its checkpoint {err}")
        same(os.path.join(folder, "out.h5"), os.path.join(reference, "out.h5"), "after a dead rank")


def no_memory(top):
    folder = write(os.path.join(top, "memory"), "model.yaml", LARGE)
    command = f'[ "$OMPI_COMM_WORLD_RANK" = 1 ] && ulimit -v {TOO_LITTLE}; exec {os.path.abspath(PROGRAM)} evolve model.yaml'
    begin = time.monotonic()
    process = subprocess.Popen([MPIEXEC, "-n", "2", "sh", "-c", command], cwd=folder, stdin=subprocess.DEVNULL,
                               stdout=subprocess.PIPE, stderr=subprocess.PIPE, text=True)
    code, _, err = end(process, timeout=120)
    check(code not in (0, 75) and time.monotonic() - begin < 4 * PROMPT and "rank 1 of 2 has no more memory" in err,
          f"a rank without memory ends the job with {code} after {time.monotonic() - begin:.1f} s and says so")


def stop_between(process, number, code, words, what):
    begin = time.monotonic()
    process.send_signal(number)
    got, _, err = end(process, timeout=60)
    spent = time.monotonic() - begin
    check(got == code and words in err and spent < PROMPT, f"{what}: {got}, expected {code}, after {spent:.1f} s: {err}")
    check("  go on     'ebbturn " in err, "and it says how to go on")


def no_safe_point(top, result):
    folder = write(os.path.join(top, "setup"), "model.yaml", SETUP)
    process = start(folder, "model.yaml")
    time.sleep(2.0)  # it takes much longer
    stop_between(process, signal.SIGUSR1, 75, "during the set-up", "a signal during the set-up")
    check(os.listdir(folder) == ["model.yaml"], f"leaves nothing behind {os.listdir(folder)}")
    folder = prepare_readings(os.path.join(top, "end"), result)
    write(folder, "readings.yaml", READINGS.replace("at: [-0.2, 0.24]", "at: [-0.2, 0.24], times: 100000"))
    process = start(folder, *RELATE.fresh, command="relate")
    until(process, lambda: len(checkpoints(folder)) == 2
          and all(os.path.getmtime(os.path.join(folder, n)) < time.time() - 1.5 for n in checkpoints(folder)))
    stop_between(process, signal.SIGTERM, 128 + signal.SIGTERM, "after the last of 193 window samples",
                 "a signal after the last sample")
    check(len(checkpoints(folder)) == 2 and not os.path.exists(os.path.join(folder, "out.h5.part")),
          f"leaves checkpoints and no half of a result {os.listdir(folder)}")


def main():
    with tempfile.TemporaryDirectory() as top:
        killed_rank(top)
        no_memory(top)
        no_safe_point(top, universe(top))
    finish()


main()
