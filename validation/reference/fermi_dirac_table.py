"""Writes solver/src/math/fermi_dirac_table.rs: the table and the series behind the Fermi-Dirac functions.

Run from the root of the repository, with mpmath:

    python validation/reference/fermi_dirac_table.py

The tabulated function is g(eta) = ln(F(eta)) - eta, F the Fermi-Dirac integral of order 1/2 normalised so that
F -> exp(eta) for eta -> -infinity. Half a step to either side of each centre the slope g' is interpolated at Chebyshev points and then
integrated, so that the slope is as good as the value. Above the table, ln F follows Sommerfeld's expansion
(A. Sommerfeld, Z. Phys. 47, 1 (1928)), turned here into a series of its logarithm in 1/eta^2.

All arithmetic has 50 digits. F and its slope come from a geometric-like series below eta = -3 and from the
trapezoidal rule for the integral over the whole line of t^2 / (1 + exp(t^2 - eta)) above, which converges
exponentially because the integrand is analytic in a strip; a few values are compared with the polylogarithm.
"""

from mpmath import mp, mpf

mp.dps = 50
START, STEP, CENTRES, TERMS = mpf(-36), mpf(1) / 4, 289, 9
SERIES_TERMS = 10


def integrals(eta):
    """F of order 1/2 and of order -1/2 (the slope of the first)."""
    eta = mpf(eta)
    if eta < -3:
        half = minus = mpf(0)
        k, power = 1, mp.exp(eta)
        while mp.fabs(power) > mp.eps * mp.exp(eta) / 100:
            sign = 1 if k % 2 else -1
            minus += sign * power / mp.sqrt(k)
            half += sign * power / (k * mp.sqrt(k))
            k += 1
            power *= mp.exp(eta)
        return half, minus
    # Nearest poles at t = sqrt(eta +- i pi); the error of step h is about exp(-2 pi Im(t) / h).
    strip = mp.im(mp.sqrt(mp.mpc(eta, mp.pi)))
    h = 2 * mp.pi * strip / mpf(110)
    count = int(mp.sqrt(max(eta, 0) + 120) / h) + 2
    half, minus = mpf(0), 1 / (1 + mp.exp(-eta)) / 2
    for i in range(1, count):
        square = (i * h) ** 2
        occupation = 1 / (1 + mp.exp(square - eta))
        half += square * occupation
        minus += occupation
    return 4 * h * half / mp.sqrt(mp.pi), 2 * h * minus / mp.sqrt(mp.pi)


def log_gamma(eta):
    """g and its slope."""
    half, minus = integrals(eta)
    if eta < -3:  # keeps the digits of g where F is nearly exp(eta)
        ratio, slope, k, power = mpf(0), mpf(0), 1, mpf(1)
        while power > mp.eps / 100:
            power *= mp.exp(eta)
            term = (-1) ** k * power / mpf(k + 1) ** mpf(1.5)
            ratio += term
            slope += k * term
            k += 1
        return mp.log1p(ratio), slope / (1 + ratio)
    return mp.log(half) - eta, minus / half - 1


def coefficients(index):
    """Power series about a centre: value at the centre, then the integrated interpolant of g'."""
    centre, half_width = START + index * STEP, STEP / 2
    n = TERMS - 1
    nodes = [half_width * mp.cos(mp.pi * (2 * i + 1) / (2 * n)) for i in range(n)]
    values = [log_gamma(centre + t)[1] for t in nodes]
    # Newton's divided differences, expanded to powers.
    differences = list(values)
    for level in range(1, n):
        for i in range(n - 1, level - 1, -1):
            differences[i] = (differences[i] - differences[i - 1]) / (nodes[i] - nodes[i - level])
    powers = [mpf(0)] * n
    for i in range(n - 1, -1, -1):
        shifted = [mpf(0)] + powers[:-1]
        powers = [s - nodes[i] * p for s, p in zip(shifted, powers)]
        powers[0] += differences[i]
    return [log_gamma(centre)[0]] + [p / (k + 1) for k, p in enumerate(powers)]


def sommerfeld_logarithm():
    """Coefficients of w = 1/eta^2 in ln(F / (4 eta^1.5 / (3 sqrt(pi)))), lowest order first, without the constant 0."""
    a = [2 * mp.altzeta(2 * n) * mp.gamma(mpf(5) / 2) / mp.gamma(mpf(5) / 2 - 2 * n) for n in range(SERIES_TERMS + 1)]
    a[0] = mpf(1)
    logs = [mpf(0)]
    for n in range(1, SERIES_TERMS + 1):
        logs.append(a[n] - sum(k * logs[k] * a[n - k] for k in range(1, n)) / n)
    return logs[1:]


def check_integrals():
    for eta in (-5, -1, 0, 2, 10, 30):
        half, minus = integrals(eta)
        for order, value in ((mpf(3) / 2, half), (mpf(1) / 2, minus)):
            exact = -mp.polylog(order, -mp.exp(eta)).real
            assert mp.fabs(value / exact - 1) < mpf(10) ** -35, (eta, order, value, exact)


def main():
    check_integrals()
    series = sommerfeld_logarithm()
    end = START + STEP * (CENTRES - 1)
    worst = mpf(0)
    for eta in (end, end + 1, end + 5, 60, 100):
        log = mp.log(4 / (3 * mp.sqrt(mp.pi))) + mpf(3) / 2 * mp.log(eta)
        log += sum(c * mpf(eta) ** (-2 * (k + 1)) for k, c in enumerate(series))
        worst = max(worst, mp.fabs(log - mp.log(integrals(eta)[0])))
    print("series above the table: worst error of ln F", mp.nstr(worst, 3))
    with open("solver/src/math/fermi_dirac_table.rs", "w") as out:
        out.write("//! Table of ln(F(eta)) - eta, F the Fermi-Dirac integral of order 1/2, and the series above it.\n//!\n")
        out.write("//! Written by `validation/reference/fermi_dirac_table.py`; edit that script, not this file.\n\n")
        out.write("use super::piecewise::Piecewise;\n\n")
        out.write("/// Where the table ends and Sommerfeld's expansion takes over.\n")
        out.write(f"pub(super) const END: f64 = {float(end)!r};\n")
        out.write("/// `ln(4 / (3 sqrt(pi)))`, the constant of Sommerfeld's leading term.\n")
        out.write(f"pub(super) const LN_LEADING: f64 = {float(mp.log(4 / (3 * mp.sqrt(mp.pi))))!r};\n")
        out.write("/// `ln(F / leading term)` as a series in `1/eta^2`, from the first power up.\n")
        out.write(f"pub(super) const SOMMERFELD: [f64; {len(series)}] = [\n")
        for c in series:
            out.write(f"    {float(c)!r},\n")
        out.write("];\n")
        out.write(f"/// `ln(F(eta)) - eta` on [{float(START)!r}, {float(end)!r}].\n")
        out.write("pub(super) const LN_GAMMA: Piecewise = Piecewise {\n")
        out.write(f"    start: {float(START)!r},\n    inverse_step: {float(1 / STEP)!r},\n    step: {float(STEP)!r},\n")
        out.write("    coefficients: &COEFFICIENTS,\n};\n\n")
        out.write("#[rustfmt::skip]\n")
        out.write(f"static COEFFICIENTS: [[f64; Piecewise::TERMS]; {CENTRES}] = [\n")
        for index in range(CENTRES):
            row = ", ".join(repr(float(c)) for c in coefficients(index))
            out.write(f"    [{row}],\n")
        out.write("];\n")


if __name__ == "__main__":
    main()
