"""Derive the polynomial coefficients of the elementary functions, and the values they are tested with.

    python rust/tables/elementary/make_elementary.py            # writes both files
    python rust/tables/elementary/make_elementary.py --check    # fails if either differs

Needs mpmath (general-purpose arithmetic of any precision) and nothing else of ours; takes some ten seconds.

Each function is written as a leading term and a correction t^m P(t), t the square of the reduced argument:

    sin r  = r + r t S(t)               |r| <= pi/4
    cos r  = 1 - t/2 + t^2 C(t)         |r| <= pi/4
    asin x = x + x t A(t)               |x| <= 1/2
    atan x = x + x t B(t)               |x| <= tan(pi/8)
    atanh x = x + x t C(t)              |x| <= (sqrt 2 - 1) / (sqrt 2 + 1)
    2^x    = 1 + x E(x)                 0 <= x <= 1

The last one alone is no function of a square: there t is x itself.

P minimises the largest error of the *function*, relative to it, by the exchange of Remez (1934): the error
of the best polynomial of n coefficients takes its largest size with alternating sign at n + 1 points. The
coefficients are then rounded to doubles one by one from the lowest, and the rest fitted anew after each, so
that rounding one is made up for by the others.
"""

import random
import sys
from pathlib import Path

from mpmath import (
    acos,
    asin,
    atan,
    atan2,
    atanh,
    cos,
    cospi,
    lu_solve,
    matrix,
    mp,
    mpf,
    pi,
    sin,
    sinpi,
    sqrt,
    tan,
)

mp.dps = 60
ROOT = Path(__file__).resolve().parents[3]
COEFFICIENTS = ROOT / "rust/core/src/math/elementary_coefficients.rs"
REFERENCE = ROOT / "tests/reference/elementary.csv"


def remez(target, weight, exponents, top, points=600):
    """Coefficients at the exponents, and the largest weighted error on (0, top]."""
    n = len(exponents)
    # Chebyshev's extrema over the open interval: the weight vanishes at 0.
    reference = [top / 2 * (1 - cos(pi * (i + mpf(1) / 2) / (n + 1))) for i in range(n + 1)]
    grid = [top / 2 * (1 - cos(pi * mpf(i) / points)) for i in range(1, points + 1)]
    values = [(target(t), weight(t)) for t in grid]
    for _ in range(30):
        a = matrix(n + 1, n + 1)
        b = matrix(n + 1, 1)
        for i, t in enumerate(reference):
            for j, e in enumerate(exponents):
                a[i, j] = t**e
            a[i, n] = (-1) ** i / weight(t)
            b[i] = target(t)
        solution = lu_solve(a, b)
        coefficients = [solution[j] for j in range(n)]
        errors = []
        for t, (f, w) in zip(grid, values, strict=True):
            errors.append(w * (f - sum(c * t**e for c, e in zip(coefficients, exponents, strict=True))))
        # The largest error of each run of one sign.
        runs = []
        for t, e in zip(grid, errors, strict=True):
            if runs and (runs[-1][1] > 0) == (e > 0):
                if abs(e) > abs(runs[-1][1]):
                    runs[-1] = (t, e)
            else:
                runs.append((t, e))
        while len(runs) > n + 1:
            runs.pop(0 if abs(runs[0][1]) < abs(runs[-1][1]) else -1)
        worst = max(abs(e) for e in errors)
        if len(runs) < n + 1:
            break
        reference = [t for t, _ in runs]
        if worst < min(abs(e) for _, e in runs) * mpf("1.01"):
            break
    return coefficients, worst


def rounded(target, weight, n, top):
    """n coefficients that are doubles, and the largest weighted error they leave."""
    fixed = []
    while len(fixed) < n:

        def rest(t, fixed=tuple(fixed)):
            return target(t) - sum(c * t**j for j, c in enumerate(fixed))

        coefficients, _ = remez(rest, weight, list(range(len(fixed), n)), top)
        fixed.append(mpf(float(coefficients[0])))
    grid = [top * mpf(i) / 2000 for i in range(1, 2001)]
    worst = max(abs(weight(t) * (target(t) - sum(c * t**j for j, c in enumerate(fixed)))) for t in grid)
    return fixed, worst


