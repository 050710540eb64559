# SPDX-License-Identifier: GPL-2.0-or-later
"""Maximum-likelihood fits of two deterministic count maps, in long double, without deviascope."""
import healpy
import numpy as np

real = np.longdouble
nside = 8
index = np.arange(12 * nside**2)
n = np.array(healpy.pix2vec(nside, index), dtype=real)  # 3 x n_pixels


def made(a, axis, size, k, m):
    centres = n.astype(float)
    return (np.floor(a * (1 + size * (np.array(axis) / 3.0) @ centres)) + (k * index) % m).astype(real)


bins = [made(200, (-2, -1, 2), 0.1, 1, 7), made(100, (1, 2, 2), 0.15, 3, 5)]
print("sums", [int(b.sum()) for b in bins])


def solve(a, b):
    """Gaussian elimination in long double."""
    a, b = a.copy(), b.copy()
    for i in range(len(b)):
        for j in range(i + 1, len(b)):
            f = a[j, i] / a[i, i]
            a[j] -= f * a[i]
            b[j] -= f * b[i]
    x = np.zeros_like(b)
    for i in reversed(range(len(b))):
        x[i] = (b[i] - a[i, i + 1:] @ x[i + 1:]) / a[i, i]
    return x


def inverse(a):
    return np.array([solve(a, e) for e in np.eye(len(a), dtype=real)])


def linear_fit(keep):
    x, count = n[:, keep], bins[0][keep]
    p = np.array([count.mean(), 0, 0, 0], dtype=real)
    for _ in range(60):
        lam = p[0] * (1 + p[1:] @ x)
        g = np.vstack([np.full(x.shape[1], 1 / p[0]), x / (1 + p[1:] @ x)])
        information = (g * lam) @ g.T
        p = p + solve(information, g @ (count - lam))
    lam = p[0] * (1 + p[1:] @ x)
    g = np.vstack([np.full(x.shape[1], 1 / p[0]), x / (1 + p[1:] @ x)])
    covariance = inverse((g * lam) @ g.T)
    print("A", p[0], "d", p[1:])
    print("var", np.diag(covariance), "cov", covariance[1, 2], covariance[1, 3], covariance[2, 3])
    print("ln L", (count * np.log(lam) - lam).sum())


linear_fit(np.ones(len(index), bool))
linear_fit(np.abs(n[2]) > 0.5)

weights = [real("2.5"), real(6)]


def log_terms(beta, d):
    gamma = 1 / np.sqrt(1 - beta @ beta)
    return [-k * (np.log(gamma) + np.log1p(-beta @ n)) + np.log1p(d @ n) for k in weights]


def log_likelihood(a, beta, d):
    return sum((c * (np.log(m) + y) - m * np.exp(y)).sum()
               for c, m, y in zip(bins, a, log_terms(beta, d)))


def integrated(beta, d):
    return sum((c * y).sum() - c.sum() * np.log(np.exp(y).mean())
               for c, y in zip(bins, log_terms(beta, d)))


p = np.zeros(8, dtype=real)
p[6:] = [np.log(c.mean()) for c in bins]
for _ in range(80):
    beta, d = p[:3], p[3:6]
    information = np.zeros((8, 8), dtype=real)
    score = np.zeros(8, dtype=real)
    for b, (k, c, y) in enumerate(zip(weights, bins, log_terms(beta, d))):
        lam = np.exp(p[6 + b] + y)
        g = np.zeros((8, len(c)), dtype=real)
        g[:3] = k * (n / (1 - beta @ n) - (beta / (1 - beta @ beta))[:, None])
        g[3:6] = n / (1 + d @ n)
        g[6 + b] = 1
        score += g @ (c - lam)
        information += (g * lam) @ g.T
    p = p + solve(information, score)
covariance = inverse(information)
print("largest score", abs(score).max())
print("beta", p[:3], "d", p[3:6], "A", np.exp(p[6:]))
print("var", np.diag(covariance)[:6], "corr x", covariance[0, 3] / np.sqrt(covariance[0, 0] * covariance[3, 3]))
print("ln L", log_likelihood(np.exp(p[6:]), p[:3], p[3:6]), "integrated", integrated(p[:3], p[3:6]))
beta = np.array([real("0.001"), real("-0.002"), real("0.003")])
d = np.array([real("-0.05"), real("0.01"), real("0.04")])
print("ln L", log_likelihood([real(203), real(102)], beta, d), "integrated", integrated(beta, d))
