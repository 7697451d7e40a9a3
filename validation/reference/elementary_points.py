"""Writes solver/src/math/reference_points.rs: values against which the tests of the math floor measure.

Run from the root of the repository, with mpmath:

    python validation/reference/elementary_points.py

Each elementary function is given as (x, upper, lower): the sum of the last two is the true value to about 32 digits, so
that errors can be stated in fractions of the last place. Special functions are rounded to double. All arithmetic has
50 digits. The arguments are spread over the whole range and denser near 0 (near 1 for the logarithm); besides them stand
those at which a search over several million arguments, against 80-bit arithmetic, found the largest errors.
"""

import random

from fermi_dirac_table import integrals, log_gamma
from mpmath import mp, mpf

mp.dps = 50
SEED = 20
# Worst arguments found by the search.
WORST = {
    "exp": [-173.57616144304313, -649.7758116532252, 594.3830704537813, 463.38124918397034],
    "exp_m1": [0.37023677337032684, 0.35749447322117583, 0.36097960296782433, 0.3601504044089636],
    "ln": [1.4082298909492672, 1.411688357054621, 1.4054572423713652, 1.3987537437297537, 1.4073548716132447],
}


def pair(value):
    upper = float(value)
    return upper, float(value - mpf(upper))


def arguments(name, rng):
    if name == "ln":
        wide = [2.0 ** rng.uniform(-1021, 1023) for _ in range(100)]
        near = [rng.uniform(0.5, 2.0) for _ in range(100)] + [1.0 + rng.choice((-1, 1)) * 10 ** rng.uniform(-15, -1) for _ in range(60)]
        special = [1.0, 2.0, 0.5, 2.2250738585072014e-308, 1.7976931348623157e308, 5e-324, 1e-310]
    else:
        low = -706.9 if name == "exp" else -60.0
        wide = [rng.uniform(low, 709.7) for _ in range(100)]
        near = [rng.uniform(-2.0, 2.0) for _ in range(100)] + [rng.choice((-1, 1)) * 10 ** rng.uniform(-12, 0) for _ in range(60)]
        special = [0.5, 1.0, -1.0, 709.78, 0.34657359027997264, 0.34657359027997275, -0.3465735902799727]
    return wide + near + special + WORST[name]


def bernoulli(x):
    """B, B', B'' by Taylor series of the exact quotient."""
    x = mpf(x)
    function = lambda t: t / mp.expm1(t) if t != 0 else mpf(1)
    if abs(x) < 3:
        series = [mp.bernoulli(k) / mp.factorial(k) for k in range(90)]
        value = sum(c * x**k for k, c in enumerate(series))
        slope = sum(k * c * x ** (k - 1) for k, c in enumerate(series) if k > 0)
        curvature = sum(k * (k - 1) * c * x ** (k - 2) for k, c in enumerate(series) if k > 1)
        return value, slope, curvature
    e, value = mp.exp(x), function(x)
    d = e - 1
    return value, 1 / d - x * e / d**2, -2 * e / d**2 - x * e / d**2 + 2 * x * e**2 / d**3


def curvature_of_log_gamma(eta):
    h = mpf(10) ** -12
    return (log_gamma(mpf(eta) + h)[1] - log_gamma(mpf(eta) - h)[1]) / (2 * h)


def write_table(out, name, doc, columns, rows):
    out.write(f"/// {doc}\n#[rustfmt::skip]\npub(super) const {name}: [[f64; {columns}]; {len(rows)}] = [\n")
    for row in rows:
        out.write("    [" + ", ".join(repr(float(v)) for v in row) + "],\n")
    out.write("];\n")


def main():
    rng = random.Random(SEED)
    with open("solver/src/math/reference_points.rs", "w") as out:
        out.write("//! Reference values for the tests of this floor, from 50-digit arithmetic (mpmath).\n//!\n")
        out.write("//! Written by `validation/reference/elementary_points.py`; edit that script, not this file.\n\n")
        for name, function in (("exp", mp.exp), ("exp_m1", mp.expm1), ("ln", mp.log)):
            rows = [(x, *pair(function(mpf(x)))) for x in arguments(name, rng)]
            write_table(out, name.upper(), f"`{name}`: argument, value, rest of the value.", 3, rows)
        near = [rng.uniform(-1.5, 1.5) for _ in range(60)] + [0.0, 1.0, -1.0, 1e-8, -1e-8, 0.999999999999, 1.000000000001]
        far = [rng.uniform(-40, 40) for _ in range(60)] + [600.0, -800.0, -690.0]
        write_table(out, "BERNOULLI", "Bernoulli function: argument, value, first and second derivative.", 4,
                    [(x, *bernoulli(x)) for x in near + far])
        etas = [rng.uniform(-35, 35) for _ in range(90)] + [rng.uniform(-4, 6) for _ in range(60)]
        etas += [rng.uniform(35, 100) for _ in range(30)] + [-30.0, -0.25, 0.0, 0.125, 0.25, 35.9999, 36.0, 36.0001, 37.0, 44.0, 100.0]
        rows = []
        for eta in etas:
            half, minus = integrals(eta)
            rows.append((eta, half, minus, *log_gamma(eta), curvature_of_log_gamma(eta)))
        write_table(out, "FERMI_DIRAC", "Argument, F of order 1/2, of order -1/2, ln(F) - argument, its first and second derivative.", 6, rows)
        points = [rng.uniform(-5, 5) for _ in range(20)] + [0.0, 10.0, 25.0]
        write_table(out, "ERFC", "Complementary error function: argument, value.", 2, [(x, mp.erfc(mpf(x))) for x in points])


if __name__ == "__main__":
    main()
