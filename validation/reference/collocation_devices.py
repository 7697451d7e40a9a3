"""Two devices solved as layered boundary-value problems by collocation (scipy.integrate.solve_bvp), from hand-written files.

Each layer is mapped to 0..1 and all layers are solved side by side. Per layer the six unknowns are, scaled:

    psi / Vt,  D = eps psi' / (q N0 L0),  phi_n / Vt,  phi_p / Vt,  I_n / I0,  I_p / I0      (currents positive to the right)

with  eps psi'' = -q (p - n + N_D - N_A),  I_n = -q mu_n n phi_n',  I_p = -q mu_p p phi_p',  I_n' = q (R - G) = -I_p'.
All six are continuous where two layers meet. At a contact psi and the majority's level are fixed, and the minority obeys
I = -+ q S (n - n0). R = K n p (1 - exp(-(phi_p - phi_n)/Vt)), K = 1 / (tau_p (n + ni) + tau_n (p + ni)) + B + C_n n + C_p p.
Nothing here is taken from the finite-volume equations except a first guess of the profiles; the currents are those of the
continuous problem.

Each point is solved with two tolerances; the relative difference of their currents is stored as `tolerance_reached`, beside the relative
difference from the extrapolated finite-volume current of `discrete_cell.Discrete` on three nested meshes, a wholly different
discretisation of the same device (not used for the value).

Run: python collocation_devices.py [device name]   (five minutes)
Reads `devices/*.json`, writes `collocation_devices.json`. Currents in A/m2, forward positive.
"""

import sys

import numpy as np
from scipy.integrate import solve_bvp

from constants import EPS0, HERE, K, Q, read, write
from discrete_cell import STATISTICS, Discrete
from problems import layers_of

N0, L0 = 1e23, 1e-7  # scales: 1/m3, m


def finite_volumes(device, lit, refinement, cells=240):
    """The device on a graded mesh, every interval halved `refinement` times."""
    layers = layers_of(device)
    nodes, which, start = [0.0], [], 0.0
    for number, layer in enumerate(layers):
        length = layer["thickness_m"]
        count = cells if length > 1e-7 else cells // 3
        ratio = 1.03
        weights = np.array([ratio ** min(k, count - 1 - k) for k in range(count)])
        edges = start + length * np.concatenate(([0.0], np.cumsum(weights))) / weights.sum()
        for _ in range(refinement):
            edges = np.sort(np.concatenate((edges, (edges[1:] + edges[:-1]) / 2)))
        nodes += list(edges[1:])
        which += [number] * (len(edges) - 1)
        start += length
        nodes[-1] = start
    return {
        "statistics": device["statistics"],
        "temperature_K": device["temperature_K"],
        "constants": {"elementary_charge_C": float(Q), "boltzmann_J_per_K": float(K), "vacuum_permittivity_F_per_m": float(EPS0)},
        "layers": layers,
        "left_recombination_velocity_m_per_s": device["front_recombination_velocity_cm_per_s"] * 1e-2,
        "right_recombination_velocity_m_per_s": device["rear_recombination_velocity_cm_per_s"] * 1e-2,
        "photon_flux_per_m2_s": device["photon_flux_per_cm2_s"] * 1e4 if lit else 0.0,
        "nodes_m": nodes,
        "cell_layer": which,
    }


