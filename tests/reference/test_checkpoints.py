#!/usr/bin/env python3
# SPDX-License-Identifier: BSD-2-Clause
"""Interrupted runs: killed at random moments, by signals, before a time limit, with damaged and foreign checkpoints, on a
full disk, on other numbers of ranks. Program: $EBBTURN. Tolerance: none on the same number of ranks, bytes are compared;
1e-11 relative (solver: a tenth of numerics.tolerance, 1e-10) between numbers of ranks."""
import os
import shutil
import signal
import tempfile
import time

import h5py
import numpy as np
from checkpoints import (MODES, STEPS, arguments, checkpoints, end, kill_and_resume, limit_files, prepare, same, start,
                         whole_run)
from common import check, datasets, finish

OTHER_RANKS = 1e-11


def wait_for(process, condition, seconds=60):
    deadline = time.monotonic() + seconds
    while process.poll() is None and time.monotonic() < deadline and not condition():
        time.sleep(0.002)


def stop_by(folder, number, code):
    process = start(folder, "model.yaml", "--force")
    wait_for(process, lambda: len(checkpoints(folder)) == 2)
    process.send_signal(number)
    got, _, err = end(process)
    check(got == code, f"signal {number}: exit {got}, expected {code} {err}")
    check("ebbturn evolve --resume out.h5" in err.strip().splitlines()[-1], "the last line says how to go on")
    check(not os.path.exists(os.path.join(folder, "out.h5")), "there is no result yet")


def damaged(top, reference):
    folder = prepare(os.path.join(top, "damaged"), **MODES)
    stop_by(folder, signal.SIGTERM, 128 + signal.SIGTERM)
    code, _, err = end(start(folder, "model.yaml"))
    check(code == 4 and "--resume out.h5" in err, "a new run does not write over an interrupted one")
    newest = max(checkpoints(folder), key=lambda n: os.path.getmtime(os.path.join(folder, n)))
    kept = os.path.join(top, "kept")
    shutil.copytree(folder, kept)
    with open(os.path.join(folder, newest), "r+b") as f:
        f.seek(os.path.getsize(os.path.join(folder, newest)) // 2)
        byte = f.read(1)[0]
        f.seek(-1, 1)
        f.write(bytes([byte ^ 16]))
    code, _, err = end(start(folder, "--resume", "out.h5"))
    check(code == 0 and newest in err and "damaged" in err, f"a flipped bit is named and the other generation used: {err}")
    same(os.path.join(folder, "out.h5"), reference, "after a damaged checkpoint")
    for name in checkpoints(kept):
        os.truncate(os.path.join(kept, name), 5000)
    code, out, err = end(start(kept, "--resume", "out.h5"))
    check(code == 4 and all(n in err for n in ("out.h5.checkpoint-0", "out.h5.checkpoint-1", "nothing was computed"))
          and not out, f"with no whole checkpoint nothing is computed: {code} {err}")


def foreign(top):
    one, two = prepare(os.path.join(top, "one"), **MODES), prepare(os.path.join(top, "two"), **MODES)
    stop_by(one, signal.SIGUSR1, 75)
    stop_by(two, signal.SIGUSR1, 75)
    newest = max(checkpoints(two), key=lambda n: os.path.getmtime(os.path.join(two, n)))
    shutil.copy(os.path.join(one, "out.h5.checkpoint-0"), os.path.join(two, newest))
    code, _, err = end(start(two, "--resume", "out.h5"))
    check(code == 0 and newest in err and "foreign" in err, f"a checkpoint of another run is refused: {code} {err}")
    for name in checkpoints(one):
        os.rename(os.path.join(one, name), os.path.join(one, name.replace("out", "other")))
    code, _, err = end(start(one, "--resume", "other.h5"))
    check(code == 4 and "foreign" in err and "'out.h5'" in err, f"so is one of another result: {code} {err}")


def time_limit(top, length):
    folder = prepare(os.path.join(top, "limit"), **MODES)
    codes = []
    while len(codes) < 100:
        code, _, err = end(start(folder, *arguments(folder), "--time-limit", f"{0.5 * length:.2f}s"))
        codes.append(code)
        if codes == [0] and length > 0.1:  # the run that was measured had a busier machine
            codes, length = [], 0.5 * length
        elif code != 75:
            break
    check(len(codes) > 1 and set(codes[:-1]) == {75} and codes[-1] == 0, f"a chain of short jobs ends: {codes} {err}")
    return os.path.join(folder, "out.h5")


def full_disk(top):
    folder = prepare(os.path.join(top, "full"), **dict(STEPS, keep="[moments]"))
    whole_run(folder)
    os.rename(os.path.join(folder, "out.h5"), os.path.join(folder, "whole.h5"))
    process = start(folder, "model.yaml", "--force")
    wait_for(process, lambda: len(checkpoints(folder)) == 2)
    limit_files(process, 100000)  # the stepping state alone has six times as much
    process.send_signal(signal.SIGUSR1)
    code, _, err = end(process)
    check(code == 4 and "cannot write checkpoint" in err and "kept" in err, f"a full disk is said: {code} {err}")
    check(any(os.path.getsize(os.path.join(folder, n)) > 100000 for n in checkpoints(folder)),
          "and the checkpoint before is still there")
    code, _, err = end(start(folder, "--resume", "out.h5"))
    check(code == 0, f"from which the run goes on: {code} {err}")
    same(os.path.join(folder, "out.h5"), os.path.join(folder, "whole.h5"), "after a full disk")


def other_ranks(top, reference):
    folder = prepare(os.path.join(top, "ranks"), **MODES)
    stop_by(folder, signal.SIGINT, 128 + signal.SIGINT)
    code, _, err = end(start(folder, "--resume", "out.h5", ranks=2))
    check(code == 0, f"two ranks go on where one stopped: {code} {err}")
    with h5py.File(os.path.join(folder, "out.h5")) as f:
        check(f.attrs["ranks"] == 2, "the result says so")
    one, two = datasets(reference), datasets(os.path.join(folder, "out.h5"))
    worst = max(np.max(np.abs(one[f"moments/{m}"] / two[f"moments/{m}"] - 1)) for m in ("v_mean", "volume_mean", "norm"))
    check(set(one) == set(two) and worst < OTHER_RANKS, f"with the same numbers to rounding ({worst:.1e})")


def main():
    rng = np.random.default_rng(20240501)
    with tempfile.TemporaryDirectory() as top:
        reference = prepare(os.path.join(top, "whole"), **MODES)
        length = whole_run(reference)
        reference = os.path.join(reference, "out.h5")
        for i in range(2):
            folder = prepare(os.path.join(top, f"killed{i}"), **MODES)
            kills, in_write = kill_and_resume(folder, rng, length, writing=i == 1)
            same(os.path.join(folder, "out.h5"), reference, f"after {kills} kills, {in_write} while a checkpoint was written")
            check(kills > 0 and (i == 0 or in_write > 0), "the run was killed, and in the middle of a checkpoint")
        steps = prepare(os.path.join(top, "steps"), **STEPS)
        length_steps = whole_run(steps)
        folder = prepare(os.path.join(top, "steps_killed"), **STEPS)
        kills, _ = kill_and_resume(folder, rng, length_steps)
        same(os.path.join(folder, "out.h5"), os.path.join(steps, "out.h5"), f"a stepping run after {kills} kills")
        damaged(top, reference)
        foreign(top)
        same(time_limit(top, length), reference, "after a chain of short jobs",
             but=("/@command",))  # the first of them was started with a limit
        full_disk(top)
        other_ranks(top, reference)
    finish()


main()
