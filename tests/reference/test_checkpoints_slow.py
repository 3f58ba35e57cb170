#!/usr/bin/env python3
# SPDX-License-Identifier: BSD-2-Clause
"""A limit on the size of files that is lowered below what a run has written: an error (exit 4), no crash, and the run goes on
from its checkpoint. One hundred kills (SIGKILL) at random moments, on one and two ranks, of a run in modes and of a stepping one; every run
that was resumed ends with the bytes of one that was not interrupted. Program: $EBBTURN. Tolerance: none."""
import os
import resource
import tempfile
import time

import numpy as np
from checkpoints import MODES, STEPS, checkpoints, end, many_kills, prepare, same, start, whole_run
from common import check, finish

KILLS = 100
RUNS = 60  # at most; a run is killed up to four times


def ranks_of(process, ranks):
    """Process numbers of the ranks: mpiexec's children, or the process itself."""
    if not ranks:
        return [process.pid]
    with open(f"/proc/{process.pid}/task/{process.pid}/children", encoding="utf-8") as f:
        return [int(word) for word in f.read().split()]


def no_room(top, reference):
    for limit, ranks in ((3000, 0), (20000, 0), (20000, 2)):
        folder = prepare(os.path.join(top, f"room{limit}_{ranks}"), **MODES)
        process = start(folder, "model.yaml", "--force", ranks=ranks)
        while process.poll() is None and len(checkpoints(folder)) < 2:
            time.sleep(0.002)
        for pid in ranks_of(process, ranks):
            resource.prlimit(pid, resource.RLIMIT_FSIZE, (limit, limit))
        code, _, err = end(process, timeout=60)
        check(code == 4 and "out.h5" in err, f"files of {limit} bytes at most, {max(ranks, 1)} ranks: exit {code} {err[:300]}")
        code, _, err = end(start(folder, "--resume", "out.h5"))
        check(code == 0 and (ranks or same(os.path.join(folder, "out.h5"), reference, "after it") is None), f"it goes on {err}")


def main():
    rng = np.random.default_rng(7)
    with tempfile.TemporaryDirectory() as top:
        kinds = []
        for name, values, ranks in (("modes", MODES, 0), ("steps", STEPS, 0), ("two", MODES, 2)):
            folder = prepare(os.path.join(top, name), **values)
            kinds.append((values, ranks, whole_run(folder, ranks), os.path.join(folder, "out.h5")))
        no_room(top, kinds[0][3])

        def fresh(i, name):
            values, *known = kinds[(0, 1, 0, 2)[i % 4]]
            return prepare(name, **values), *known

        many_kills(top, rng, RUNS, KILLS, fresh)
    finish()


main()