# name: (correction P, weight of its error in the relative error of the function, largest t, numbers of
# coefficients)
SQUARE = (pi / 4 * mpf("1.00001")) ** 2


def of_square(function):
    """The correction of an odd function, and the weight of its error in the function's relative error."""
    return lambda t: (function(sqrt(t)) / sqrt(t) - 1) / t, lambda t: t * sqrt(t) / function(sqrt(t))


POLYNOMIALS = {
    "SIN": (*of_square(sin), SQUARE, (6, 5)),
    "COS": (lambda t: (cos(sqrt(t)) - 1 + t / 2) / t**2, lambda t: t**2 / cos(sqrt(t)), SQUARE, (6, 4)),
    "ASIN": (*of_square(asin), mpf(1) / 4, (12, 8)),
    "ATAN": (*of_square(atan), tan(pi / 8) ** 2 * mpf("1.00001"), (11, 7)),
    "ATANH": (*of_square(atanh), ((sqrt(2) - 1) / (sqrt(2) + 1)) ** 2 * mpf("1.00001"), (7,)),
    "EXP2": (lambda t: (2**t - 1) / t, lambda t: t / 2**t, mpf(1), (11,)),
}


def cut(value, bits):
    """The leading bits of a positive number, as an exact double."""
    exponent = int(mp.floor(mp.log(value, 2)))
    unit = mpf(2) ** (exponent - bits + 1)
    return mp.floor(value / unit) * unit


def literal(value):
    text = repr(float(value))
    assert mpf(float(text)) == value, "not a double"
    return text


def coefficients_file():
    lines = [
        "// Generated by `python rust/tables/elementary/make_elementary.py`; do not edit.",
        "",
        "//! Minimax polynomials of the elementary functions, and constants in parts.",
        "//!",
        "//! Lowest power first, in t, the square of the reduced argument; "
        "the script above says how they were made.",
        "",
    ]
    for name, (target, weight, top, sizes) in POLYNOMIALS.items():
        for kind, n in zip(("", "_COARSE"), sizes, strict=False):
            values, worst = rounded(target, weight, n, top)
            lines.append(f"/// Leaves a relative error of {float(worst):.1e} of the function.")
            lines.append("#[rustfmt::skip]")
            lines.append(f"pub(super) const {name}{kind}: [f64; {n}] = [")
            lines += [f"    {literal(v)}," for v in values]
            lines += ["];", ""]
            print(name + kind, n, mp.nstr(worst, 3), file=sys.stderr)
    first = cut(pi / 2, 36)
    second = cut(pi / 2 - first, 36)
    third = mpf(float(pi / 2 - first - second))
    lines += [
        "/// π/2 in parts of 36, 36 and 53 bits: "
        "products of the first two with whole numbers below 2¹⁷ are exact.",
        f"pub(super) const HALF_PI: [f64; 3] = [{literal(first)}, {literal(second)}, {literal(third)}];",
        "",
        "/// What the double nearest to π lacks.",
        f"pub(super) const PI_LOW: f64 = {literal(mpf(float(pi - mpf(float(pi)))))};",
    ]
    return "\n".join(lines) + "\n"


def two(value):
    """A value as the sum of two doubles."""
    high = mpf(float(value))
    return repr(float(high)), repr(float(value - high))


