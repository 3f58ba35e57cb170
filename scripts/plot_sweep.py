#!/usr/bin/env python3
# SPDX-License-Identifier: BSD-2-Clause
"""The table of a sweep as a picture: bounce volume, with its error, against the setting that varies most (or --x KEY), one
curve for each combination of the others, the effective bounce dashed; below it the slope of the logarithms between neighbours
where the polymer scale varies, else how far the bounce lies above the effective one. Crosses: the bounce by each clock of a readings file. Writes PREFIX.pdf and PREFIX.png."""
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
LEAST_SLOPE_SPAN = 0.02  # of the lower panel: equal slopes make a straight line, not a picture of their rounding
MANY = 8  # curves from which on colours run in order and the legend stands beside the panel


def read(path, only):
    """Title and columns of the cases that have the values asked for."""
    try:
        with h5py.File(path) as f:
            title, table = f.attrs["title"], {k: v[()] for k, v in f["sweep"].items()}
    except (OSError, KeyError) as error:
        sys.exit(f"plot_sweep: error: '{path}' holds no sweep: {error}")
    for key, _, value in (text.partition("=") for text in only):
        if key not in table:
            sys.exit(f"plot_sweep: error: '{path}' has no column '{key}'")
        keep = table[key] == value.encode() if table[key].dtype.kind == "S" else np.isclose(table[key], float(value))
        table = {k: v[keep] for k, v in table.items()}
    return title.decode() if isinstance(title, bytes) else title, table


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


def draw(axes, table, x, title):
    """The curves of one result, upper and lower panel."""
    above, below = axes
    found = curves(table, settings(table), x)
    if len(found) >= MANY:
        above.set_prop_cycle(color=plt.get_cmap("viridis")(np.linspace(0, 0.95, len(found))))
    for label, rows in found.items():
        at = table[x][rows]
        few = "o-" if len(at) < 12 else "-"
        name = ", ".join(w for w in (title, label) if w)
        line = above.errorbar(at, table["bounce_volume"][rows], table["bounce_volume_error"][rows], fmt=few, ms=4, label=name or "bounce")
        colour = line[0].get_color()
        clocks(above, table, rows, x, colour)
        above.plot(at, table["bounce_effective_volume"][rows], "--", color=colour, lw=1)
        if x == SCALE:
            middle = np.sqrt(at[:-1] * at[1:])
            below.errorbar(middle, table["slope_local"][rows][:-1], table["slope_local_error"][rows][:-1], fmt=few, ms=4, color=colour)
            below.plot(middle, table["effective_slope_local"][rows][:-1], "--", color=colour, lw=1)
        else:
            below.errorbar(at, table["bounce_ratio"][rows] - 1, table["bounce_ratio_error"][rows], fmt=few, ms=4, color=colour)


def settings(table):
    return [k for k in table if "." in k and not k.startswith(("relational_", "histories_", "propagator_"))]


def main():
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("result", nargs="+", help="several are drawn into one picture, named by their titles")
    parser.add_argument("-o", metavar="PREFIX", help="default: the first result's name")
    parser.add_argument("--x", metavar="KEY", help="setting on the horizontal axis")
    parser.add_argument("--only", metavar="KEY=VALUE", action="append", default=[], help="cases with this value only")
    arguments = parser.parse_args()
    x = arguments.x
    figure, (above, below) = plt.subplots(2, 1, sharex=True, figsize=(7, 7), constrained_layout=True)
    for path in arguments.result:
        title, table = read(path, arguments.only)
        numbers = [k for k in settings(table) if table[k].dtype.kind == "f"]
        if not numbers or (x and x not in numbers):
            sys.exit(f"plot_sweep: error: no numbers to plot over; '{path}' varies {', '.join(settings(table))}")
        x = x or (SCALE if SCALE in numbers else max(numbers, key=lambda k: len(set(table[k]))))
        draw((above, below), table, x, title if len(arguments.result) > 1 else "")
    above.set(xscale="log", yscale="log", ylabel="bounce volume [length$^3$]")
    handles, labels = above.get_legend_handles_labels()
    if len(labels) < MANY:
        above.legend(handles, labels, fontsize="small", title="dashed: effective")
    else:
        above.legend(handles, labels, fontsize="x-small", title="dashed: effective", loc="upper left", bbox_to_anchor=(1.01, 1.0))
    below.set(xlabel="polymer scale $\\lambda$ [length]" if x == SCALE else x,
              ylabel="d ln V$_B$/d ln $\\lambda$" if x == SCALE else "volume over effective one, minus 1")
    if x != SCALE and all(np.all(line.get_ydata() > 0) for line in below.lines):
        below.set_yscale("log")
    if x == SCALE and len(values := sorted({float(v) for axis in above.lines for v in axis.get_xdata()})) <= 12:
        below.set_xticks(values, [f"{v:g}" for v in values])
        below.minorticks_off()
    if x == SCALE:
        below.ticklabel_format(axis="y", useOffset=False)
        low, high = below.get_ylim()
        if high - low < LEAST_SLOPE_SPAN:
            below.set_ylim((low + high - LEAST_SLOPE_SPAN) / 2, (low + high + LEAST_SLOPE_SPAN) / 2)
    prefix = arguments.o or os.path.splitext(arguments.result[0])[0]
    for suffix in (".pdf", ".png"):
        figure.savefig(prefix + suffix, dpi=120)
    print(f"plot_sweep: '{prefix}.pdf' and '{prefix}.png'")


main()
