#!/usr/bin/env python3
# SPDX-License-Identifier: BSD-2-Clause
"""Draws a result of 'ebbturn evolve': probability over clock and volume, volume, density. Writes PREFIX.pdf and .png.

Lines differ in dashes as well as in colour and the colour map is monotonic in brightness, so that the picture reads in
grey and for colour-blind readers. A panel whose data are missing says so."""
import argparse
import os
import sys

try:
    import numpy as np
    import h5py  # noqa: F401  (used by ebbturn_result; asked for here for the message's sake)
    import matplotlib
    matplotlib.use("Agg")
    import matplotlib.pyplot as plt
except ImportError as missing:
    from ebbturn_python import switch
    switch("plot_bounce", missing)

from ebbturn_result import Result

# Okabe and Ito's palette for colour-blind readers (Color Universal Design, 2008; from memory)
BLUE, VERMILLION, ORANGE, BLACK = "#0072b2", "#d55e00", "#e69f00", "#000000"
ROWS, BINS = 400, 400  # pixels of the probability panel: more than paper shows
TAIL = 1e-6            # probability left out below and above the picture


def plain(text):
    """Text from a file is no mathematics."""
    return text.replace("$", r"\$").replace("\n", " ")


UNITS = {"1/sqrt(G)": r"$1/\sqrt{G}$", "sqrt(G)": r"$\sqrt{G}$", "1/G^2": r"$1/G^2$", "length^3": r"length$^3$"}


def label(result, path, symbol, fallback):
    """Axis label with the unit that the file states."""
    unit = result.text(path, "units") or fallback
    return symbol if unit == "1" else f"{symbol} [{UNITS.get(unit, plain(unit))}]"


def cells(v, weight, logarithmic):
    """Order of the sites by |v|, their masses' weights, and the edges of their cells. Both signs fall into one cell."""
    size, which = np.unique(np.round(np.abs(v), 9), return_inverse=True)
    x = np.log(size) if logarithmic else size
    middle = 0.5 * (x[1:] + x[:-1])
    edge = np.concatenate(([x[0] - (middle[0] - x[0])], middle, [x[-1] + (x[-1] - middle[-1])]))
    if logarithmic:
        edge = np.exp(edge)
    smallest = 0.25 * size[size > 0][0]  # a logarithmic axis has no zero
    return which, weight, np.maximum(edge, smallest)


def picture(result, clock):
    """Probability per unit of ln|v| on BINS logarithmic bins: (rows used, bin edges, values), or None."""
    if "probability/v" not in result or "lattice/v" not in result:
        return None
    data, v = result.file["probability/v"], result["lattice/v"]
    weight = result["lattice/weight"] if "lattice/weight" in result else np.ones(len(v))
    spacing = np.diff(v)
    graded = result.text("/lattice", "layout") == "graded"
    logarithmic = graded or (len(v) > 2 and v[0] > 0 and np.ptp(spacing) > 1e-6 * np.max(spacing))
    which, weight, edge = cells(v, weight, logarithmic)
    rows = np.unique(np.linspace(0, data.shape[0] - 1, min(ROWS, data.shape[0])).astype(int))
    below = np.zeros((len(rows), len(edge)))  # probability below each cell edge, a uniform density within a cell
    for i, row in enumerate(rows):
        mass = np.bincount(which, weights=np.nan_to_num(data[row]) * weight, minlength=len(edge) - 1)
        below[i, 1:] = np.cumsum(mass)
    total = below[:, -1]
    if not np.any(total > 0):
        return None
    below[total > 0] /= total[total > 0, None]
    seen = below[total > 0]
    low = edge[np.argmax(seen.max(axis=0) > TAIL) - 1]
    high = edge[min(np.argmax(seen.min(axis=0) > 1 - TAIL), len(edge) - 1)]
    bins = np.geomspace(max(low, edge[0]), high if high > low else edge[-1], BINS + 1)
    density = np.array([np.diff(np.interp(bins, edge, line)) for line in below]) / np.diff(np.log(bins))
    density[total <= 0] = np.nan  # a row that was never written
    return rows, bins, density


def absent(axes, what):
    axes.tick_params(which="both", left=False, labelleft=False)
    axes.text(0.5, 0.5, f"no {what} in this file", transform=axes.transAxes, ha="center", va="center")


