#!/usr/bin/env python3
# SPDX-License-Identifier: BSD-2-Clause
"""What each self-adjoint extension does: eigenvalues of p_phi^2 and the bounce of one and the same packet for 0 < Lambda <
Lambda_c as functions of the extension angle gravity.extension.delta, 64 angles for each of five cosmological constants. Runs
'ebbturn spectrum' and 'ebbturn evolve' once for each (some three minutes on two cores) and writes PREFIX.h5, PREFIX.pdf and
PREFIX.png. Levels of one extension interlace with those of every other, and each moves up to the next one's place as delta runs
through pi; the bounce hardly knows of it."""
import argparse
import concurrent.futures
import os
import subprocess
import sys
import tempfile

try:
    import numpy as np
    import h5py
    import matplotlib
    matplotlib.use("Agg")
    import matplotlib.pyplot as plt
except ImportError as missing:
    from ebbturn_python import switch
    switch("sweep_extensions", missing)

from ebbturn_result import Result

MODEL = """title: one extension
gravity: {{prescription: {prescription}, sector: {sector}, cosmological_constant_over_critical: {ratio!r}, extension: {{delta: {angle!r}}}}}
clock: {{kind: scalar, from: -0.1, to: 0.1, samples: 5}}
state: {{profile: gaussian_momentum, momentum: {momentum!r}, relative_spread: 0.15}}
spectrum: {{interval: [{low!r}, {high!r}]}}
output: {{keep: [moments]}}
"""


def start(program, command, model, out, text):
    """The result of one command; a level that touches an end of the interval, an undecided bounce are results too (exit 1)."""
    done = subprocess.run([program, command, model, "-o", out, "--force"], capture_output=True, text=True,
                          stdin=subprocess.DEVNULL, env={**os.environ, "OMP_NUM_THREADS": "1", "OPENBLAS_NUM_THREADS": "1"},
                          timeout=120)
    if done.returncode not in (0, 1):
        raise RuntimeError(f"'{program} {command}' ended with {done.returncode} for this model:\n{text}{done.stderr}")
    return Result(out)


def run(job):
    """(eigenvalues, errors, bounce and its error) of one extension."""
    program, folder, index, text = job
    model, out = os.path.join(folder, f"{index}.yaml"), os.path.join(folder, f"{index}.h5")
    with open(model, "w", encoding="utf-8") as f:
        f.write(text)
    result = start(program, "spectrum", model, out, text)
    value, error = result["spectrum/eigenvalue"], result["spectrum/error"]
    result.file.close()
    result = start(program, "evolve", model, out, text)
    bounce = np.array([result["bounce/v_median"], result["bounce/v_median_error"]])
    result.file.close()
    os.remove(out)
    return value, error, bounce


def sweep(arguments, ratios, angles):
    """Eigenvalues and errors [2, ratio, angle, level], padded with NaN; bounces and errors [2, ratio, angle]."""
    with tempfile.TemporaryDirectory() as folder:
        jobs = [(arguments.program, folder, i, MODEL.format(prescription=arguments.prescription, sector=arguments.sector,
                                                            ratio=float(ratio), angle=float(angle), low=arguments.low,
                                                            high=arguments.high, momentum=arguments.momentum))
                for i, (ratio, angle) in enumerate((r, a) for r in ratios for a in angles)]
        with concurrent.futures.ThreadPoolExecutor(arguments.jobs) as pool:  # the work is in the programs it starts
            found = []
            for i, pair in enumerate(pool.map(run, jobs)):
                found.append(pair)
                if (i + 1) % len(angles) == 0:
                    print(f"{i + 1} of {len(jobs)} extensions", file=sys.stderr, flush=True)
    levels = max(len(value) for value, _, _ in found)
    table = np.full((2, len(jobs), levels), np.nan)
    for i, pair in enumerate(found):
        for part in range(2):
            table[part, i, :len(pair[part])] = pair[part]
    bounce = np.array([one[2] for one in found]).T.reshape(2, len(ratios), len(angles))
    return table.reshape(2, len(ratios), len(angles), levels), bounce


def write(path, arguments, ratios, angles, table, bounce):
    with h5py.File(path, "w") as f:
        f.attrs["program"] = "ebbturn sweep_extensions"
        f.attrs["prescription"] = arguments.prescription
        f.attrs["sector"] = arguments.sector
        f.attrs["interval"] = [arguments.low, arguments.high]
        for name, values, units, text in (("over_critical", ratios, "1", "Lambda/Lambda_c"),
                                          ("angle", angles, "rad", "gravity.extension.delta")):
            f[name] = values
            f[name].attrs["units"], f[name].attrs["long_name"] = units, text
            f[name].make_scale(name)
        for part, name in enumerate(("eigenvalue", "eigenvalue_error")):
            f[name] = table[part]
            f[name].attrs["units"] = "G"
            f[name].attrs["long_name"] = "eigenvalue of p_phi^2, ascending" if part == 0 else "absolute error of: eigenvalue"
            for axis, scale in enumerate(("over_critical", "angle")):
                f[name].dims[axis].attach_scale(f[scale])
        for part, name in enumerate(("bounce_v", "bounce_v_error")):
            f[name] = bounce[part]
            f[name].attrs["units"] = "1"
            f[name].attrs["long_name"] = "least median of |v|" if part == 0 else "absolute error of: least median of |v|"
            for axis, scale in enumerate(("over_critical", "angle")):
                f[name].dims[axis].attach_scale(f[scale])


