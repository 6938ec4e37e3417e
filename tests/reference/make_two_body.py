"""Writes two_body.csv: two-body motion worked out with fifty digits, for both the Rust and the Python tests.

    python tests/reference/make_two_body.py

needs the PyPI package mpmath. Each row has elements at an epoch and the heliocentric state some days (TDB)
later, by way of the classical anomalies of each kind of conic and not by the universal ones that the library
uses: Kepler's equation for the ellipse and the hyperbola by bisection and Newton's method, Barker's for the
parabola.
"""

import csv
import random
from pathlib import Path

from mpmath import cbrt, cos, cosh, mp, mpf, pi, sin, sinh, sqrt

mp.dps = 50
GM = mpf("132712440041.279419") * 86400**2 / mpf("149597870.7") ** 3
OBLIQUITY = mpf("84381.448") * pi / 648000
HEAD = ["q", "e", "i", "node", "argument", "since_perihelion", "later", "x", "y", "z", "vx", "vy", "vz"]


def perifocal(e, q, t):
    """(x, y, vx, vy) a time t after perihelion."""
    if e == 1:
        # Barker: s + s³/3 = t √(GM/2q³), with s the tangent of half the true anomaly.
        w = 3 * t * sqrt(GM / (2 * q**3)) / 2
        root = cbrt(abs(w) + sqrt(w * w + 1))
        s = (root - 1 / root) * (1 if w >= 0 else -1)
        v = sqrt(2 * GM / q) / (1 + s * s)
        return q * (1 - s * s), 2 * q * s, -v * s, v
    a = q / abs(1 - e)
    n = sqrt(GM / a**3)
    mean = n * t
    if e < 1:
        mean -= 2 * pi * mp.nint(mean / (2 * pi))
        f, slope = lambda u: u - e * sin(u) - abs(mean), lambda u: 1 - e * cos(u)
        low, high = mpf(0), +pi
    else:
        f, slope = lambda u: e * sinh(u) - u - abs(mean), lambda u: e * cosh(u) - 1
        low, high = mpf(0), mpf(200)
    for _ in range(60):
        middle = (low + high) / 2
        low, high = (low, middle) if f(middle) > 0 else (middle, high)
    u = (low + high) / 2
    for _ in range(6):
        if slope(u) != 0:
            u -= f(u) / slope(u)
    u = u if mean >= 0 else -u
    if e < 1:
        b, rate = a * sqrt(1 - e * e), n / (1 - e * cos(u))
        return a * (cos(u) - e), b * sin(u), -a * sin(u) * rate, b * cos(u) * rate
    b, rate = a * sqrt(e * e - 1), n / (e * cosh(u) - 1)
    return a * (e - cosh(u)), b * sinh(u), -a * sinh(u) * rate, b * cosh(u) * rate


def turned(x, y, i, node, argument):
    """From the plane of the orbit to ICRS axes."""
    x, y = x * cos(argument) - y * sin(argument), x * sin(argument) + y * cos(argument)
    y, z = y * cos(i), y * sin(i)
    x, y = x * cos(node) - y * sin(node), x * sin(node) + y * cos(node)
    return x, y * cos(OBLIQUITY) - z * sin(OBLIQUITY), y * sin(OBLIQUITY) + z * cos(OBLIQUITY)


def main():
    rng = random.Random(30)
    special = [0.0, 1.0, 1.0 - 1e-9, 1.0 + 1e-9, 1.0 - 1e-12, 1.0 + 1e-12, 0.9999, 1.0001]
    with open(Path(__file__).with_name("two_body.csv"), "w", newline="") as file:
        file.write(
            "# written by tests/reference/make_two_body.py; au, days, radians (J2000 ecliptic); ICRS axes\n"
        )
        writer = csv.writer(file, lineterminator="\n")
        writer.writerow(HEAD)
        for case in range(200):
            e = rng.choice([rng.uniform(0, 1), rng.uniform(1, 4), rng.uniform(0.9, 1.1)])
            if case % 2:
                e = special[case // 2 % len(special)]
            q = 10 ** rng.uniform(-1.5, 1.5)
            i, node, argument = rng.uniform(0, 3.14), rng.uniform(0, 6.28), rng.uniform(0, 6.28)
            # Within half a period: since_perihelion is counted from the nearest one.
            since, later = rng.uniform(-50, 50), rng.choice([1.0, -1.0]) * 10 ** rng.uniform(0, 4)
            if e < 1:
                half = float(pi * sqrt((mpf(q) / (1 - mpf(e))) ** 3 / GM))
                since = max(-0.9 * half, min(0.9 * half, since))
            x, y, vx, vy = perifocal(mpf(e), mpf(q), mpf(since) + mpf(later))
            angles = mpf(i), mpf(node), mpf(argument)
            state = [*turned(x, y, *angles), *turned(vx, vy, *angles)]
            writer.writerow([q, e, i, node, argument, since, later, *(mp.nstr(value, 20) for value in state)])


if __name__ == "__main__":
    main()
