# SPDX-License-Identifier: BSD-2-Clause
"""Shared by the tests of `relate`: models and readings from text, comparison with recorded digits."""
from common import check, h5py, os, run


def write(folder, name, text):
    path = os.path.join(folder, name)
    with open(path, "w", encoding="utf-8") as f:
        f.write(text)
    return path


def evolve(folder, name, text, expect=0):
    result = os.path.join(folder, name + ".h5")
    run("evolve", write(folder, name + ".yaml", text), "-o", result, expect=expect)
    return result


def relate(folder, result, name, text, expect=0, **more):
    """The open output of a run, and what it said."""
    path = os.path.join(folder, name + ".h5")
    done = run("relate", result, write(folder, name + ".yaml", text), "-o", path, "--force", expect=expect, **more)
    return h5py.File(path), done


def close(name, found, wanted, tolerance, absolute=False):
    off = abs(found - wanted) / (1.0 if absolute else abs(wanted))
    check(off <= tolerance, f"{name}: {found:.13g}, wanted {wanted:.13g}, off by {off:.1e} (allowed {tolerance:.0e})")