def complete_elliptic(m):
    """K as a function of the parameter, by the arithmetic-geometric mean."""
    a, b = 1.0, np.sqrt(1.0 - m)
    while abs(a - b) > 1e-15 * a:
        a, b = 0.5 * (a + b), np.sqrt(a * b)
    return 0.5 * np.pi / a


def draw(prefix, arguments, ratios, angles, table, bounce):
    figure, axes = plt.subplots(2, len(ratios), figsize=(2.6 * len(ratios) + 0.6, 6.2), sharex=True, sharey="row",
                                constrained_layout=True, squeeze=False, height_ratios=[3, 1])
    for axis, ratio, value in zip(axes[0], ratios, table[0]):
        signed = np.sign(value) * np.sqrt(np.abs(value))
        axis.axhspan(-np.sqrt(-arguments.low) if arguments.low < 0 else 0, 0, color="0.92", lw=0)
        for level in signed.T:
            axis.plot(angles, level, ".", color="#0072b2", ms=3)
        spacing = np.pi * np.sqrt(12 * np.pi) / complete_elliptic(1.0 - ratio)
        axis.set_title(f"$\\Lambda = {ratio:g}\\,\\Lambda_c$\nspacing $\\to$ {spacing:.3f}", fontsize=9)
        axis.set_xticks([0, np.pi / 2, np.pi], ["0", "$\\pi/2$", "$\\pi$"])
        axis.grid(alpha=0.3)
    for axis, value, error in zip(axes[1], bounce[0], bounce[1]):
        middle = np.median(value)
        axis.errorbar(angles, value / middle - 1.0, yerr=error / middle, fmt=".", color="#d55e00", ms=3, lw=0.7)
        axis.set_title(f"bounce at v = {middle:.4g}", fontsize=9)
        axis.set_xlabel("extension angle $\\delta$")
        axis.grid(alpha=0.3)
    axes[1][0].set_ylabel("relative change\nof the bounce")
    axes[0][0].set_ylabel("sign(z) $\\sqrt{|z|}$, z eigenvalue of $p_\\phi^2$ [$\\sqrt{G}$]")
    figure.suptitle(f"{arguments.prescription}, sector {arguments.sector:g}: what each extension does "
                    "(grey: negative, not physical)", fontsize=10)
    for ending in ("pdf", "png"):
        figure.savefig(f"{prefix}.{ending}", dpi=150)


def main():
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--program", default=os.environ.get("EBBTURN", "build/ebbturn"), help="default: build/ebbturn")
    parser.add_argument("-o", "--output", default="extensions", help="prefix of what is written; default: extensions")
    parser.add_argument("--prescription", default="smmo", help="default: smmo")
    parser.add_argument("--sector", type=float, default=4.0, help="default: 4")
    parser.add_argument("--ratios", type=float, nargs="+", default=[0.01, 0.1, 0.35, 0.7, 0.95], help="Lambda/Lambda_c")
    parser.add_argument("--angles", type=int, default=64, help="equally spaced in [0, pi); default: 64")
    parser.add_argument("--low", type=float, default=-400.0, help="lower end of the eigenvalues wanted; default: -400")
    parser.add_argument("--high", type=float, default=1600.0, help="upper end; default: 1600")
    parser.add_argument("--momentum", type=float, default=60.0, help="of the packet that bounces; default: 60")
    parser.add_argument("--jobs", type=int, default=min(2, os.cpu_count() or 1), help="programs at a time; default: 2")
    arguments = parser.parse_args()
    if not os.access(arguments.program, os.X_OK):
        sys.exit(f"sweep_extensions: error: no program at '{arguments.program}'; build it, or say --program")
    ratios = np.array(arguments.ratios)
    angles = np.pi * np.arange(arguments.angles) / arguments.angles
    try:
        table, bounce = sweep(arguments, ratios, angles)
    except RuntimeError as reason:
        sys.exit(f"sweep_extensions: error: {reason}")
    write(f"{arguments.output}.h5", arguments, ratios, angles, table, bounce)
    draw(arguments.output, arguments, ratios, angles, table, bounce)
    worst = np.nanmax(table[1] / np.maximum(np.abs(table[0]), 1.0))
    print(f"wrote '{arguments.output}.h5', '.pdf' and '.png': {len(ratios) * len(angles)} extensions, "
          f"{np.count_nonzero(np.isfinite(table[0]))} eigenvalues, largest relative error {worst:.1e}")
    for ratio, value, error in zip(ratios, bounce[0], bounce[1]):
        print(f"  Lambda = {ratio:g} of the critical one: bounce at {np.median(value):.6g}, over all angles within "
              f"{np.ptp(value) / np.median(value):.1e} of it (largest error {error.max() / np.median(value):.1e})")


main()
