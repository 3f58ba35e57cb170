#!/usr/bin/env python3
# SPDX-License-Identifier: BSD-2-Clause
"""One hundred kills (SIGKILL) at random moments, on one and two ranks, of a run in modes and of a stepping one; every run
that was resumed ends with the bytes of one that was not interrupted. Program: $EBBTURN. Tolerance: none."""
import os
import shutil
import tempfile

import numpy as np
from checkpoints import MODES, STEPS, kill_and_resume, prepare, same, whole_run
from common import check, finish

KILLS = 100
RUNS = 60  # at most; a run is killed up to four times


def main():
    rng = np.random.default_rng(7)
    kills = writes = 0
    with tempfile.TemporaryDirectory() as top:
        kinds = []
        for name, values, ranks in (("modes", MODES, 0), ("steps", STEPS, 0), ("two", MODES, 2)):
            folder = prepare(os.path.join(top, name), **values)
            kinds.append((values, ranks, whole_run(folder, ranks), os.path.join(folder, "out.h5")))
        for i in range(RUNS):
            values, ranks, length, reference = kinds[(0, 1, 0, 2)[i % 4]]
            folder = prepare(os.path.join(top, f"killed{i}"), **values)
            more, in_write = kill_and_resume(folder, rng, length, ranks=ranks, writing=i % 3 == 0)
            kills, writes = kills + more, writes + in_write
            same(os.path.join(folder, "out.h5"), reference, f"run {i}, {max(ranks, 1)} ranks, {more} kills")
            shutil.rmtree(folder)
            if kills >= KILLS:
                break
        check(kills >= KILLS and writes > 0, f"{kills} kills, {writes} while a checkpoint was being written")
    finish()


main()