def line(axes, clock, values, **style):
    """Draws what is there; True where anything was."""
    values = np.asarray(values, dtype=float)
    if values.shape != clock.shape or not np.any(np.isfinite(values)):
        return False
    axes.plot(clock, np.where(values > 0, values, np.nan), **style)
    return True


def mark_bounce(axes, result, ordinate, text="bounce (with error)"):
    """The bounce with its errors. An error too small to see still leaves the marker."""
    at, value = result["bounce/clock"], result["bounce/" + ordinate]
    if not (np.isfinite(at) and np.isfinite(value)):
        return
    wide, high = np.nan_to_num([result.error("bounce/clock"), result.error("bounce/" + ordinate)])
    axes.errorbar(at, value, xerr=wide, yerr=high, fmt="o", ms=5, mfc="white", mec=BLACK, ecolor=BLACK, capsize=3,
                  zorder=5, label=text)
    axes.axvline(at, color=BLACK, lw=0.6, alpha=0.5, zorder=1)


def legend(axes, place="best", **more):
    if axes.get_legend_handles_labels()[0]:
        axes.legend(fontsize=8, framealpha=0.9, loc=place, handlelength=3.2, **more)


def draw_probability(figure, axes, result, clock):
    image = picture(result, clock)
    if image is None:
        absent(axes, "probability")
        return
    rows, bins, density = image
    mesh = axes.pcolormesh(clock[rows], np.sqrt(bins[1:] * bins[:-1]), density.T, cmap="cividis", shading="nearest",
                           norm=matplotlib.colors.PowerNorm(0.5, vmin=0), rasterized=True)
    figure.colorbar(mesh, ax=axes, label=r"probability per unit of $\ln v$", pad=0.01)
    axes.set_yscale("log")
    line(axes, clock, result["effective/v"], color=VERMILLION, lw=1.2, ls="--", label="effective")
    mean, spread = result["moments/v_mean"], result["moments/v_spread"]
    if np.shape(mean) == clock.shape and np.shape(spread) == clock.shape:
        some = np.unique(np.linspace(0, len(clock) - 1, 18).astype(int))[1:-1]  # so that the probability stays visible
        below = np.minimum(spread[some], 0.99 * mean[some])  # a logarithmic axis has no room for less than nothing
        axes.errorbar(clock[some], mean[some], yerr=[below, spread[some]], fmt="x", ms=4, mew=1, color="white",
                      elinewidth=1, capsize=2.5, label=r"mean $\pm$ spread")
    mark_bounce(axes, result, "v")
    axes.set_ylim(bins[0], bins[-1])
    axes.set_ylabel(r"volume $|v|$")
    legend(axes, "upper center", facecolor="#bbbbbb")  # "best" would search the whole mesh


def volume_lines(axes, result, clock):
    """Mean, spread, quantiles, effective; True where anything was there."""
    mean, spread = result["moments/v_mean"], result["moments/v_spread"]
    some = line(axes, clock, mean, color=BLACK, lw=1.6, label="mean")
    if some and np.shape(spread) == clock.shape:
        axes.fill_between(clock, np.maximum(mean - spread, 1e-3 * mean), mean + spread, color=BLUE, alpha=0.25, lw=0,
                          label=r"mean $\pm$ spread")
    dashes = {0: (0, (1, 1)), 1: (0, (5, 1, 1, 1)), 2: (0, (1, 3))}
    quantiles, levels = np.asarray(result["quantiles/v"]), np.atleast_1d(result["quantiles/level"])
    for i, level in enumerate(levels if quantiles.ndim == 2 else []):
        some |= line(axes, clock, quantiles[:, i], color=BLUE, lw=1.1, ls=dashes[i % 3], label=f"{100 * level:g}% quantile")
    return some | line(axes, clock, result["effective/v"], color=VERMILLION, lw=1.4, ls="--", label="effective")


def draw_inset(axes, result, clock):
    """The surroundings of the bounce, where a logarithmic axis hides the spread; True where it was drawn."""
    at, v, mean = result["bounce/clock"], result["bounce/v"], np.asarray(result["moments/v_mean"], dtype=float)
    if not (np.isfinite(at) and np.isfinite(v)) or mean.shape != clock.shape:
        return False
    near = np.flatnonzero(mean < 2 * v)
    if len(near) < 8 or near[0] == 0 or near[-1] == len(clock) - 1:
        return False
    inset = axes.inset_axes([0.3, 0.46, 0.4, 0.5])
    volume_lines(inset, result, clock)
    mark_bounce(inset, result, "v")
    inset.set_xlim(clock[near[0]], clock[near[-1]])
    inset.set_ylim(0.7 * v, 2 * v)
    inset.tick_params(labelsize=7)
    return True


