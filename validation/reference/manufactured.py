"""A manufactured solution of the coupled equations, and the order of accuracy that the discrete equations reach on it.

Two layers that meet at 0.4 um, Fermi-Dirac statistics up to a reduced level of about 3, all three recombination channels, a gap and an affinity that
vary linearly within the first layer, steps of gap, affinity, permittivity and mobility at the interface. With z = x / 1 um:

    psi   = -4.01 V + 0.15 V cos(3.4 z)
    phi_n = 0.03 V sin(2.1 z + 0.3)
    phi_p = 1.28 V + 0.03 V cos(1.7 z)

These fields are imposed; what they fail to satisfy is put into the right-hand side. For a node whose control volume reaches from l to r:

    S_psi = D(r) - D(l) + q integral of (p - n + N_D - N_A)       D = eps psi'
    S_n   = I_n(r) - I_n(l) - q integral of R                     I_n = -q mu_n n phi_n'
    S_p   = I_p(r) - I_p(l) + q integral of R                     I_p = -q mu_p p phi_p'

with the exact fluxes of the imposed fields (at the interface they jump, and the difference contains the jump) and Gauss quadrature
over each half of the control volume. S is subtracted from the rows of the discrete equations; all three fields are fixed at both ends.
The mesh is x = start + length (s + 0.15 sin(2 pi s) / pi), s uniform in each layer.

Writes `manufactured.json`: the layers, the imposed fields with their slopes, densities, fluxes and rates at a set of points (mpmath, 18 digits), and the errors
and orders of the equations of `discrete_cell.py` on five meshes. Errors of potentials are root mean squares over x, in V; `front_electron_current` is the relative
error of the electron current through x = 0.

Run: python manufactured.py   (a few seconds)
"""

import mpmath as mp
import numpy as np

import discrete_equations
import problems
from constants import write
from discrete_cell import FermiDirac, Discrete

FIELDS = {
    "unit_length_m": 1e-6,
    "psi_V": {"constant": -4.01, "amplitude": 0.15, "function": "cos", "wavenumber": 3.4, "phase": 0.0},
    "phi_n_V": {"constant": 0.0, "amplitude": 0.03, "function": "sin", "wavenumber": 2.1, "phase": 0.3},
    "phi_p_V": {"constant": 1.28, "amplitude": 0.03, "function": "cos", "wavenumber": 1.7, "phase": 0.0},
}
NAMES = ("psi_V", "phi_n_V", "phi_p_V")
# Gap and affinity in eV at the front and at the rear of each layer.
GRADING = [{"gap_eV": (1.62, 1.52), "affinity_eV": (3.95, 4.0)}, {"gap_eV": (1.42, 1.42), "affinity_eV": (4.07, 4.07)}]
LAYERS = [
    problems.layer("graded", 0.4e-6, 1e17, 0.0, 1.57, 3.975, 11.8, 6e17, 1.2e19, 900.0, 70.0, 1e-9, 2e-9, 2e-10, 3e-30, 5e-30, 0.0),
    problems.layer("plain", 0.6e-6, 0.0, 5e16, 1.42, 4.07, 12.9, 4.4e17, 8.5e18, 3000.0, 200.0, 5e-9, 8e-9, 3e-10, 1e-30, 2e-30, 0.0),
]
TEMPERATURE = 300.0
MESHES = [(10, 15), (20, 30), (40, 60), (80, 120), (160, 240)]
START = (0.0, 0.4e-6)


def field(name, x, number):
    """(value, slope) in V and V/m; `number` is numpy or mpmath."""
    f = FIELDS[name]
    k, scale = f["wavenumber"], FIELDS["unit_length_m"]
    argument = k * (x / scale) + f["phase"]
    if f["function"] == "cos":
        return f["constant"] + f["amplitude"] * number.cos(argument), -f["amplitude"] * number.sin(argument) * (k / scale)
    return f["constant"] + f["amplitude"] * number.sin(argument), f["amplitude"] * number.cos(argument) * (k / scale)


def graded(layer, key, x):
    front, rear = GRADING[layer][key]
    return front + (rear - front) * ((x - START[layer]) / LAYERS[layer]["thickness_m"])


