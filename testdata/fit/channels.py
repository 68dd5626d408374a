"""Least squares, channel by channel, in NumPy and SciPy: the plain way, and the yardstick
of BenchmarkChannelsBesideSciPy.

Reads float64 from standard input: the number of integrations n, of terms p of the trend
and of channels m; times from the first, separations of the planet (n each), p terms, and
m light curves, each with fluxes and errors. Fits r, u1, u2, ln tau and the coefficients of
the terms and of exp(-t/tau), with analytic derivatives. Writes the processor time in
seconds, then for each channel the depth and its error.
"""

import os
import sys
import time

import numpy as np
from scipy.optimize import least_squares

sys.path.insert(0, os.path.join(os.path.dirname(os.path.abspath(__file__)), "..", "transit"))
from quadratic import flux as transit  # noqa: E402


def fit(t, z, terms, y, err):
    inside = z < 1.3
    cache = {}

    def model(x):
        key = x.tobytes()
        if key in cache:
            return cache[key]
        cache.clear()
        r, u1, u2, log_tau = x[:4]
        f, by_r, by_u1, by_u2 = np.ones_like(t), np.zeros_like(t), np.zeros_like(t), np.zeros_like(t)
        f[inside], by_r[inside], _, by_u1[inside], by_u2[inside] = transit(r, z[inside], u1, u2)
        settle = np.exp(-t / np.exp(log_tau))
        trend = x[4:-1] @ terms + x[-1] * settle
        jacobian = np.empty((len(t), len(x)))
        jacobian[:, 0], jacobian[:, 1], jacobian[:, 2] = by_r * trend, by_u1 * trend, by_u2 * trend
        jacobian[:, 3] = f * x[-1] * settle * t / np.exp(log_tau)
        jacobian[:, 4:-1] = (terms * f).T
        jacobian[:, -1] = f * settle
        cache[key] = (f * trend - y) / err, jacobian / err[:, None]
        return cache[key]

    start = np.concatenate([[0.1, 0.3, 0.2, np.log(0.02), 1], np.zeros(len(terms) - 1), [1e-4]])
    scale = np.concatenate([[0.1, 0.1, 0.1, 1], np.ones(len(terms)), [1e-2]])
    solution = least_squares(lambda x: model(x)[0], start, jac=lambda x: model(x)[1], x_scale=scale, method="trf")
    covariance = np.linalg.inv(solution.jac.T @ solution.jac)
    r = solution.x[0]
    return r * r, 2 * r * np.sqrt(covariance[0, 0])


def main():
    data = np.frombuffer(sys.stdin.buffer.read())
    n, p, m = (int(v) for v in data[:3])
    rows = data[3:].reshape(-1, n)
    t, z, terms, curves = rows[0], rows[1], rows[2 : 2 + p], rows[2 + p :]
    fit(t, z, terms, curves[0], curves[1])
    start = time.process_time()
    out = [fit(t, z, terms, curves[2 * k], curves[2 * k + 1]) for k in range(m)]
    np.concatenate([[time.process_time() - start], np.ravel(out)]).tofile(sys.stdout.buffer)


main()
