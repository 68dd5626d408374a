"""Writes flux_hard.csv: fluxes and derivatives next to the contacts and the other
seams of the domain, for every law, with 40 digits of mpmath and no closed forms.

The light behind the planet is integrated over rings about the star's centre, its
derivatives over the planet's edge. Each integral is cut at distances that fall
by factors of 10 towards both ends, so that a singular point at any distance
beyond an end is resolved.
"""

import csv
import random
import sys

import mpmath as mp

mp.mp.dps = 40

LAWS = {
    "uniform": [[]],
    "linear": [["0.6"]],
    "quadratic": [["0.4", "0.3"], ["1.2", "-0.4"]],
    "square-root": [["0.2", "0.5"]],
    "logarithmic": [["0.6", "0.25"]],
    "power-2": [["0.75", "0.625"], ["0.5", "0.25"], ["0.8", "2.5"]],
    "three-parameter": [["0.3", "0.4", "-0.2"]],
    "four-parameter": [["0.5", "-0.2", "0.6", "-0.3"]],
}


def intensity(law, u, mu):
    """I(mu) and its derivatives by the coefficients."""
    one, root = mp.mpf(1), mp.sqrt(mu)
    log = mp.log(mu) if mu > 0 else mp.mpf(0)
    if law == "power-2":
        c, a = u
        p = mu**a if mu > 0 else mp.mpf(0)
        return 1 - c * (1 - p), [-(1 - p), c * p * log]
    terms = {
        "uniform": [],
        "linear": [one - mu],
        "quadratic": [one - mu, (one - mu) ** 2],
        "square-root": [one - mu, one - root],
        "logarithmic": [one - mu, mu * log],
        "three-parameter": [one - mu, one - mu * root, one - mu * mu],
        "four-parameter": [one - root, one - mu, one - mu * root, one - mu * mu],
    }[law]
    return 1 - sum((x * t for x, t in zip(u, terms)), mp.mpf(0)), [-t for t in terms]


def integral(f, a, b):
    """of a list of functions; f takes the distance from a and that from b."""
    length = b - a
    if length <= 0:
        return None
    cuts = sorted({mp.mpf(0), length / 2, length} | {length * mp.mpf(10) ** -k for k in range(1, 23, 2)})
    total = None
    nodes = integral.nodes
    for low, high in zip(cuts, cuts[1:]):
        if low >= length / 2:
            break
        half, mid = (high - low) / 2, (high + low) / 2
        for x, w in nodes:
            d = mid + half * x
            for one, two in ((d, length - d), (length - d, d)):
                v = [w * half * y for y in f(one, two)]
                total = v if total is None else [p + q for p, q in zip(total, v)]
    return total


# tanh-sinh nodes of each piece
def tanh_sinh(h=mp.mpf(1) / 12, n=46):
    out = []
    for k in range(-n, n + 1):
        s, c = mp.sinh(h * k), mp.cosh(h * k)
        out.append((mp.tanh(mp.pi / 2 * s), h * mp.pi / 2 * c / mp.cosh(mp.pi / 2 * s) ** 2))
    return out


integral.nodes = tanh_sinh()


def flux(law, u, r, z):
    u = [mp.mpf(x) for x in u]

    def whole(d, e):  # ring at radius d from the centre, e from the limb
        i, g = intensity(law, u, mp.sqrt(e * (2 - e)))
        return [2 * mp.pi * d * x for x in [i] + g]

    disc = integral(whole, mp.mpf(0), mp.mpf(1))
    covered = [mp.mpf(0)] * len(disc)
    if r > z:  # rings wholly behind the planet
        edge = min(r - z, mp.mpf(1))
        part = integral(lambda d, e: whole(d, e + 1 - edge), mp.mpf(0), edge)
        covered = [p + q for p, q in zip(covered, part)]
    low, high = abs(z - r), min(z + r, mp.mpf(1))
    if z > 0 and low < high:

        def ring(d, e):
            rho = low + d
            over = z + r - high + e  # z + r - rho
            if z >= r:
                a, b = d * over, (rho + z - r) * (rho + z + r)
            else:
                a, b = (rho - z + r) * over, d * (rho + z + r)
            half = 2 * mp.atan2(mp.sqrt(a), mp.sqrt(b))
            gap = 1 - high + e
            i, g = intensity(law, u, mp.sqrt(gap * (2 - gap)))
            return [2 * rho * half * x for x in [i] + g]

        part = integral(ring, low, high)
        covered = [p + q for p, q in zip(covered, part)]
    # Derivatives along the planet's edge, psi from its point farthest from the star's centre.
    dr = dz = mp.mpf(0)
    if abs(r - 1) < z < 1 + r or z <= 1 - r:
        square = max(((z + r) ** 2 - 1) / (4 * z * r), mp.mpf(0)) if z > 0 else mp.mpf(0)
        start = 2 * mp.asin(mp.sqrt(square))

        def arc(d, e):
            # mu^2 = 1 - (z+r)^2 + 4 z r sin^2(psi/2), without cancellation at the crossing
            mu2 = 4 * z * r * mp.sin(d / 2) * mp.sin(start + d / 2) if square > 0 else 1 - (z + r) ** 2 + 4 * z * r * mp.sin(d / 2) ** 2
            i, _ = intensity(law, u, mp.sqrt(mu2))
            return [2 * r * i, 2 * r * i * mp.cos(start + d)]

        dr, dz = integral(arc, start, mp.pi)
    f = covered[0] / disc[0]
    by = [(c - f * d) / disc[0] for c, d in zip(covered[1:], disc[1:])]
    return [1 - f, f, -dr / disc[0], -dz / disc[0]] + [-b for b in by]


def main():
    rng = random.Random(5)
    places = []
    for r in [0.0625, 0.125, 0.5, 1.0, 1.5, 3.0]:
        seams = {abs(1 - r), 1 + r, r}
        for seam in sorted(seams):
            for k in [12, 26, 44]:
                for sign in (-1, 1):
                    z = seam + sign * 2.0**-k
                    if r - 1 < z < 1 + r and z > 0:
                        places.append((r, z))
    places += [(r, r) for r in (0.125, 0.5, 1.5)] + [(r, abs(1 - r)) for r in (0.125, 0.5)]
    for _ in range(30):
        r = float(mp.exp(rng.uniform(-5, 1.2)))
        places.append((r, rng.uniform(max(0, r - 1), 1 + r)))
    out = csv.writer(open(sys.argv[1], "w", newline=""), lineterminator="\n")
    out.writerow("r,z,law,u1,u2,u3,u4,flux,deficit,dr,dz,du1,du2,du3,du4".split(","))
    for n, (r, z) in enumerate(places):
        for law, sets in LAWS.items():
            if law == "uniform" and n % 4 or law == "linear" and n % 4:
                continue
            u = sets[n % len(sets)]
            v = flux(law, u, mp.mpf(r), mp.mpf(z))
            row = [repr(r), repr(z), law] + u + [""] * (4 - len(u)) + [mp.nstr(x, 20) for x in v] + [""] * (4 - len(u))
            out.writerow(row)


main()
