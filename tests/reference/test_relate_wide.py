# SPDX-License-Identifier: BSD-2-Clause
"""Readings on a graded lattice are those on every site; what cannot be read there is refused by name."""
import relate_support
from common import check, finish, np, os, run, tempfile
from relate_layouts import alike, both

# an arm, of which sites and nodes beyond the matching volume are a small part of the sites
MODEL = """
gravity: {prescription: slqc}
clock: {kind: scalar, from: -0.9, to: 0.9, samples: 31}
state: {profile: gaussian_momentum, momentum: 60, relative_spread: 0.085, bounce_at: 0.02}
lattice: {volume_max: 120000}
output: {keep: [moments]}
"""
READINGS = """
window: {tolerance: 0.3}
readings:
  - {name: phi, clock: {observable: phi}}
  - {name: volumes, clock: {observable: v, instrument: sharp, from: 20, to: 1500, bins: 12}}
  - {name: logarithms, clock: {observable: lnv, instrument: cosine, from: 3, to: 9, bins: 10},
     system: {observable: v, from: 10, to: 120002, bins: {log: 24}}}
  - {name: b, clock: {observable: b, instrument: cosine_power, power: 16, centres: 20}}
  - {name: b_lnv, clock: {observable: b, instrument: cosine_power, power: 16, centres: 20},
     system: {observable: lnv, from: -1, to: 12, bins: 26}}
histories: {v_star: [16, 30, 44], at: [-0.25, 0.3], times: 4}
"""
NOT_LOCAL = "readings:\n  - {name: rough, clock: {observable: b, instrument: sharp, bins: 16}}\n"
NO_FUNCTION = "readings:\n  - {name: pair, clock: {observable: v, instrument: sharp, from: 10, to: 90, bins: 4}, system: {observable: b, bins: 4}}\n"


def same(folder):
    full, graded = both(folder, "layouts", MODEL, READINGS, 1)
    for name in ("phi", "volumes", "logarithms", "b", "b_lnv"):
        alike(name, full, graded)
    rows, sites = graded["relational/b/system_sites"][()], full["relational/b/probability"].shape[1]
    check(len(rows) < sites / 2 and rows.max() > 10, f"{len(rows)} rows in place of {sites}, one of which stands for {rows.max():.0f} sites")
    one, two = full["relational/b/probability"][()], graded["relational/b/probability"][()]
    plain = int(np.argmax(rows > 1))
    good = np.isfinite(one[:, 0])
    check(np.abs(one[good, :plain] - two[good, :plain]).max() < 1e-13, "P(v|b) is the same site by site")
    for key in ("p_ss", "p_sl", "p_ls", "p_ll", "d_sl_ll", "p_stay"):
        a, b, e = (f["histories/" + n][()] for f, n in ((full, key), (graded, key), (full, "error")))
        check(np.all(np.abs(a - b) <= e + graded["histories/error"][()]), f"histories: {key} {b}")
    full.close()
    graded.close()


def refused(folder):
    result = os.path.join(folder, "layouts_graded.h5")
    for text, words in ((NOT_LOCAL, ("readings[0] ('rough')", "'b' with instrument 'sharp'", "cosine_power", "lattice.layout full")),
                        (NO_FUNCTION, ("readings[0] ('pair')", "system 'b' is no function of v"))):
        done = run("relate", result, relate_support.write(folder, "no.yaml", text), "-o", os.path.join(folder, "no.h5"), expect=2)
        for word in words:
            check(word in done.stderr, f"refused with '{word}'")
    # layout auto would take every site, ten million of them
    wide = relate_support.evolve(folder, "wide", MODEL.replace("relative_spread: 0.085", "relative_spread: 0.02").replace("lattice: {volume_max: 120000}\n", ""))
    done = run("relate", wide, relate_support.write(folder, "no.yaml", NOT_LOCAL), "-o", os.path.join(folder, "no.h5"), expect=2)
    check("sites would be held" in done.stderr and "cosine_power" in done.stderr, f"a lattice that nobody asked for is refused: {done.stderr}")


with tempfile.TemporaryDirectory() as scratch:
    same(scratch)
    refused(scratch)
finish()