class Layered:
    """The scaled differential equations of all layers side by side, with their analytic Jacobians."""

    def __init__(self, device, lit, contacts, current_scale):
        self.law = STATISTICS[device["statistics"]]
        self.q = float(Q)
        self.vt = float(K) * device["temperature_K"] / self.q
        layers = layers_of(device)
        self.count = len(layers)

        def column(key):
            return np.array([l[key] for l in layers])[:, None]

        self.length = column("thickness_m")
        self.eps = column("relative_permittivity") * float(EPS0)
        self.charge = column("donors_per_m3") - column("acceptors_per_m3")
        self.nc, self.nv = column("nc_per_m3"), column("nv_per_m3")
        self.chi, self.gap = column("affinity_eV") / self.vt, column("gap_eV") / self.vt
        self.mu_n, self.mu_p = column("electron_mobility_m2_per_Vs"), column("hole_mobility_m2_per_Vs")
        self.tau_n, self.tau_p = column("electron_lifetime_s"), column("hole_lifetime_s")
        self.b, self.c_n, self.c_p = column("radiative_coefficient_m3_per_s"), column("electron_auger_m6_per_s"), column("hole_auger_m6_per_s")
        self.ni = np.sqrt(self.nc * self.nv) * np.exp(-self.gap / 2)
        self.alpha = column("absorption_per_m")
        depth = np.cumsum(self.alpha * self.length, axis=0) - self.alpha * self.length
        self.arriving = (device["photon_flux_per_cm2_s"] * 1e4 if lit else 0.0) * np.exp(-depth)
        self.i0 = current_scale
        self.contacts = contacts
        self.velocity = [device["front_recombination_velocity_cm_per_s"] * 1e-2, device["rear_recombination_velocity_cm_per_s"] * 1e-2]

    def carriers(self, psi, fn, fp, layer=slice(None)):
        chi, gap = self.chi[layer], self.gap[layer]
        eta_n, eta_p = psi - fn + chi, fp - psi - chi - gap
        gamma_n, slope_n = self.law.gamma_and_slope(np.minimum(eta_n, 25.0))
        gamma_p, slope_p = self.law.gamma_and_slope(np.minimum(eta_p, 25.0))
        return self.nc[layer] * gamma_n * np.exp(eta_n), self.nv[layer] * gamma_p * np.exp(eta_p), slope_n, slope_p

    def slopes(self, s, y, with_jacobian):
        m = len(s)
        psi, d, fn, fp, jn, jp = np.moveaxis(y.reshape(self.count, 6, m), 1, 0)
        n, p, gn, gp = self.carriers(psi, fn, fp)
        split = fp - fn
        product = n * p
        x = -product * np.expm1(-split)
        denominator = self.tau_p * (n + self.ni) + self.tau_n * (p + self.ni)
        kernel = 1 / denominator + self.b + self.c_n * n + self.c_p * p
        generation = self.arriving * self.alpha * np.exp(-self.alpha * self.length * s)
        to_charge = self.length / L0 / N0
        to_current = self.q * self.length / self.i0
        f = np.empty((self.count, 6, m))
        f[:, 0] = self.length * self.q * N0 * L0 / (self.eps * self.vt) * d
        f[:, 1] = -to_charge * (p - n + self.charge)
        e_n = -self.length * self.i0 / (self.q * self.mu_n * self.vt * n)
        e_p = -self.length * self.i0 / (self.q * self.mu_p * self.vt * p)
        f[:, 2], f[:, 3] = e_n * jn, e_p * jp
        f[:, 4] = to_current * (kernel * x - generation)
        f[:, 5] = -f[:, 4]
        if not with_jacobian:
            return f.reshape(6 * self.count, m)
        r_n = (-self.tau_p * n / denominator**2 + self.c_n * n) * x + kernel * x
        r_p = (-self.tau_n * p / denominator**2 + self.c_p * p) * x + kernel * x
        r_s = kernel * product * np.exp(-split)
        jac = np.zeros((6 * self.count, 6 * self.count, m))
        for k in range(self.count):
            o = 6 * k
            jac[o, o + 1] = (self.length * self.q * N0 * L0 / (self.eps * self.vt))[k]
            jac[o + 1, o] = to_charge[k] * (p * gp + n * gn)[k]
            jac[o + 1, o + 2] = -to_charge[k] * (n * gn)[k]
            jac[o + 1, o + 3] = -to_charge[k] * (p * gp)[k]
            jac[o + 2, o + 4], jac[o + 3, o + 5] = e_n[k], e_p[k]
            jac[o + 2, o], jac[o + 2, o + 2] = -f[k, 2] * gn[k], f[k, 2] * gn[k]
            jac[o + 3, o], jac[o + 3, o + 3] = f[k, 3] * gp[k], -f[k, 3] * gp[k]
            jac[o + 4, o] = to_current[k] * (r_n * gn - r_p * gp)[k]
            jac[o + 4, o + 2] = to_current[k] * (-r_n * gn - r_s)[k]
            jac[o + 4, o + 3] = to_current[k] * (r_p * gp + r_s)[k]
            jac[o + 5, o : o + 4] = -jac[o + 4, o : o + 4]
        return jac

    def boundary(self, ya, yb, bias):
        """Contact conditions at both ends, then continuity of all six at each interface."""
        ends = []
        for side, y, layer in ((0, ya[:6], 0), (1, yb[-6:], -1)):
            psi, _, fn, fp, jn, jp = y
            contact = self.contacts[side]
            level = bias / self.vt if contact["holes"] else 0.0
            n, p, _, _ = (v.item() for v in self.carriers(*(np.array([[v]]) for v in (psi, fn, fp)), layer=[layer]))
            surface = self.q * self.velocity[side] / self.i0
            outward = -1.0 if side == 0 else 1.0
            if contact["holes"]:
                # Electrons that leave through the surface carry a current against their way.
                minority = jn + outward * surface * (n - contact["n"])
                majority = fp - level
            else:
                minority = jp - outward * surface * (p - contact["p"])
                majority = fn - level
            ends += [psi - contact["psi"] - level, majority, minority / max(1.0, surface * contact["n" if contact["holes"] else "p"])]
        return np.concatenate((ends, yb[:-6] - ya[6:]))


