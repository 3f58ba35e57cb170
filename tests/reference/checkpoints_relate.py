# SPDX-License-Identifier: BSD-2-Clause
"""Readings that are killed and go on: shared by the tests of checkpoints of `relate`."""
import os
import shutil
import signal
import time

from checkpoints import Job, checkpoints, end, start
from common import check

UNIVERSE = """gravity: {prescription: slqc}
clock: {kind: scalar, from: -0.3, to: 0.3, samples: 21}
state: {profile: gaussian_momentum, momentum: 60, relative_spread: 0.08}
lattice: {volume_max: 2400}
output: {file: universe.h5, keep: [moments]}
"""
# both ways of reading: a halo between neighbours, and whole states with outcomes shared among ranks
READINGS = """window: {from: -0.3, to: 0.3, samples: 193, tolerance: 0.5}
output: {checkpoint: {every: 0.01s}}
readings:
  - name: b_fine
    clock: {observable: b, instrument: cosine_power, power: 32, centres: 48}
  - {name: b_sharp, clock: {observable: b, instrument: sharp, bins: 16}}
  - {name: by_v, clock: {observable: v, instrument: sharp, bins: 12, from: 0, to: 300}, system: {observable: b, bins: 20}}
histories: {v_star: [40, 120], at: [-0.2, 0.24]}
"""
RELATE = Job("relate", ("universe.h5", "readings.yaml", "-o", "out.h5", "--force"), 1)  # outcomes at b = 0 are refused


def universe(top):
    with open(os.path.join(top, "universe.yaml"), "w", encoding="utf-8") as f:
        f.write(UNIVERSE)
    code, _, err = end(start(top, "universe.yaml"))
    check(code == 0, f"the universe evolves {err}")
    return os.path.join(top, "universe.h5")


def prepare(folder, result):
    os.makedirs(folder)
    shutil.copy(result, os.path.join(folder, "universe.h5"))
    with open(os.path.join(folder, "readings.yaml"), "w", encoding="utf-8") as f:
        f.write(READINGS)
    return folder


def stop(folder, ranks=0, least=2):
    process = start(folder, *RELATE.fresh, ranks=ranks, command="relate")
    deadline = time.monotonic() + 60
    while process.poll() is None and time.monotonic() < deadline and len(checkpoints(folder)) < least:
        time.sleep(0.002)
    process.send_signal(signal.SIGUSR1)
    code, _, err = end(process)
    check(code == 75 and "window samples" in err, f"a signal ends it with 75: {code} {err}")
    check("ebbturn relate --resume out.h5" in err, "and it says how to go on")


def resume(folder, ranks=0):
    return end(start(folder, "--resume", "out.h5", ranks=ranks, command="relate"))
