# SPDX-License-Identifier: BSD-2-Clause
"""mlqc1 on a truncated lattice with the extension imposed at its edge: an independent, rough way to the negative eigenvalues of
'ebbturn spectrum', whose own construction from four waves never truncates. Rows: Yang, Ding, Ma, Phys. Lett. B 682, 1 (2009),
arXiv:0904.4379 (from memory), v = 4n, G = 1; the edge takes the two functions that a state of the extension is made of far out,
(1/v) cos(beta0 v/2 + delta) and v^(-1/2) ln v, in place of the two sites beyond. The edge costs O(1/v_max)."""
from common import check, finish, h5py, np, os, run, tempfile

GAMMA, DELTA = 0.2375, 0.4
G2 = GAMMA * GAMMA
A0 = 3 * np.pi


def truncated(sites):
    v = 4.0 * np.arange(1, sites + 1)
    first = A0 * G2 * np.sqrt(v * (v + 4)) * (v + 2) / 4
    second = -A0 * (1 + G2) * np.sqrt(v * (v + 8)) * (v + 4) / 16
    # S_8 and S_4 on the diagonal, 2 v^2 as soon as both neighbours stand at v > 0; v = 4 has no neighbour 4 below v/2
    s8 = v * (v + 4 + np.maximum(v - 4, 0)) / 4
    s4 = v * (v + 2 + np.maximum(v - 2, 0)) / 4
    matrix = np.diag(A0 * ((1 + G2) / 4 * s8 - G2 * s4)) + np.diag(first[:-1], 1) + np.diag(first[:-1], -1)
    matrix += np.diag(second[:-2], 2) + np.diag(second[:-2], -2)
    beta0 = np.arcsin(1 / np.sqrt(1 + G2))

    def waves(at):
        return np.stack([np.cos(beta0 * at / 2 + DELTA) / at, np.log(at / v[-1]) / np.sqrt(at)], 1)
    inside, outside = waves(v[-2:]), waves(v[-1] + np.array([4.0, 8.0]))
    links = np.array([[second[-2], 0.0], [first[-1], second[-1]]])
    block = links @ outside @ np.linalg.inv(inside)
    check(abs(block[0, 1] - block[1, 0]) < 1e-2 * np.abs(block).max(), "what the edge adds is nearly symmetric")
    matrix[-2:, -2:] += (block + block.T) / 2
    return np.linalg.eigvalsh(matrix)


with tempfile.TemporaryDirectory() as scratch:
    path, out = os.path.join(scratch, "model.yaml"), os.path.join(scratch, "out.h5")
    with open(path, "w", encoding="utf-8") as f:
        f.write(f"gravity: {{prescription: mlqc1, immirzi: {GAMMA}, extension: {{delta: {DELTA}}}}}\n"
                "spectrum: {interval: [-2000.0, 0.0]}\n")
    run("spectrum", path, "-o", out)
    with h5py.File(out) as f:
        exact = f["spectrum/eigenvalue"][()]
    check(len(exact) >= 2, f"{len(exact)} negative eigenvalues")
    check(abs(exact[-1] + 116.0676215728159298) < 1e-9, "the first one, exact formula by an independent program: -116.06762157281593")
    rough = [truncated(sites) for sites in (800, 1600)]
    for value in exact[-2:]:
        coarse, fine = (spectrum[np.abs(spectrum / value - 1).argmin()] for spectrum in rough)
        order = np.log2(abs(coarse - value) / abs(fine - value))
        check(0.8 < order < 1.2, f"{value:.6f}: the edge costs {abs(fine / value - 1):.1e} on 1600 sites, order {order:.2f}")
        off = abs((2 * fine - coarse) / value - 1)
        check(off < 1e-3, f"{value:.6f} within 1e-3 after extrapolation: {off:.1e}")
finish()
