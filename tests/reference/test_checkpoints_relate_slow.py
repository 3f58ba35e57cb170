#!/usr/bin/env python3
# SPDX-License-Identifier: BSD-2-Clause
"""Twenty kills (SIGKILL) of `relate` at random moments and in the middle of checkpoints, on one and two ranks; what was resumed
ends with the bytes of what was not interrupted. A chain of jobs with a time limit; another result under the same name. Program: $EBBTURN. Tolerance: none."""
import os
import tempfile

import numpy as np
from checkpoints import arguments, end, many_kills, same, start, whole_run
from checkpoints_relate import RELATE, prepare, resume, stop, universe
from common import check, finish

KILLS = 20
RUNS = 20  # at most; one is killed up to four times


def another_result(top, result):
    folder = prepare(os.path.join(top, "another"), result)
    stop(folder)
    with open(os.path.join(folder, "universe.yaml"), "w", encoding="utf-8") as f:
        f.write(open(os.path.join(top, "universe.yaml"), encoding="utf-8").read())
    end(start(folder, "universe.yaml", "--force"))
    code, _, err = resume(folder)
    check(code == 4 and "made again since" in err, f"a result that was made again is refused: {code} {err}")


def time_limit(top, result, reference, length):
    folder = prepare(os.path.join(top, "limit"), result)
    codes = []
    while len(codes) < 100 and (not codes or codes[-1] == 75):
        code, _, err = end(start(folder, *arguments(folder, RELATE), "--time-limit", f"{0.5 * length:.2f}s", command="relate"))
        codes.append(code)
        if codes == [RELATE.code] and length > 0.1:  # the run that was measured had a busier machine
            codes, length = [], 0.5 * length
    check(len(codes) > 1 and set(codes[:-1]) == {75} and codes[-1] == RELATE.code, f"a chain of short jobs ends: {codes} {err}")
    same(os.path.join(folder, "out.h5"), reference, "after it", but=("/@command",))


def main():
    rng = np.random.default_rng(13)
    with tempfile.TemporaryDirectory() as top:
        result = universe(top)
        whole = {}
        for ranks in (0, 2):
            folder = prepare(os.path.join(top, f"whole{ranks}"), result)
            whole[ranks] = (whole_run(folder, ranks, RELATE), os.path.join(folder, "out.h5"))
        another_result(top, result)
        time_limit(top, result, whole[0][1], whole[0][0])
        many_kills(top, rng, RUNS, KILLS, lambda i, name: (prepare(name, result), (0, 2)[i % 2], *whole[(0, 2)[i % 2]]), RELATE)
    finish()


main()
