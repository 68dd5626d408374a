#!/usr/bin/python3
"""Wavelet likelihoods from the dense covariance that they stand for, in mpmath at 50
digits: the orthogonal matrix of the transform is built row by row from Daubechies'
four coefficients, scale by scale. Writes wavelet.json."""
import json
import mpmath as mp
import numpy as np

mp.mp.dps = 50
s3 = mp.sqrt(3)
h = [c / (4 * mp.sqrt(2)) for c in (1 + s3, 3 + s3, 3 - s3, 1 - s3)]
g = [h[3], -h[2], h[1], -h[0]]


def level(n):
    """Matrix of one level: n/2 smooth rows, then n/2 detailed ones."""
    m = mp.zeros(n)
    for k in range(n // 2):
        for j in range(4):
            m[k, (2 * k + j) % n] += h[j]
            m[n // 2 + k, (2 * k + j) % n] += g[j]
    return m


def loglike(x, red, white):
    n, odd, M = len(x), len(x), 0
    while odd % 2 == 0:
        odd //= 2
        M += 1
    W = mp.eye(n)
    length = n
    for _ in range(M - 1):
        step = mp.eye(n)
        part = level(length)
        for i in range(length):
            for j in range(length):
                step[i, j] = part[i, j]
        W = step * W
        length //= 2
    v = [red ** 2 / 2 / (2 * mp.log(2)) + white ** 2] * (2 * odd)
    for m in range(2, M + 1):
        v += [red ** 2 * mp.mpf(2) ** -m + white ** 2] * (odd * 2 ** (m - 1))
    K = W.T * mp.diag(v) * W
    L = mp.cholesky(K)
    z = mp.lu_solve(L, mp.matrix(x))
    return -(mp.fsum(c * c for c in z) + 2 * mp.fsum(mp.log(L[i, i]) for i in range(n)) + n * mp.log(2 * mp.pi)) / 2


out = []
r = np.random.RandomState(3)
for n, red, white in [(32, '0.5', '1'), (48, '3', '0.25'), (20, '0', '2')]:
    x = [float(v) for v in r.randn(n)]
    e = mp.mpf(10) ** -12
    f = lambda a, b: loglike([mp.mpf(v) for v in x], mp.mpf(red) * mp.exp(a), mp.mpf(white) * mp.exp(b))
    d = lambda k: (f(*[e * (i == k) for i in range(2)]) - f(*[-e * (i == k) for i in range(2)])) / (2 * e)
    out.append(dict(residual=x, red=float(red), white=float(white), loglike=mp.nstr(f(0, 0), 20), byLogRed=mp.nstr(d(0), 18), byLogWhite=mp.nstr(d(1), 18)))
    print(n, out[-1]['loglike'], flush=True)
json.dump(out, open('wavelet.json', 'w'), indent=0)
