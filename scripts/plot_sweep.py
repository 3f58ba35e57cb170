#!/usr/bin/env python3
# SPDX-License-Identifier: BSD-2-Clause
"""The table of a sweep as a picture: bounce volume, with its error, against the setting that varies most (or --x KEY), one
curve for each combination of the others, the effective bounce dashed; below it the slope of the logarithms between neighbours
where the polymer scale varies, else the ratio to the effective bounce. Crosses: the bounce by each clock of a readings file. Writes PREFIX.pdf and PREFIX.png."""
import argparse
import os
import sys

try:
    import h5py
    import numpy as np
    import matplotlib
    matplotlib.use("Agg")
    import matplotlib.pyplot as plt
except ImportError as missing:
    from ebbturn_python import switch
    switch("plot_sweep", missing)

SCALE = "gravity.polymer_scale"


def read(path):
    try:
        with h5py.File(path) as f:
            return {k: v[()] for k, v in f["sweep"].items()}
    except (OSError, KeyError) as error:
        sys.exit(f"plot_sweep: error: '{path}' holds no sweep: {error}")


def curves(table, keys, x):
    """{label: rows in the order of x} of the cases that are done."""
    found = {}
    for row in np.argsort(table[x], kind="stable"):
        if table["status"][row] == b"done":
            words = [v.decode() if isinstance(v := table[k][row], bytes) else f"{k.split('.')[-1]} {v:g}" for k in keys if k != x]
            found.setdefault(", ".join(words), []).append(row)
    return found


def clocks(axes, table, rows, x, colour):
    """What other clocks call the bounce, where they read one, as a physical volume."""
    unit = table["bounce_volume"][rows] / table["bounce_v"][rows]
    names = [k[len("relational_"):-len("_bounce")] for k in table if k.startswith("relational_") and k.endswith("_bounce")]
    for name, mark in zip(names, "x+1234" * len(names)):
        ok = table[f"relational_{name}_status"][rows] == b"ok"
        value, error = (unit * table[f"relational_{name}_bounce{e}"][rows] for e in ("", "_error"))
        axes.errorbar(table[x][rows][ok], value[ok], error[ok], fmt=mark, ms=5, lw=1, color=colour, alpha=0.6, label=f"by clock {name}")


def main():
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("result")
    parser.add_argument("-o", metavar="PREFIX", help="default: the result's name")
    parser.add_argument("--x", metavar="KEY", help="setting on the horizontal axis")
    arguments = parser.parse_args()
    table = read(arguments.result)
    keys = [k for k in table if "." in k and not k.startswith(("relational_", "histories_", "propagator_"))]
    numbers = [k for k in keys if table[k].dtype.kind == "f"]
    if not numbers or (arguments.x and arguments.x not in numbers):
        sys.exit(f"plot_sweep: error: no numbers to plot over; the sweep varies {', '.join(keys)}")
    x = arguments.x or (SCALE if SCALE in numbers else max(numbers, key=lambda k: len(set(table[k]))))
    figure, (above, below) = plt.subplots(2, 1, sharex=True, figsize=(7, 7), constrained_layout=True)
    for label, rows in curves(table, keys, x).items():
        at = table[x][rows]
        line = above.errorbar(at, table["bounce_volume"][rows], table["bounce_volume_error"][rows], fmt="o-", ms=4, label=label or "bounce")
        colour = line[0].get_color()
        clocks(above, table, rows, x, colour)
        above.plot(at, table["bounce_effective_volume"][rows], "--", color=colour, lw=1)
        if x == SCALE:
            middle = np.sqrt(at[:-1] * at[1:])
            below.errorbar(middle, table["slope_local"][rows][:-1], table["slope_local_error"][rows][:-1], fmt="o-", ms=4, color=colour)
            below.plot(middle, table["effective_slope_local"][rows][:-1], "--", color=colour, lw=1)
        else:
            below.errorbar(at, table["bounce_ratio"][rows], table["bounce_ratio_error"][rows], fmt="o-", ms=4, color=colour)
    above.set(xscale="log", yscale="log", ylabel="bounce volume [length$^3$]")
    above.legend(fontsize="small", title="dashed: effective")
    below.set(xlabel="polymer scale $\\lambda$ [length]" if x == SCALE else x,
              ylabel="d ln V$_B$/d ln $\\lambda$" if x == SCALE else "volume over effective one")
    prefix = arguments.o or os.path.splitext(arguments.result)[0]
    for suffix in (".pdf", ".png"):
        figure.savefig(prefix + suffix, dpi=120)
    print(f"plot_sweep: '{prefix}.pdf' and '{prefix}.png'")


main()
