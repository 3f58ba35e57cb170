# SPDX-License-Identifier: BSD-2-Clause
"""Every worked model runs as its first comment promises, to a complete result."""
import glob

from common import check, finish, h5py, os, run, tempfile

INPUTS = os.path.join(os.path.dirname(__file__), "..", "..", "inputs")

with tempfile.TemporaryDirectory() as scratch:
    models = sorted(glob.glob(os.path.join(INPUTS, "*.yaml")))
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
            run(command, path, "-o", out)
            if os.path.exists(out):
                with h5py.File(out) as f:
                    check(f.attrs["complete"] == 1, f"{name}: complete result of '{command}'")
finish()
