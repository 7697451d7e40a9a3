"""Fermi-Dirac integrals, their inverse, the Bernoulli function and the exact degenerate interval flux.

Computes with mpmath, to 20 digits, and writes `fermi_dirac_points.json`:

* F(1/2) and F(-1/2), normalised, F_j(eta) = -Li_{j+1}(-e^eta), at 200 points on -30..100. Each value is taken from the
  trapezoidal rule after x = t^2 (the integrand is then even and analytic, so the rule converges exponentially) and compared
  with mpmath's polylogarithm where that is quick, up to eta = 20;
* eta for given F(1/2), found by Newton's method on the same function, for 101 values of F from 1e-13 to 708;
* B(x) = x / (e^x - 1) on both sides of 0;
* the current j through an interval in which the potential rises linearly by d (in units of kT/q) between the reduced levels
  eta_k and eta_l: j solves  integral from eta_k to eta_l of d eta / (d + j / F(1/2)(eta)) = 1.  Beside it the relative error of
  j_s = B(Q) F_l - B(-Q) F_k with Q = d + (ln F_l - eta_l) - (ln F_k - eta_k).

Run: python fermi_dirac_points.py   (about ten seconds)
"""

import mpmath as mp

from constants import write

DIGITS = 40


def fermi_pair(eta):
    """(F(1/2), F(-1/2)) at `eta`, to nearly the working precision of mpmath.

    F(1/2) = 4/sqrt(pi) integral over t > 0 of t^2 / (1 + e^(t^2 - eta)), F(-1/2) = 2/sqrt(pi) integral of 1 / (1 + e^(t^2 - eta)).
    The poles nearest to the real axis lie at t^2 = eta + i pi; the step is chosen so that e^(-2 pi Im(t) / step) is negligible.
    """
    eta = mp.mpf(eta)
    goal = (mp.mp.dps + 4) * mp.log(10)
    distance = mp.im(mp.sqrt(eta + mp.pi * 1j))
    # Without a nearby pole the Gaussian decides: its error is e^(-(pi/step)^2).
    step = min(2 * mp.pi * distance / goal, mp.pi / mp.sqrt(goal))
    last = int(mp.sqrt(max(eta, 0) + goal) / step) + 2
    boltzmann = mp.exp(eta)
    upper, lower = mp.mpf(0), 1 / (boltzmann + 1) / 2
    for k in range(1, last + 1):
        square = (k * step) ** 2
        term = 1 / (boltzmann + mp.exp(square))
        upper += square * term
        lower += term
    scale = boltzmann * step / mp.sqrt(mp.pi)
    return 4 * scale * upper, 2 * scale * lower


def bernoulli(x):
    """x / (e^x - 1)."""
    x = mp.mpf(x)
    return x / mp.expm1(x) if x else mp.mpf(1)


