# SPDX-License-Identifier: BSD-2-Clause
"""Runs that are killed and go on: shared by the tests of checkpoints. Results of equal runs are compared byte for byte."""
import collections
import os
import resource
import shutil
import signal
import subprocess
import time

import h5py
import numpy as np
from common import MPIEXEC, PROGRAM, check

MODEL = """title: interrupted
gravity: {{prescription: {prescription}}}
clock: {{kind: scalar, from: -0.2, to: 0.3, samples: {samples}}}
state: {{profile: gaussian_momentum, momentum: {momentum}, relative_spread: 0.08}}
numerics: {{propagator: {propagator}}}
lattice: {{volume_max: {volume_max}, layout: full}}
output: {{file: out.h5, keep: {keep}, every: 3, checkpoint: {{every: {every}}}}}
"""
MODES = dict(prescription="aps", samples=161, momentum=100, propagator="auto", volume_max="2.0e+4", every="0.01s",
             keep="[moments, quantiles, probability, state]")
STEPS = dict(prescription="slqc", samples=61, momentum=100, propagator="chebyshev", volume_max="6000", every="0.01s",
             keep="[moments, quantiles, state]")
# What is killed and resumed: a command, how it is started afresh, the exit code of a whole run.
Job = collections.namedtuple("Job", "command fresh code")
EVOLVE = Job("evolve", ("model.yaml", "--force"), 0)


def prepare(folder, **values):
    os.makedirs(folder, exist_ok=True)
    with open(os.path.join(folder, "model.yaml"), "w", encoding="utf-8") as f:
        f.write(MODEL.format(**values))
    return folder


def start(folder, *arguments, ranks=0, command="evolve", **options):
    command = ([MPIEXEC, "-n", str(ranks)] if ranks else []) + [PROGRAM, command, *arguments]
    return subprocess.Popen(command, cwd=folder, stdin=subprocess.DEVNULL, stdout=subprocess.PIPE,
                            stderr=subprocess.PIPE, text=True, **options)


def end(process, timeout=240):
    out, err = process.communicate(timeout=timeout)
    return process.returncode, out, err


def checkpoints(folder):
    return sorted(n for n in os.listdir(folder) if ".checkpoint-" in n and not n.endswith(".part"))


def arguments(folder, job=EVOLVE):
    return ("--resume", "out.h5") if checkpoints(folder) else job.fresh


def whole_run(folder, ranks=0, job=EVOLVE):
    begin = time.monotonic()
    code, _, err = end(start(folder, *job.fresh, ranks=ranks, command=job.command))
    check(code == job.code, f"an uninterrupted run ends with {job.code}: {code} {err}")
    check(not checkpoints(folder), "its checkpoints are gone")
    return time.monotonic() - begin


def contents(path):
    """{path: bytes} of every dataset and attribute outside /provenance."""
    found = {}

    def attributes(name, item):
        for key in item.attrs:
            if key not in ("DIMENSION_LIST", "REFERENCE_LIST"):  # addresses in the file, remade with it
                found[f"{name}@{key}"] = np.asarray(item.attrs[key]).tobytes()

    def visit(name, item):
        if name.startswith("provenance"):
            return
        attributes(name, item)
        if isinstance(item, h5py.Dataset):
            found[name] = (str(item.dtype), item.shape, item[()].tobytes())

    with h5py.File(path) as f:
        attributes("/", f)
        f.visititems(visit)
    return found


def same(a, b, text, but=()):
    one, two = contents(a), contents(b)
    differing = sorted(k for k in set(one) | set(two) if one.get(k) != two.get(k) and k not in but)
    check(not differing, f"{text}: every object outside /provenance is equal byte for byte {differing[:5]}")


def writes_now(folder):
    return any(n.endswith(".part") and "checkpoint" in n for n in os.listdir(folder))


def status(number):
    """State and parent of a process, from the table of processes; None where there is none."""
    try:
        with open(f"/proc/{number}/stat", encoding="utf-8") as f:
            fields = f.read().rsplit(")", 1)[1].split()
        return fields[0], int(fields[1])
    except (OSError, ValueError):
        return None


def kill_all(process):
    """SIGKILL to a run and its ranks, which mpiexec gives groups of their own; returns when all of them are gone."""
    parents = {int(n): status(n) for n in os.listdir("/proc") if n.isdigit()}
    family = [process.pid]
    for number in family:
        family += [child for child, known in parents.items() if known and known[1] == number]
    for number in family:
        try:
            os.kill(number, signal.SIGKILL)
        except ProcessLookupError:
            pass
    deadline = time.monotonic() + 10.0
    while any((status(n) or "Z")[0] != "Z" for n in family) and time.monotonic() < deadline:
        time.sleep(0.002)


def wait_for_write(process, folder, deadline):
    """Holds the run in the middle of a checkpoint; false where it was not found there in time."""
    while time.monotonic() < deadline and process.poll() is None:
        if not writes_now(folder):
            continue
        os.killpg(process.pid, signal.SIGSTOP)
        if writes_now(folder):
            return True
        os.killpg(process.pid, signal.SIGCONT)
    return False


def kill_and_resume(folder, rng, length, ranks=0, writing=False, most=6, job=EVOLVE):
    """Kills the run (all ranks) again and again, at most twice as often as it can get on, then lets it end. The number of
    kills, and whether there was one while a checkpoint was being written."""
    kills, in_write = 0, 0
    for attempt in range(most):
        process = start(folder, *arguments(folder, job), ranks=ranks, command=job.command, start_new_session=True)
        if attempt < 4 and writing:
            wait_for_write(process, folder, time.monotonic() + 20 * length)
        elif attempt < 4:
            try:
                process.wait(rng.uniform(0.1, 1.0) * length)
            except subprocess.TimeoutExpired:
                pass
        if attempt < 4 and process.poll() is None:
            kill_all(process)
            kills += 1
            in_write += writes_now(folder)
        code, out, err = end(process)
        if code == job.code or (code == 0 and "is complete" in out):  # killed when all but the checkpoints' end was done
            return kills, in_write
        if code != -signal.SIGKILL:
            check(False, f"a resumed run ends with {job.code} or is killed: {code} {err}")
            break
    check(False, "the run did not end")
    return kills, in_write


def many_kills(top, rng, runs, least, make, job=EVOLVE):
    """Runs that are killed again and again until there were `least` kills: make(i, folder name) gives a fresh folder, the number
    of ranks, how long a whole run takes and its result."""
    kills = writes = 0
    for i in range(runs):
        folder, ranks, length, reference = make(i, os.path.join(top, f"killed{i}"))
        more, in_write = kill_and_resume(folder, rng, length, ranks=ranks, writing=i % 3 == 0, job=job)
        kills, writes = kills + more, writes + in_write
        same(os.path.join(folder, "out.h5"), reference, f"run {i}, {max(ranks, 1)} ranks, {more} kills")
        shutil.rmtree(folder)
        if kills >= least:
            break
    check(kills >= least and writes > 0, f"{kills} kills, {writes} while a checkpoint was being written")


def limit_files(process, size):
    resource.prlimit(process.pid, resource.RLIMIT_FSIZE, (size, size))
