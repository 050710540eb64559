#!/usr/bin/python3
# SPDX-License-Identifier: GPL-2.0-or-later
"""Brute-force posterior of (velocity along z, intrinsic dipole along x).

Input file: one line a pixel: x y z exposure, then one count a bin.
Arguments: file, largest velocity, largest intrinsic dipole, then one weight a bin.
"""
import sys

import numpy as np

table = np.loadtxt(sys.argv[1])
max_beta, max_dipole = float(sys.argv[2]), float(sys.argv[3])
weights = [float(text) for text in sys.argv[4:]]
direction, exposure, counts = table[:, :3], table[:, 3], table[:, 4:]

beta = (np.arange(400) + 0.5) / 400 * max_beta
dipole = (np.arange(400) + 0.5) / 400 * max_dipole
log_posterior = np.zeros((beta.size, dipole.size))
boost = 1 / np.sqrt(1 - beta**2)[:, None] / (1 - beta[:, None] * direction[:, 2])  # beta x pixel
intrinsic = 1 + dipole[:, None] * direction[:, 0]                                   # dipole x pixel
for weight, n in zip(weights, counts.T):
    kinematic = boost**weight
    expected = (kinematic * exposure) @ intrinsic.T
    log_posterior += (np.log(kinematic) @ n)[:, None] + (np.log(intrinsic) @ n)[None, :]
    log_posterior -= n.sum() * np.log(expected)

p = np.exp(log_posterior - log_posterior.max())
p /= p.sum()
pb, pd = p.sum(axis=1), p.sum(axis=0)
mean_b, mean_d = pb @ beta, pd @ dipole
sd_b, sd_d = np.sqrt(pb @ (beta - mean_b) ** 2), np.sqrt(pd @ (dipole - mean_d) ** 2)
correlation = (beta - mean_b) @ p @ (dipole - mean_d) / (sd_b * sd_d)
print(repr(float(mean_b)), repr(float(sd_b)), repr(float(mean_d)), repr(float(sd_d)), repr(float(correlation)))
