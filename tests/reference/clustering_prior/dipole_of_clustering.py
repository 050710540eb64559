# SPDX-License-Identifier: GPL-2.0-or-later
"""Standard deviation of a dipole component that clustering leaves in a survey, for bias 1.

    sd = sqrt(3 C_1 / (4 pi)),
    C_1 = 4 pi int dk/k Delta^2(k) [ int dz n(z) D(z) j_1(k chi(z)) ]^2     (n normalised)

flat LCDM of Planck 2018 VI (A&A 641, A6, Table 2, last column: values from memory), transfer
function without wiggles of Eisenstein & Hu 1998 (ApJ 496, 605, Eqs. 26, 28-31), growth of
Carroll, Press & Turner 1992 (ARA&A 30, 499, Eq. 29). Compares with the table in the comment of the
prior file named on the command line.
"""
import re
import sys

import numpy as np
from scipy.special import spherical_jn

OMEGA_M, H, N_S, SIGMA_8, OMEGA_B_H2, THETA = 0.3153, 0.6736, 0.9649, 0.8111, 0.02237, 2.7255 / 2.7
HUBBLE_LENGTH = 2997.92458  # Mpc/h


def transfer(k):  # k in h/Mpc
    omega = OMEGA_M * H * H
    baryons = OMEGA_B_H2 / omega
    sound = 44.5 * np.log(9.83 / omega) / np.sqrt(1 + 10 * OMEGA_B_H2**0.75)
    alpha = 1 - 0.328 * np.log(431 * omega) * baryons + 0.38 * np.log(22.3 * omega) * baryons**2
    gamma = OMEGA_M * H * (alpha + (1 - alpha) / (1 + (0.43 * k * H * sound) ** 4))
    q = k * THETA**2 / gamma
    log_term = np.log(2 * np.e + 1.8 * q)
    return log_term / (log_term + (14.2 + 731 / (1 + 62.5 * q)) * q * q)


def power(k):  # Delta^2(k), scaled to sigma_8
    def shape(q):
        return q ** (N_S + 3) * transfer(q) ** 2

    q = np.logspace(-5, 1, 3000)
    x = 8 * q
    window = 3 * (np.sin(x) - x * np.cos(x)) / x**3
    return shape(k) * SIGMA_8**2 / np.trapz(shape(q) * window**2, np.log(q))


def growth(z):
    def factor(omega_m, omega_lambda):
        return 2.5 * omega_m / (
            omega_m ** (4 / 7) - omega_lambda + (1 + omega_m / 2) * (1 + omega_lambda / 70)
        )

    omega_m = OMEGA_M * (1 + z) ** 3 / (OMEGA_M * (1 + z) ** 3 + 1 - OMEGA_M)
    return factor(omega_m, 1 - omega_m) / factor(OMEGA_M, 1 - OMEGA_M) / (1 + z)


def component_sd(density):
    # Steps of redshift resolve j_1 up to the largest k; twice as fine in z and k, and k up to 1,
    # changes the fourth digit by one at most.
    z = 8 * np.linspace(0, 1, 4001)[1:] ** 1.5
    k = np.logspace(-4.5, np.log10(0.3), 400)
    inverse = HUBBLE_LENGTH / np.sqrt(OMEGA_M * (1 + z) ** 3 + 1 - OMEGA_M)
    steps = 0.5 * (inverse[1:] + inverse[:-1]) * np.diff(z)
    distance = HUBBLE_LENGTH * z[0] + np.concatenate([[0], np.cumsum(steps)])
    n = density(z) / np.trapz(density(z), z)
    kernel = np.array([np.trapz(n * growth(z) * spherical_jn(1, q * distance), z) for q in k])
    c_1 = 4 * np.pi * np.trapz(power(k) * kernel**2, np.log(k))
    return np.trapz(n * z, z), np.sqrt(3 * c_1 / (4 * np.pi))


def exponential(scale):
    return lambda z: z**2 * np.exp(-z / scale)


def gamma_like(scale):
    def density(z):
        t = (z / scale) ** 1.5
        return t * np.exp(-t) * 1.5 * t / z

    return density


distributions = [exponential(0.5), exponential(0.3), gamma_like(0.5), gamma_like(0.3), gamma_like(0.2)]
rows = re.findall(r"^# .*\s(\d\.\d\d)\s+(0\.\d{5})$", open(sys.argv[1]).read(), re.M)
assert len(rows) == len(distributions), rows
for (printed_z, printed_sd), density in zip(rows, distributions):
    mean_z, sd = component_sd(density)
    print(f"{mean_z:.4f} {printed_z}  {sd:.7f} {printed_sd}")
    assert abs(mean_z - float(printed_z)) < 0.0051
    assert abs(sd - float(printed_sd)) < 0.6e-5