def exact(layer, x, constants, vt, number, gamma):
    """Everything at depth `x` (m) of one layer: densities, fluxes, rates."""
    m = LAYERS[layer]
    q, eps0 = constants["elementary_charge_C"], constants["vacuum_permittivity_F_per_m"]
    (psi, psi_x), (fn, fn_x), (fp, fp_x) = (field(name, x, number) for name in NAMES)
    chi, gap = graded(layer, "affinity_eV", x), graded(layer, "gap_eV", x)
    eta_n, eta_p = (psi - fn + chi) / vt, (fp - psi - chi - gap) / vt
    n, p = m["nc_per_m3"] * gamma(eta_n) * number.exp(eta_n), m["nv_per_m3"] * gamma(eta_p) * number.exp(eta_p)
    x_rate = -n * p * number.expm1((fn - fp) / vt)
    ni = number.sqrt(m["nc_per_m3"] * m["nv_per_m3"]) * number.exp(-gap / (2 * vt))
    srh = x_rate / (m["hole_lifetime_s"] * (n + ni) + m["electron_lifetime_s"] * (p + ni))
    radiative = m["radiative_coefficient_m3_per_s"] * x_rate
    auger = (m["electron_auger_m6_per_s"] * n + m["hole_auger_m6_per_s"] * p) * x_rate
    return {
        "psi_V": psi, "phi_n_V": fn, "phi_p_V": fp, "psi_slope_V_per_m": psi_x, "phi_n_slope_V_per_m": fn_x, "phi_p_slope_V_per_m": fp_x,
        "eta_n": eta_n, "eta_p": eta_p, "n_per_m3": n, "p_per_m3": p,
        "displacement_C_per_m2": m["relative_permittivity"] * eps0 * psi_x,
        "electron_current_A_per_m2": -q * m["electron_mobility_m2_per_Vs"] * n * fn_x,
        "hole_current_A_per_m2": -q * m["hole_mobility_m2_per_Vs"] * p * fp_x,
        "charge_C_per_m3": q * (p - n + m["donors_per_m3"] - m["acceptors_per_m3"]),
        "shockley_read_hall_per_m3_s": srh, "radiative_per_m3_s": radiative, "auger_per_m3_s": auger,
    }


def mesh(counts):
    nodes, which = [0.0], []
    for layer, count in enumerate(counts):
        s = np.arange(1, count + 1) / count
        length = LAYERS[layer]["thickness_m"]
        nodes += list(START[layer] + length * (s + 0.15 * np.sin(2 * np.pi * s) / np.pi))
        nodes[-1] = START[layer] + length
        which += [layer] * count
    return nodes, which