def profile_of(finite, state, layer, points):
    """A first guess on one layer, from a finite-volume state: the six scaled unknowns at the fractions `points`."""
    cells = [c for c, k in enumerate(finite.problem["cell_layer"]) if k == layer]
    first, last = cells[0], cells[-1] + 1
    x = finite.x[first : last + 1]
    s = (x - x[0]) / (x[-1] - x[0])
    psi, fn, fp = (v[first : last + 1] for v in state)
    middle = (s[1:] + s[:-1]) / 2
    d = finite.densities(*state)
    h = finite.h[first:last]
    i_n = finite.q * finite.mu_n[first:last] * finite.vt / h * d["n"][first:last, 0] * bernoulli_of(d["w_n"], first, last) * np.expm1(state[1][first:last] - state[1][first + 1 : last + 1])
    i_p = -finite.q * finite.mu_p[first:last] * finite.vt / h * d["p"][first:last, 0] * bernoulli_of(d["w_p"], first, last) * np.expm1(state[2][first + 1 : last + 1] - state[2][first:last])
    field = finite.eps[first:last] * finite.vt * np.diff(psi) / h / (finite.q * N0 * L0)
    return np.stack([np.interp(points, s, psi), np.interp(points, middle, field), np.interp(points, s, fn), np.interp(points, s, fp), np.interp(points, middle, i_n), np.interp(points, middle, i_p)])


def bernoulli_of(levels, first, last):
    drop = levels[first:last, 0] - levels[first:last, 1]
    small = np.abs(drop) < 1e-9
    return np.where(small, 1 - drop / 2, drop / np.expm1(np.where(small, 1.0, np.clip(drop, -700, 700))))


# The second current is the result; its distance from the first is the tolerance reached. With light in the window's device 1e-8 is not attained
# within 20,000 nodes: rounding in the steep ends of the layers stands in the way.
TOLERANCES = (1e-6, 1e-8)
TOLERANCES_WITH_WINDOW_LIT = (1e-5, 1e-6)


def device_currents(device, lit, voltages, log, tolerances=None):
    tolerances = tolerances or (TOLERANCES_WITH_WINDOW_LIT if lit and len(device["layers"]) > 2 else TOLERANCES)
    meshes = [Discrete(finite_volumes(device, lit, r)) for r in range(3)]
    sweeps = [m.sweep(voltages) for m in meshes]
    results = []
    for index, voltage in enumerate(voltages):
        raw = [sweep[index][2] for sweep in sweeps]
        once = [raw[1] + (raw[1] - raw[0]) / 3, raw[2] + (raw[2] - raw[1]) / 3]
        finite_volume = once[1] + (once[1] - once[0]) / 15
        scale = abs(finite_volume)
        system = Layered(device, lit, meshes[-1].contacts, scale)
        grid = np.linspace(0, 1, 161)
        points = (grid - np.sin(2 * np.pi * grid) / (2 * np.pi) * 0.97)  # closer at the ends of each layer
        guess = []
        for k in range(system.count):
            g = profile_of(meshes[-1], sweeps[-1][index][1], k, points)
            g[4:] /= scale
            guess.append(g)
        guess, s = np.concatenate(guess), points
        currents = []
        for tolerance in tolerances:
            solution = solve_bvp(
                lambda s, y: system.slopes(s, y, False), lambda a, b: system.boundary(a, b, voltage), s, guess,
                fun_jac=lambda s, y: system.slopes(s, y, True), tol=tolerance, bc_tol=1e-11, max_nodes=20000,
            )
            if not solution.success:
                raise ArithmeticError(f"{voltage} V at {tolerance}: {solution.message}, {solution.rms_residuals.max():.1e} with {len(solution.x)} nodes")
            s, guess = solution.x, solution.y
            total = solution.y[4] + solution.y[5]
            # Forward current leaves the p side, here the rear: it flows to the left.
            currents.append(-scale * total[0])
        row = {
            "voltage_V": voltage,
            "current_density_A_per_m2": float(f"{currents[1]:.12e}"),
            "tolerance_reached": float(f"{abs(currents[1] / currents[0] - 1):.1e}"),
            "collocation_nodes": len(s),
            "collocation_tolerance": tolerances[1],
            "finite_volume_nodes": [len(m.x) for m in meshes],
            "relative_difference_of_the_two": float(f"{finite_volume / currents[1] - 1:.1e}"),
        }
        log(str(row))
        results.append(row)
    return results


NAMES = ("homojunction_n_on_p", "heterojunction_with_window")


def compute(names=NAMES, log=lambda text: print(text, flush=True)):
    result = {"about": "Currents of the continuous problem by collocation, A/m2, forward positive (p side at the rear).", "devices": {}}
    for name in names:
        device = read(f"devices/{name}.json")
        log(name)
        result["devices"][name] = {
            "file": f"devices/{name}.json",
            "dark": device_currents(device, False, device["dark_voltages_V"], log),
            "lit": device_currents(device, True, device["lit_voltages_V"], log),
        }
    return result


if __name__ == "__main__":
    chosen = tuple(sys.argv[1:]) or NAMES
    answer = compute(chosen)
    if chosen != NAMES and (HERE / "collocation_devices.json").exists():
        answer["devices"] = {**read("collocation_devices.json")["devices"], **answer["devices"]}
    write("collocation_devices.json", answer)
