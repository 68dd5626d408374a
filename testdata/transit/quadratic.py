"""Flux and derivatives of the quadratic law in vectorised NumPy.

The same integrals as in steps/transit (Agol, Luger & Foreman-Mackey 2020), written
for arrays: the yardstick of BenchmarkNumPy. Reads r, u1, u2 and the separations as
float64 from standard input; writes the least time of a call in seconds, then flux
and its derivatives by r, z, u1 and u2.
"""

import sys
import time

import numpy as np


def elliptic(kc, p, a, b):
    """cel(kc, p, a, b), cel(kc, 1, 1, 0) and cel(kc, 1, 0, 1) of Bulirsch (1969)."""
    m, e = np.ones_like(kc), kc.copy()
    p = np.sqrt(p)
    a, b = a.copy(), b / p
    ca, cb = np.ones_like(kc), np.zeros_like(kc)
    sa, sb = np.zeros_like(kc), np.ones_like(kc)
    for _ in range(16):
        f = a.copy()
        a += b / p
        g = e / p
        b = 2 * (b + f * g)
        p = p + g
        ratio = e / m
        f = ca.copy()
        ca += cb / m
        cb = 2 * (cb + f * ratio)
        f = sa.copy()
        sa += sb / m
        sb = 2 * (sb + f * ratio)
        g = m
        m = m + kc
        if np.all(np.abs(g - kc) <= g * 1e-8):
            break
        kc = 2 * np.sqrt(e)
        e = kc * m
    h = 0.5 * np.pi / m
    third = h * (b + a * m) / (m + p)
    h = h / (m + m)
    return third, h * (cb + ca * m), h * (sb + sa * m)


def inside(r, z):
    w, opr = (1 - z + r) * (1 + z - r), (1 - z - r) * (1 + z + r)
    diff, total = z - r, z + r
    diff = np.where(diff == 0, 1e-100, diff)
    kc2 = opr / w
    mu, p = 3 * diff / (total * w), (diff / total) ** 2 * kc2
    third, cosine, sine = elliptic(np.sqrt(kc2), p, 1 + mu, p + mu)
    second, root = cosine + kc2 * sine, np.sqrt(w)
    linear = 2 * root * (opr * third - (4 - 7 * r * r - z * z) * second) / (9 * np.pi) + np.where(diff < 0, 2 / 3, 0)
    full = np.full_like(z, r * r)
    value = [full, linear, r * r * (1 - r * r / 2 - z * z)]
    by_r = [np.full_like(z, 2 * r), 4 * r / np.pi * root * second, 2 * r * (1 - z * z - r * r)]
    by_z = [np.zeros_like(z), -4 * r / (3 * np.pi) * root * (cosine - kc2 * sine), -2 * r * r * z]
    return value, by_r, by_z


def limb(r, z):
    w, excess = (1 - z + r) * (1 + z - r), (z + r - 1) * (z + r + 1)
    diff, total, product = z - r, z + r, z * r
    diff = np.where(diff == 0, 1e-100, diff)
    kite = np.sqrt(w * excess)
    half, star = np.arctan2(kite, (z - 1) * (z + 1) + r * r), np.arctan2(kite, (1 - r) * (1 + r) + z * z)
    kc2 = excess / (4 * product)
    third, cosine, sine = elliptic(np.sqrt(kc2), diff * diff * kc2, np.zeros_like(z), 3 * kc2 * diff * total)
    front = w / np.sqrt(product)
    linear = front * (third + (6 * r * r - 3 - 2 * product) * cosine - 4 * product * kc2 * sine) / (9 * np.pi)
    uniform = (r * r * half + star - kite / 2) / np.pi
    square = uniform - (star + r * r * (r * r + 2 * z * z) * half - (1 + 5 * r * r + z * z) * kite / 4) / (2 * np.pi)
    value = [uniform, linear + np.where(diff < 0, 2 / 3, 0), square]
    c = 2 * r / np.pi
    sin_half = kite / (2 * product)
    q1 = half - sin_half
    q2 = 1.5 * half - 2 * sin_half + sin_half * ((z - 1) * (z + 1) + r * r) / (4 * product)
    by_r = [c * half, c * front * cosine, c * (w * half - 2 * product * q1)]
    by_z = [-c * sin_half, -c / 3 * front * (cosine + 2 * kc2 * sine), -c * (w * (half - q1) - 2 * product * (q1 - q2))]
    return value, by_r, by_z


def flux(r, z, u1, u2):
    """Flux and derivatives for 0 < r < 1."""
    value, by_r, by_z = np.zeros((3, 3, len(z)))
    for where, form in ((z <= 1 - r, inside), ((z > 1 - r) & (z < 1 + r), limb)):
        if where.any():
            v, a, b = form(r, z[where])
            value[:, where], by_r[:, where], by_z[:, where] = v, a, b
    inverse = 1 / (1 - u1 / 3 - u2 / 6)
    weights = np.array([1 - u1 - u2, u1 + 2 * u2, -u2]) * inverse
    deficit = weights @ value
    by_u1 = inverse * (value[0] - value[1] - deficit / 3)
    by_u2 = inverse * (value[0] - 2 * value[1] + value[2] - deficit / 6)
    return 1 - deficit, -(weights @ by_r), -(weights @ by_z), by_u1, by_u2


def main():
    data = np.frombuffer(sys.stdin.buffer.read())
    (r, u1, u2), z = data[:3], data[3:]
    least = np.inf
    for _ in range(30):
        start = time.perf_counter()
        out = flux(r, z, u1, u2)
        least = min(least, time.perf_counter() - start)
    np.concatenate([[least], *out]).tofile(sys.stdout.buffer)


if __name__ == "__main__":
    main()
