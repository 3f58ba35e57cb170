# SPDX-License-Identifier: BSD-2-Clause
"""Every worked model runs as its first comment promises, to a complete result."""
import glob
import re

from common import check, finish, h5py, os, run, tempfile

INPUTS = os.path.join(os.path.dirname(__file__), "..", "..", "inputs")

with tempfile.TemporaryDirectory() as scratch:
    def is_readings(path):
        with open(path, encoding="utf-8") as f:
            return "\nreadings:" in f.read()

    files = sorted(glob.glob(os.path.join(INPUTS, "*.yaml")))
    models = [path for path in files if not is_readings(path)]
    check(len(models) >= 5, f"{len(models)} worked models")
    for path in models:
        name = os.path.basename(path)
        with open(path, encoding="utf-8") as f:
            text = f.read()
        check(text.startswith("# "), f"{name} opens with a comment")
        commands = [command for command, key in (("spectrum", "\nspectrum:"), ("evolve", "\nstate:"), ("sweep", "\nbase:")) if key in text]
        check(commands, f"{name} is for some command")
        for command in commands:
            check(f"ebbturn {command} inputs/{name}" in text.replace("\n# ", " "), f"{name} says how to run '{command}'")
            out = os.path.join(scratch, f"{name}.{command}.h5")
            if name == "survey.yaml":  # minutes of work: read, planned and left alone
                run(command, path, "--dry-run")
                continue
            run(command, path, "-o", out)
            if os.path.exists(out):
                with h5py.File(out) as f:
                    check(f.attrs["complete"] == 1, f"{name}: complete result of '{command}'")
    for path in files:  # readings files, each of the model that its comment names first
        if not is_readings(path):
            continue
        name = os.path.basename(path)
        with open(path, encoding="utf-8") as f:
            text = f.read()
        model = re.search(r"universe of (\w+)\.yaml", text)
        check(model is not None and f"inputs/{name}" in text, f"{name} says how to run it")
        out = os.path.join(scratch, name + ".h5")
        run("relate", os.path.join(scratch, f"{model[1]}.yaml.evolve.h5"), path, "-o", out, expect=1)
        with h5py.File(out) as f:
            check(f.attrs["complete"] == 1, f"{name}: complete result of 'relate'")
finish()