class Imposed(Discrete):
    """The discrete equations with the right-hand side of the imposed fields, everything fixed at both ends."""

    def __init__(self, counts):
        base = problems.problem("manufactured", "fermi_dirac", TEMPERATURE, LAYERS, (None, None), 0.0, ((2, 1.0), (2, 1.0)))
        base["nodes_m"], base["cell_layer"] = mesh(counts)
        self.constants = base["constants"]
        super().__init__(base)
        for c, layer in enumerate(base["cell_layer"]):
            for end in (0, 1):
                x = self.x[c + end]
                self.affinity_at[c, end], self.gap_at[c, end] = graded(layer, "affinity_eV", x) / self.vt, graded(layer, "gap_eV", x) / self.vt
        self.ni_at = np.sqrt(self.nc * self.nv)[:, None] * np.exp(-self.gap_at / 2)
        self.wanted = np.stack([field(name, self.x, np)[0] / self.vt for name in NAMES])
        self.source = np.zeros((len(self.x), 3))
        abscissae, weights = np.polynomial.legendre.leggauss(6)
        for c, layer in enumerate(base["cell_layer"]):
            a, b = self.x[c], self.x[c + 1]
            middle = self.flux_and_density(layer, np.array([(a + b) / 2]))[:3, 0]
            for end, x in ((0, a), (1, b)):
                # Within a half volume the flux at the node cancels against the other half, but for its jump at the interface and its value at the ends.
                low, high = (a, (a + b) / 2) if end == 0 else ((a + b) / 2, b)
                inside = self.flux_and_density(layer, (low + high) / 2 + (high - low) / 2 * abscissae)[3:]
                charge, rate = inside @ weights * (high - low) / 2
                self.source[c + end] += (middle if end == 0 else -middle) + np.array([charge, -self.q * rate, self.q * rate])
        self.source[0] -= self.flux_and_density(0, np.array([self.x[0]]))[:3, 0]
        self.source[-1] += self.flux_and_density(len(LAYERS) - 1, np.array([self.x[-1]]))[:3, 0]

    def contact(self, cell, end):
        return {"psi": 0.0, "n": 0.0, "p": 0.0, "holes": end == 1}

    def flux_and_density(self, layer, x):
        e = exact(layer, x, self.constants, self.vt, np, lambda eta: FermiDirac.gamma_and_slope(eta)[0])
        rate = e["shockley_read_hall_per_m3_s"] + e["radiative_per_m3_s"] + e["auger_per_m3_s"]
        return np.stack([e["displacement_C_per_m2"], e["electron_current_A_per_m2"], e["hole_current_A_per_m2"], e["charge_C_per_m3"], rate])

    def pin(self, row, block, i, which, value):
        """Nothing is fixed while the rows are gathered: `assemble` below does it at the end."""

    def assemble(self, state, bias, only_potential=False):
        row, block, _ = super().assemble(state, bias)
        row = row - self.source
        self.front = row[0].copy()  # what enters at x = 0: the row there lacks only that current
        for i in (0, -1):
            for k in range(3):
                Discrete.pin(row, block, i, k, state[k][i] - self.wanted[k][i])
        return row, block, 0.0


def errors(counts):
    problem = Imposed(counts)
    state, _ = problem.newton(tuple(problem.wanted), 0.0)
    volume = np.zeros_like(problem.x)
    volume[:-1] += problem.h / 2
    volume[1:] += problem.h / 2
    result = {"cells": list(counts)}
    for name, value, wanted in zip(NAMES, state, problem.wanted):
        result[name] = problem.vt * float(np.sqrt(np.sum(volume * (value - wanted) ** 2) / volume.sum()))
    exact_current = problem.flux_and_density(0, np.array([0.0]))[1, 0]
    result["front_electron_current"] = abs(float(problem.front[1] / exact_current) - 1)
    return result


def compute():
    constants = problems.problem("", "fermi_dirac", TEMPERATURE, LAYERS, (None, None), 0.0, ((2, 1.0), (2, 1.0)))["constants"]
    points = []
    with mp.workdps(30):
        exactly = {k: mp.mpf(v) for k, v in constants.items()}
        vt = exactly["boltzmann_J_per_K"] * mp.mpf(TEMPERATURE) / exactly["elementary_charge_C"]
        for layer, m in enumerate(LAYERS):
            for k in range(11):
                x = float(f"{START[layer] + m['thickness_m'] * k / 10:.12g}")
                e = exact(layer, mp.mpf(x), exactly, vt, mp, lambda eta: mp.exp(discrete_equations.ln_gamma(eta, True)))
                points.append({"layer": layer, "x_m": x, **{key: mp.nstr(value, 18, strip_zeros=False) for key, value in e.items()}})
    meshes = [errors(counts) for counts in MESHES]
    keys = [*NAMES, "front_electron_current"]
    orders = [{key: round(float(np.log2(a[key] / b[key])), 3) for key in keys} for a, b in zip(meshes, meshes[1:])]
    for row in meshes:
        row.update({key: float(f"{row[key]:.3g}") for key in keys})
    return {
        "about": "Imposed fields for the coupled equations; see manufactured.py for the right-hand side that belongs to them.",
        "statistics": "fermi_dirac",
        "temperature_K": TEMPERATURE,
        "constants": constants,
        "fields": FIELDS,
        "layers": [{**m, **{key: list(pair) for key, pair in g.items()}} for m, g in zip(LAYERS, GRADING)],
        "points": points,
        "meshes": meshes,
        "orders": orders,
    }


if __name__ == "__main__":
    write("manufactured.json", compute())
