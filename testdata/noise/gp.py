#!/usr/bin/python3
"""Likelihoods of Gaussian processes with gradients and predictions, by dense
Cholesky factorisation in mpmath at 60 digits. Writes gp_inputs.csv and gp_hard.json.

Kernels are written out from their definitions; the transition matrices of the
library are not used. Gradients are central differences of step 1e-15 in the
logarithm of each parameter, whose error is of the order 1e-30."""
import csv, json
import mpmath as mp
import numpy as np

mp.mp.dps = 60

r = np.random.RandomState(7)
n = 48
t = np.sort(np.concatenate([r.uniform(0, 0.05, n // 2), r.uniform(0.08, 0.2, n - n // 2)]))
t[11] = t[10]  # a sample measured twice
t += 2460512.0
x, y = np.cumsum(r.randn(n)) * 0.1, np.cumsum(r.randn(n)) * 0.05
airmass = 1.1 + 8 * (t - 2460512.1) ** 2 + 0.01 * r.rand(n)
err = 3e-4 * (0.5 + r.rand(n))
res = 5e-4 * np.sin(60 * t) + 4e-4 * r.randn(n) + 2e-4 * x
rows = list(zip(t, x, y, airmass, err, res))
with open('gp_inputs.csv', 'w', newline='') as f:
    w = csv.writer(f)
    w.writerow(['time', 'X', 'Y', 'airmass', 'err', 'residual'])
    for row in rows:
        w.writerow([repr(float(v)) for v in row])
columns = {k: [mp.mpf(float(v)) for v in c] for k, c in zip(['time', 'X', 'Y', 'airmass'], zip(*rows))}
err = [mp.mpf(float(v)) for v in err]
res = [mp.mpf(float(v)) for v in res]


def kernel(kind, d2, q=None):
    d = mp.sqrt(d2)
    if kind == 'exponential':
        return mp.exp(-d)
    if kind == 'matern32':
        return (1 + mp.sqrt(3) * d) * mp.exp(-mp.sqrt(3) * d)
    if kind == 'matern52':
        return (1 + mp.sqrt(5) * d + 5 * d2 / 3) * mp.exp(-mp.sqrt(5) * d)
    if kind == 'squaredExponential':
        return mp.exp(-d2 / 2)
    x = 2 * mp.pi * d  # oscillator: the scale is the period
    y = 1 - 1 / (4 * q * q)
    if y == 0:
        return mp.exp(-x) * (1 + x)
    if y > 0:
        e = mp.sqrt(y)
        return mp.exp(-x / (2 * q)) * (mp.cos(e * x) + mp.sin(e * x) / (2 * q * e))
    e = mp.sqrt(-y)
    return mp.exp(-x / (2 * q)) * (mp.cosh(e * x) + mp.sinh(e * x) / (2 * q * e))


def covariance(terms, v, a, i, b, j, only=None):
    """terms: (name, [(kind, inputs)]); v: values, in order; returns sum."""
    k, total = 0, mp.mpf(0)
    for name, factors in terms:
        p = v[k] ** 2
        k += 1
        for kind, inputs in factors:
            if kind == 'oscillator':
                p *= kernel(kind, ((a[inputs[0]][i] - b[inputs[0]][j]) / v[k]) ** 2, v[k + 1])
                k += 2
            else:
                d2 = sum(((a[c][i] - b[c][j]) / v[k + m]) ** 2 for m, c in enumerate(inputs))
                p *= kernel(kind, d2)
                k += len(inputs)
        if only is None or only == name:
            total += p
    return total


def factorise(terms, white, v):
    s, v = split(white, v)
    L = [[mp.mpf(0)] * n for _ in range(n)]
    for i in range(n):
        for j in range(i + 1):
            L[i][j] = covariance(terms, v, columns, i, columns, j)
            if i == j:
                L[i][j] += s[i]
    for j in range(n):
        L[j][j] = mp.sqrt(L[j][j] - mp.fdot(L[j][:j], L[j][:j]))
        for i in range(j + 1, n):
            L[i][j] = (L[i][j] - mp.fdot(L[i][:j], L[j][:j])) / L[j][j]
    return L


def split(white, v):
    scale, jitter, k = mp.mpf(1), mp.mpf(0), 0
    if 'scale' in white:
        scale, k = v[k], k + 1
    if 'jitter' in white:
        jitter, k = v[k], k + 1
    return [(scale * e) ** 2 + jitter ** 2 for e in err], v[k:]


def solve(L, b):
    z = []
    for i in range(n):
        z.append((b[i] - mp.fdot(L[i][:i], z)) / L[i][i])
    return z


def loglike(terms, white, v):
    L = factorise(terms, white, v)
    z = solve(L, res)
    return -(mp.fdot(z, z) + 2 * mp.fsum(mp.log(L[i][i]) for i in range(n)) + n * mp.log(2 * mp.pi)) / 2


T = ['time']
CASES = [
    ('white', ['scale', 'jitter'], [], ['1.3', '2e-4']),
    ('critical', ['jitter'], [('red', [('oscillator', T)])], ['1e-4', '5e-4', '0.05', '0.5']),
    ('nearly critical', [], [('red', [('oscillator', T)])], ['5e-4', '0.05', '0.50001']),
    ('overdamped', ['scale'], [('red', [('oscillator', T)])], ['1.1', '5e-4', '0.05', '0.02']),
    ('ringing', [], [('red', [('oscillator', T)])], ['5e-4', '0.004', '1000']),
    ('quiet errors', ['scale'], [('red', [('matern32', T)])], ['1e-3', '0.01', '0.5']),
    ('quiet errors of a walk', ['scale'], [('red', [('exponential', T)])], ['1e-3', '0.01', '0.5']),
    ('three terms', ['scale', 'jitter'], [('a', [('exponential', T)]), ('b', [('matern32', T)]), ('c', [('oscillator', T)])],
     ['0.9', '1e-4', '4e-4', '0.003', '5e-4', '0.02', '3e-4', '0.01', '3']),
    ('squared exponential', ['jitter'], [('red', [('squaredExponential', T)])], ['2e-4', '5e-4', '0.01']),
    ('five halves', [], [('red', [('matern52', T)])], ['5e-4', '0.01']),
    ('inputs', ['scale', 'jitter'], [('gp', [('squaredExponential', ['X', 'Y']), ('matern32', T)]), ('air', [('matern52', ['airmass', 'time'])])],
     ['1.2', '1e-4', '5e-4', '0.3', '0.1', '0.05', '3e-4', '0.05', '0.1']),
    ('products', [], [('gp', [('oscillator', T), ('exponential', ['X', 'Y', 'airmass'])]), ('red', [('matern32', T)])],
     ['5e-4', '0.03', '2', '0.3', '0.2', '0.1', '3e-4', '0.01']),
]
there = {'time': [mp.mpf(v) for v in ('2460511.96875', '2460512.03125', '2460512.0625', '2460512.25')],
         'X': [mp.mpf(v) for v in ('0', '0.25', '-0.25', '0.5')], 'Y': [mp.mpf(v) for v in ('0.125', '0', '0.25', '-0.125')],
         'airmass': [mp.mpf(v) for v in ('1.125', '1.1875', '1.25', '1.125')]}
out = []
for name, white, terms, text in CASES:
    v = [mp.mpf(float(s)) for s in text]
    grad = []
    for k in range(len(v)):
        ends = []
        for s in (1, -1):
            w = list(v)
            w[k] *= mp.exp(s * mp.mpf(10) ** -15)
            ends.append(loglike(terms, white, w))
        grad.append((ends[0] - ends[1]) / (2 * mp.mpf(10) ** -15))
    L = factorise(terms, white, v)
    z = solve(L, res)
    alpha = [mp.mpf(0)] * n
    for i in range(n - 1, -1, -1):
        alpha[i] = (z[i] - mp.fsum(L[k][i] * alpha[k] for k in range(i + 1, n))) / L[i][i]
    _, tail = split(white, v)
    predictions = {}
    for only in [''] + [t[0] for t in terms]:
        rows = []
        for i in range(4):
            c = [covariance(terms, tail, there, i, columns, j, only or None) for j in range(n)]
            w = solve(L, c)
            rows.append([mp.nstr(mp.fdot(c, alpha), 20), mp.nstr(covariance(terms, tail, there, i, there, i, only or None) - mp.fdot(w, w), 20)])
        predictions[only] = rows
    out.append(dict(name=name, scale='scale' in white, jitter='jitter' in white,
                    terms=[dict(name=t, factors=[dict(kind=k, inputs=i) for k, i in f]) for t, f in terms],
                    values=[float(s) for s in text], loglike=mp.nstr(loglike(terms, white, v), 22),
                    gradient=[mp.nstr(g, 20) for g in grad], whitened=[mp.nstr(a, 20) for a in z], solved=[mp.nstr(a, 20) for a in alpha], predictions=predictions))
    print(name, out[-1]['loglike'], flush=True)
json.dump(dict(at={k: [float(x) for x in c] for k, c in there.items()}, cases=out), open('gp_hard.json', 'w'), indent=0)