def inverse_half(value):
    """eta with F(1/2)(eta) = value, by Newton's method on ln F."""
    value = mp.mpf(value)
    eta = mp.log(value) if value < 2 else (mp.mpf(3) / 4 * mp.sqrt(mp.pi) * value) ** (mp.mpf(2) / 3)
    for _ in range(60):
        half, minus_half = fermi_pair(eta)
        step = mp.log(half / value) * half / minus_half
        eta -= step
        if abs(step) < mp.mpf(10) ** (-mp.mp.dps // 2 - 6):
            return eta
    raise ArithmeticError("the inverse did not converge")


def exact_interval_current(eta_k, eta_l, d):
    """The current through an interval with a constant field between two degenerate ends, by quadrature and bisection-safe secants."""
    eta_k, eta_l, d = mp.mpf(eta_k), mp.mpf(eta_l), mp.mpf(d)
    nodes = mp.calculus.quadrature.GaussLegendre(mp.mp).calc_nodes(4, mp.mp.prec)
    middle, half = (eta_k + eta_l) / 2, (eta_l - eta_k) / 2
    densities = [(fermi_pair(middle + half * x)[0], w * half) for x, w in nodes]

    def excess(j):
        return sum(w * f / (d * f + j) for f, w in densities) - 1

    start = scheme_current(eta_k, eta_l, d)
    # The slope of eta never changes its sign within the interval, so d F + j > 0 bounds j from below.
    low = max(-d * fermi_pair(eta_k)[0], -d * fermi_pair(eta_l)[0])
    low += abs(start - low) / 100
    high = start + 2 * abs(start)
    return mp.findroot(excess, (low, high), solver="anderson", tol=mp.mpf(10) ** -60, maxsteps=200, verify=False)


def scheme_current(eta_k, eta_l, d):
    """B(Q) F_l - B(-Q) F_k with Q = d + (ln F_l - eta_l) - (ln F_k - eta_k)."""
    f_k, f_l = fermi_pair(eta_k)[0], fermi_pair(eta_l)[0]
    q = d + (mp.log(f_l) - eta_l) - (mp.log(f_k) - eta_k)
    return bernoulli(q) * f_l - bernoulli(-q) * f_k


INTERVALS = [("-2", "0", "0.5"), ("0", "2", "0.5"), ("2", "4", "0.5"), ("4", "6", "1"), ("1", "5", "-2"), ("8", "9", "0.2"), ("0", "0.5", "0.1")]


def digits(x, count=20):
    return mp.nstr(x, count, strip_zeros=False)


def compute():
    with mp.workdps(DIGITS):
        return compute_in_present_precision()


def compute_in_present_precision():
    points, worst = [], mp.mpf(0)
    # Multiples of 1/64 and 1/32: exact in binary, so no argument is rounded on either side of a comparison.
    grid = sorted({round(64 * (-30 + 130 * k / 199)) / 64 for k in range(200)})
    assert len(grid) == 200
    for eta in grid:
        half, minus_half = fermi_pair(eta)
        if -6 <= eta <= 20 and len(points) % 4 == 0:
            for order, value in ((mp.mpf(3) / 2, half), (mp.mpf(1) / 2, minus_half)):
                other = mp.re(-mp.polylog(order, -mp.exp(mp.mpf(eta))))
                worst = max(worst, abs(value / other - 1))
        points.append({"eta": eta, "half": digits(half), "minus_half": digits(minus_half), "ln_half_minus_eta": digits(mp.log(half) - mp.mpf(eta))})
    whole = []
    for eta in range(-4, 21):
        half, minus_half = fermi_pair(eta)
        whole.append({"eta": float(eta), "half": digits(half), "minus_half": digits(minus_half)})
    inverse = []
    for k in range(101):
        value = float(f"{10 ** (-13 + 15.85 * k / 100):.6e}")
        inverse.append({"half": value, "eta": digits(inverse_half(value))})
    bernoulli_points = [0.0]
    for size in (2.0**-60, 2.0**-40, 2.0**-30, 2.0**-20, 2.0**-14, 2.0**-10, 2.0**-7, 0.03125, 0.0625, 0.09375, 0.125, 0.25, 0.5, 1.0, 1.5, 2.0, 3.0, 5.0, 8.0, 13.0, 21.0, 34.0, 36.0, 37.0, 40.0, 55.0, 100.0, 300.0, 600.0, 700.0, 740.0, 800.0, 5000.0):
        bernoulli_points += [size, -size]
    flux = []
    for eta_k, eta_l, d in INTERVALS:
        k, l, drop = mp.mpf(eta_k), mp.mpf(eta_l), mp.mpf(d)
        exact = exact_interval_current(k, l, drop)
        scheme = scheme_current(k, l, drop)
        flux.append({"eta_k": float(eta_k), "eta_l": float(eta_l), "potential_rise": d, "exact": digits(exact), "scheme": digits(scheme), "scheme_relative_error": digits(scheme / exact - 1)})
    return {
        "about": "Fermi-Dirac integrals normalised as -Li_{j+1}(-e^eta), their inverse, x/(e^x-1), and the exact current through a degenerate interval.",
        "tool": "mpmath, 40 digits, 20 kept",
        "largest_difference_from_polylogarithm": mp.nstr(worst, 3),
        "fermi_dirac": points,
        "whole": whole,
        "inverse_half": inverse,
        "bernoulli": [{"x": x, "value": digits(bernoulli(x))} for x in sorted(bernoulli_points)],
        "interval_flux": flux,
    }


if __name__ == "__main__":
    write("fermi_dirac_points.json", compute())