def draw_volume(axes, result, clock):
    if not volume_lines(axes, result, clock):
        absent(axes, "volume")
        return
    mark_bounce(axes, result, "v", None)  # the panel above has it in its legend, and there is no room
    axes.set_yscale("log")
    axes.set_ylabel(r"volume $|v|$")
    legend(axes, "lower left" if draw_inset(axes, result, clock) else "best")


def critical_density(settings):
    """G^2 rho_c, rho_c = 3/(8 pi G gamma^2 lambda^2); Ashtekar, Pawlowski, Singh, Phys. Rev. D 74, 084003 (2006) (from memory)."""
    g = settings.get("gravity", {})
    try:
        return 3 * g["newton"] / (8 * np.pi * (g["immirzi"] * g["polymer_scale"]) ** 2)
    except (KeyError, TypeError, ZeroDivisionError):
        return np.nan


def draw_density(axes, result, clock):
    some = False
    for path, style in (("moments/density_mean", dict(color=BLACK, lw=1.6, label="mean of density")),
                        ("moments/density_of_means", dict(color=BLUE, lw=1.4, ls="-.", label="density of means")),
                        ("effective/density", dict(color=VERMILLION, lw=1.4, ls=(0, (2, 4)), label="effective"))):
        some |= line(axes, clock, result[path], **style)
    if not some:
        absent(axes, "density")
        return
    critical = critical_density(result.settings)
    if np.isfinite(critical):
        axes.axhline(critical, color=ORANGE, lw=1.4, ls=(0, (1, 1)), label=rf"critical, $\rho_c$ = {critical:.4g}")
    mark_bounce(axes, result, "density")
    axes.set_yscale("log")
    axes.set_ylabel(label(result, "moments/density_mean", r"density $\rho$", "1/G^2"))
    legend(axes, "lower center" if np.isfinite(result["bounce/clock"]) else "best")


def subtitle(result):
    verdict = result.text("/bounce", "verdict")
    text = f"bounce: {verdict}" if verdict else "bounce: not computed"
    if np.isfinite(result["bounce/clock"]) and np.isfinite(result["bounce/v"]):
        text += (rf", at clock {result['bounce/clock']:.6g} $\pm$ {result.error('bounce/clock'):.1g}"
                 rf", $|v|$ = {result['bounce/v']:.8g} $\pm$ {result.error('bounce/v'):.1g}")
    return text if result.complete else "INCOMPLETE RUN; " + text


def draw(result, prefix):
    clock = np.atleast_1d(result["clock/value"])
    figure, axes = plt.subplots(3, 1, figsize=(7.2, 9.6), sharex=True, layout="constrained")
    draw_probability(figure, axes[0], result, clock)
    draw_volume(axes[1], result, clock)
    draw_density(axes[2], result, clock)
    if np.all(np.isfinite(clock)) and len(clock) > 1:
        axes[2].set_xlim(clock[0], clock[-1])
    kind = plain(result.text("/clock", "kind") or "scalar")
    axes[2].set_xlabel(label(result, "clock/value", f"clock ({kind})", "1/sqrt(G)"))
    figure.suptitle(plain(result.text("/", "title") or "ebbturn result") + "\n" + subtitle(result), fontsize=11)
    figure.savefig(prefix + ".pdf", metadata={"CreationDate": None})  # equal results give equal files
    figure.savefig(prefix + ".png", dpi=150)


def main():
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("result", help="result file of 'ebbturn evolve'")
    parser.add_argument("-o", "--output", metavar="PREFIX", help="write PREFIX.pdf and PREFIX.png (default: RESULT's name)")
    options = parser.parse_args()
    prefix = options.output or os.path.splitext(options.result)[0]
    try:
        result = Result(options.result)
        draw(result, prefix)
    except OSError as reason:
        print(f"plot_bounce: error: '{options.result}': {reason}", file=sys.stderr)
        return 4
    print(f"wrote '{prefix}.pdf' and '{prefix}.png'")
    return 0


if __name__ == "__main__":
    sys.exit(main())
