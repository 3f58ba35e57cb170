# SPDX-License-Identifier: BSD-2-Clause
"""Every worked model runs as its first comment promises, to a complete result."""
import glob
import re

from common import check, h5py, os, run, tempfile

INPUTS = os.path.join(os.path.dirname(__file__), "..", "..", "inputs")
SLOW = ("closed_connection.yaml", "first_bounce.yaml", "open_universe.yaml", "polymer_scale.yaml", "polymer_scale_closed.yaml",
        "polymer_scale_lambda.yaml")  # seconds each, or run by test_sweep_physics_slow.py as well
ELSEWHERE = ("wide_clock.yaml", "wide_readings.yaml")  # in test_relate_wide_slow.py
PLANNED = ("survey.yaml", "thousand_cases.yaml")  # minutes: read, planned and left alone


def read(path):
    with open(path, encoding="utf-8") as f:
        return f.read()


def files():
    return sorted(glob.glob(os.path.join(INPUTS, "*.yaml")))


def is_readings(path):
    return "\nreadings:" in read(path) and "\nbase:" not in read(path)


def model(path, scratch):
    name, text = os.path.basename(path), read(path)
    check(text.startswith("# "), f"{name} opens with a comment")
    commands = [command for command, key in (("spectrum", "\nspectrum:"), ("evolve", "\nstate:"), ("sweep", "\nbase:")) if key in text]
    check(commands, f"{name} is for some command")
    for command in commands:
        check(f"ebbturn {command} inputs/{name}" in text.replace("\n# ", " "), f"{name} says how to run '{command}'")
        out = os.path.join(scratch, f"{name}.{command}.h5")
        if name in PLANNED:
            run(command, path, "--dry-run")
            continue
        run(command, path, "-o", out)
        if os.path.exists(out):
            with h5py.File(out) as f:
                check(f.attrs["complete"] == 1, f"{name}: complete result of '{command}'")


def readings(path, scratch):
    """A readings file, of the model that its comment names first."""
    name, text = os.path.basename(path), read(path)
    of = re.search(r"universe of (\w+)\.yaml", text)
    check(of is not None and f"inputs/{name}" in text, f"{name} says how to run it")
    out = os.path.join(scratch, name + ".h5")
    run("relate", os.path.join(scratch, f"{of[1]}.yaml.evolve.h5"), path, "-o", out, expect=1)
    with h5py.File(out) as f:
        check(f.attrs["complete"] == 1, f"{name}: complete result of 'relate'")


def all_of(wanted):
    """Runs what wanted(name) names: models first, then the readings files of these."""
    with tempfile.TemporaryDirectory() as scratch:
        names = [path for path in files() if wanted(os.path.basename(path)) and os.path.basename(path) not in ELSEWHERE]
        check(names, f"{len(names)} worked files")
        for path in names:
            if not is_readings(path):
                model(path, scratch)
        for path in names:
            if is_readings(path):
                readings(path, scratch)
