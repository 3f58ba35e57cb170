# SPDX-License-Identifier: BSD-2-Clause
"""Relational probabilities of the solvable model by dense matrices: what the tests of `relate` compare with.

v = 4n, n = 1..N; Theta in closed form, diagonalised by numpy; readings of b as explicit matrices on a ring of 2N sites, without
any fast transform. Nothing here comes from the program. `python3 relational_reference.py` prints the numbers."""
import math

import numpy as np

G = 1.0
KAPPA = math.sqrt(12 * math.pi * G)


class Universe:
    """Solvable ordering behind a wall after N sites, psi(t) = exp(i sqrt(Theta) t) psi."""

    def __init__(self, sites, v0=96.0, spread=12.0, b0=math.pi / 2, chirp=0.0):
        self.v = 4.0 * np.arange(1, sites + 1)
        link = -0.75 * math.pi * G * np.sqrt(self.v[:-1] * self.v[1:]) * (self.v[:-1] + 2)
        theta = np.diag(1.5 * math.pi * G * self.v**2) + np.diag(link, 1) + np.diag(link, -1)
        square, self.mode = np.linalg.eigh(theta)
        self.omega = np.sqrt(square)
        psi = np.exp(-0.5j * self.v * b0 - (1 + 1j * chirp) * (self.v - v0)**2 / (4 * spread**2))
        self.c = self.mode.T @ (psi / np.linalg.norm(psi))
        self.momentum = np.sum(np.abs(self.c)**2 * self.omega)
        self.bounce = self.momentum / math.sqrt(3 * math.pi * G)

    def at(self, t):
        return self.mode @ (np.exp(1j * np.outer(self.omega, np.atleast_1d(t))) * self.c[:, None])

    def move(self, psi, t):
        return self.mode @ (np.exp(1j * self.omega * t) * (self.mode.T @ psi))


def trapezoid(low, high, samples):
    t = np.linspace(low, high, samples)
    w = np.full(samples, t[1] - t[0])
    w[[0, -1]] *= 0.5
    return t, w


def quantile(v, mass, level):
    """Mass of a site spread uniformly over [v - 2, v + 2]."""
    below = np.concatenate(([0.0], np.cumsum(mass))) / mass.sum()
    return float(np.interp(level, below, np.concatenate(([v[0] - 2.0], v + 2.0))))


class Ring:
    """b on 2N sites, half-cell grid: a reading with amplitudes f(b_j) is the matrix A_nm = sum_j f_j exp(2i(m - n) b_j)/2N."""

    def __init__(self, sites):
        self.sites, self.size = sites, 2 * sites
        self.b = math.pi * (np.arange(self.size) + 0.5) / self.size
        self.n = np.arange(-sites + 1, sites + 1)

    def read(self, amplitude, psi):
        """Histogram over |v| = 0, 4, .., 4N of |reading psi|^2 for columns psi, and the part on n <= 0."""
        out = np.exp(-2j * np.outer(self.n, self.b)) * amplitude / self.size
        seen = out @ (np.exp(2j * np.outer(self.b, np.arange(1, self.sites + 1))) @ psi)
        mass = np.abs(seen)**2
        folded = np.zeros((self.sites + 1, mass.shape[1]))
        np.add.at(folded, np.abs(self.n), mass)
        return folded, mass[self.n <= 0].sum(axis=0)

    def sharp(self, bins, i):
        return (np.floor(self.b / (math.pi / bins)).astype(int) == i).astype(float)

    def cosine(self, bins, i):
        width = math.pi / bins
        x = (self.b - (i + 0.5) * width + math.pi / 2) % math.pi - math.pi / 2
        return np.where(np.abs(x) < width, np.cos(math.pi * x / (2 * width)), 0.0)

    def cosine_power(self, power, centres, i):
        norm = math.sqrt(4.0**power / (centres * math.comb(2 * power, power)))
        return norm * np.cos(self.b - math.pi * (i + 0.5) / centres)**power


def conditional(universe, ring, amplitude, low=-0.4, high=0.4, samples=161):
    """dwell, median, mean, leak of P(|v| | reading)."""
    t, w = trapezoid(low, high, samples)
    mass, leak = ring.read(amplitude, universe.at(t))
    v, mass = 4.0 * np.arange(ring.sites + 1), mass @ w
    return dict(dwell=mass.sum(), median=quantile(v, mass, 0.5), mean=v @ mass / mass.sum(), leak=leak @ w / mass.sum(),
                mass=mass)


if __name__ == "__main__":
    world = Universe(512)
    circle = Ring(512)
    for name, window in (("sharp 4", circle.sharp(16, 4)), ("cosine 7", circle.cosine(16, 7)),
                         ("cosine_power 47", circle.cosine_power(64, 96, 47))):
        found = conditional(world, circle, window)
        print(name, *(f"{key} {found[key]:.12g}" for key in ("dwell", "median", "mean", "leak")))
