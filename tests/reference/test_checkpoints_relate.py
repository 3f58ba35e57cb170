#!/usr/bin/env python3
# SPDX-License-Identifier: BSD-2-Clause
"""`relate` interrupted: killed, by a signal, with a damaged checkpoint, on another number of ranks. Program: $EBBTURN. Tolerance: none on the same number of ranks, bytes are compared; 1e-11
absolute between numbers of ranks (solver: IDENTITY_LIMIT of the program, sums of probabilities are at most 1)."""
import os
import shutil
import tempfile

import numpy as np
from checkpoints import checkpoints, end, kill_and_resume, same, start, whole_run
from checkpoints_relate import RELATE, prepare, resume, stop, universe
from common import check, datasets, finish

OTHER_RANKS = 1e-11


def damaged(top, result, reference):
    folder = prepare(os.path.join(top, "damaged"), result)
    stop(folder)
    code, _, err = end(start(folder, *RELATE.fresh[:-1], command="relate"))
    check(code == 4 and "ebbturn relate --resume out.h5" in err, "a new one does not write over an interrupted one")
    code, _, err = end(start(folder, "--resume", "out.h5"))
    check(code == 4 and "written by 'relate'" in err, f"'evolve' does not go on with it: {code} {err}")
    kept = os.path.join(top, "kept")
    shutil.copytree(folder, kept)
    newest = max(checkpoints(folder), key=lambda n: os.path.getmtime(os.path.join(folder, n)))
    with open(os.path.join(folder, newest), "r+b") as f:
        f.seek(os.path.getsize(os.path.join(folder, newest)) // 2)
        byte = f.read(1)[0]
        f.seek(-1, 1)
        f.write(bytes([byte ^ 4]))
    code, _, err = resume(folder)
    check(code == RELATE.code and newest in err and "damaged" in err, f"a flipped bit is named, the other generation used: {code} {err}")
    same(os.path.join(folder, "out.h5"), reference, "after a damaged checkpoint")
    return kept


def other_ranks(kept, reference):
    code, _, err = resume(kept, ranks=2)
    check(code == RELATE.code, f"two ranks go on where one stopped: {code} {err}")
    one, two = datasets(reference), datasets(os.path.join(kept, "out.h5"))
    numbers = [k for k in one if one[k].dtype.kind == "f" and k.startswith("relational") and k.split("/")[-1] in
               ("dwell", "probability", "purity", "leak", "system_dwell")]
    worst = max(np.nanmax(np.abs(one[k] - two[k])) for k in numbers)
    check(set(one) == set(two) and len(numbers) == 15 and worst < OTHER_RANKS, f"with the same numbers to rounding ({worst:.1e})")


def main():
    rng = np.random.default_rng(11)
    with tempfile.TemporaryDirectory() as top:
        result = universe(top)
        reference = prepare(os.path.join(top, "whole"), result)
        length = whole_run(reference, job=RELATE)
        reference = os.path.join(reference, "out.h5")
        folder = prepare(os.path.join(top, "killed"), result)
        kills, in_write = kill_and_resume(folder, rng, length, writing=True, job=RELATE)
        same(os.path.join(folder, "out.h5"), reference, f"after {kills} kills, {in_write} while a checkpoint was written")
        check(kills > 0 and in_write > 0, "it was killed, and in the middle of a checkpoint")
        other_ranks(damaged(top, result, reference), reference)
    finish()


main()