def reference_file():
    """name, x, y (of atan2, whose first argument is y, and of x to the power of y), value in two parts."""
    generator = random.Random(20260310)
    mp.dps = 60
    rows = []

    def add(name, function, x, y=None):
        arguments = (mpf(x),) if y is None else (mpf(y), mpf(x))
        rows.append(",".join([name, repr(x), repr(y) if y is not None else "", *two(function(*arguments))]))

    angles = [generator.uniform(-1e5, 1e5) for _ in range(150)] + [
        generator.uniform(-7, 7) for _ in range(100)
    ]
    # The doubles nearest to multiples of pi/4, where reduction cancels most, and small ones.
    angles += [
        float(k * pi / 4) for k in [*range(-20, 21), 63661 * 2, 103993, 127323, *range(4000, 120000, 4001)]
    ]
    angles += [generator.choice([-1, 1]) * 10.0 ** generator.uniform(-30, 0) for _ in range(40)]
    for x in angles:
        add("sin", sin, x)
        add("cos", cos, x)
    turns = [generator.uniform(-1e4, 1e4) for _ in range(100)] + [k / 8 for k in range(-17, 18)]
    turns += [generator.choice([-1, 1]) * 10.0 ** generator.uniform(-30, 0) for _ in range(40)]
    for x in turns:
        add("sin_turns", lambda x: sinpi(2 * x), x)
        add("cos_turns", lambda x: cospi(2 * x), x)
    sines = [generator.uniform(-1, 1) for _ in range(200)] + [0.5, -0.5, 1.0, -1.0, 0.0]
    sines += [generator.choice([-1, 1]) * (1 - 10.0 ** generator.uniform(-16, -1)) for _ in range(60)]
    sines += [generator.choice([-1, 1]) * 10.0 ** generator.uniform(-30, 0) for _ in range(40)]
    sines += [s * (0.5 + k * 2.0**-53) for s in (-1, 1) for k in (-2, -1, 1, 2)]
    for x in sines:
        add("asin", asin, x)
        add("acos", acos, x)
    slopes = [generator.choice([-1, 1]) * 10.0 ** generator.uniform(-12, 12) for _ in range(150)]
    slopes += [generator.uniform(-3, 3) for _ in range(150)]
    slopes += [0.0, 1.0, -1.0, float(tan(pi / 8)), float(tan(3 * pi / 8))]
    for x in slopes:
        add("atan", atan, x)
    for _ in range(400):
        size = 10.0 ** generator.uniform(-100, 100)
        x, y = size * generator.uniform(-1, 1), size * generator.uniform(-1, 1)
        add("atan2", atan2, x, y)
        add("atan2", atan2, x, y * 10.0 ** generator.uniform(-20, 0))
        add("atan2", atan2, x * 10.0 ** generator.uniform(-20, 0), y)
    for _ in range(300):
        add("power", lambda y, x: x**y, 2.0 ** generator.uniform(-9, 9), generator.uniform(-3, 3))
    bases = [
        2.0**-9,
        0.25,
        0.5,
        1.0,
        2.0,
        4.0,
        float(sqrt(2)),
        float(sqrt(2) / 2),
        1 + 2.0**-52,
        1 - 2.0**-53,
    ]
    for x in bases:
        for y in (-3.0, -1.6364, -1.0, -0.5, 0.0, 0.5, 1.0, 1.1, 2.0, 3.0):
            add("power", lambda y, x: x**y, x, y)
    header = [
        "# Values of elementary functions as the sum of two doubles, computed with mpmath at 60 digits.",
        "# Generated by `python rust/tables/elementary/make_elementary.py`; do not edit.",
        "function,x,y,value,value_low",
    ]
    return "\n".join(header + rows) + "\n"


def main():
    failed = False
    for path, text in ((COEFFICIENTS, coefficients_file()), (REFERENCE, reference_file())):
        if "--check" in sys.argv[1:]:
            if path.read_text() != text:
                print(f"{path} differs from what this script derives", file=sys.stderr)
                failed = True
        else:
            path.parent.mkdir(parents=True, exist_ok=True)
            path.write_text(text)
    sys.exit(1 if failed else 0)


if __name__ == "__main__":
    main()
