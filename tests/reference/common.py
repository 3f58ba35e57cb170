# SPDX-License-Identifier: BSD-2-Clause
"""Running the program and comparing its results; used by the end-to-end tests."""
import os
import subprocess
import sys
import tempfile

import h5py
import numpy as np

PROGRAM = os.environ.get("EBBTURN", "build/ebbturn")
MPIEXEC = os.environ.get("EBB_MPIEXEC", "mpiexec")
FAILURES = []

MODEL = """
title: end to end
gravity: {{prescription: {prescription}, sector: {sector}}}
clock: {{kind: scalar, from: -0.4, to: 0.5, samples: 31}}
state: {state}
numerics: {{propagator: {propagator}, tolerance: {tolerance}}}
lattice: {lattice}
output: {{file: out.h5}}
"""


PACKET = "{profile: gaussian_momentum, momentum: 100, relative_spread: 0.08, bounce_at: 0.05}"
# a vector on the sites is the same state for every basis; a packet in k is resolved by each basis in its own nodes
VECTOR = "{profile: gaussian_volume, v0: 150, spread: 12, b0: 1.3, chirp: 0.2, at: 0.05}"


def model(folder, name="model.yaml", **changes):
    values = dict(prescription="slqc", sector=4, state=PACKET, propagator="auto", tolerance="1.0e-10",
                  lattice="{volume_max: auto}")
    values.update(changes)
    path = os.path.join(folder, name)
    with open(path, "w", encoding="utf-8") as f:
        f.write(MODEL.format(**values))
    return path


def run(*arguments, ranks=0, expect=0, timeout=300):
    command = [PROGRAM, *arguments]
    if ranks:
        command = [MPIEXEC, "-n", str(ranks), *command]
    done = subprocess.run(command, capture_output=True, text=True, timeout=timeout, stdin=subprocess.DEVNULL, check=False)
    if done.returncode != expect:
        FAILURES.append(f"{' '.join(command)}: exit {done.returncode}, expected {expect}\n{done.stdout}{done.stderr}")
    return done


def check(condition, text):
    print(("ok    " if condition else "FAIL  ") + text)
    if not condition:
        FAILURES.append(text)


def datasets(path):
    """{path: array} of every dataset outside /provenance."""
    found = {}

    def visit(name, item):
        if isinstance(item, h5py.Dataset) and not name.startswith("provenance"):
            found[name] = item[()]

    with h5py.File(path) as f:
        f.visititems(visit)
    return found


def finish():
    for text in FAILURES:
        print("FAIL  " + text, file=sys.stderr)
    sys.exit(1 if FAILURES else 0)


__all__ = ["FAILURES", "PACKET", "PROGRAM", "VECTOR", "check", "datasets", "finish", "h5py", "model", "np", "os", "run", "tempfile"]
