"""The discrete device equations in double precision, and reference currents of two devices on fixed coarse meshes.

A second implementation of the finite-volume equations that are written out in README.md, with its own Jacobian by hand. It solves
cases R1 (Boltzmann, dark) and R3 (Fermi-Dirac, window and back-surface field, lit) of `reference_cases.json`, both p on n, and
`devices/heterojunction_with_window.json` (n on p, lit) on meshes of about a hundred nodes, then hands each state to `discrete_equations.py`, which solves the same equations again in 50 digits with
derivatives of its own. Writes `discrete_cell.json` with both currents; on so coarse a mesh they are *not* those of the continuous
problem (which stand beside them), they are what anyone else gets who solves the same equations on the same nodes.

Run: python discrete_cell.py   (five minutes; most of it is the 50-digit part)
"""

import numpy as np
from scipy.linalg import solve_banded

import discrete_equations
import problems
from constants import read, write


class FermiDirac:
    """gamma(eta) = F(1/2)(eta) e^-eta and d ln F(1/2) / d eta, by the trapezoidal rule in t = sqrt(energy); good below eta = 30."""

    step = 0.045
    squares = (step * np.arange(1, 195)) ** 2
    exponentials = np.exp(squares)

    @classmethod
    def gamma_and_slope(cls, eta):
        flat = np.ravel(eta)
        assert flat.max() < 30.0
        weight = 1.0 / (np.exp(np.maximum(flat, -80.0))[:, None] + cls.exponentials)
        half = 2.0 * weight @ cls.squares
        minus_half = weight.sum(axis=1) + 0.5 / (np.exp(np.maximum(flat, -80.0)) + 1.0)
        gamma = 2.0 * cls.step / np.sqrt(np.pi) * half
        return gamma.reshape(eta.shape), (minus_half / half).reshape(eta.shape)


class Boltzmann:
    @staticmethod
    def gamma_and_slope(eta):
        return np.ones_like(eta), np.ones_like(eta)


STATISTICS = {"fermi_dirac": FermiDirac, "boltzmann": Boltzmann}


def bernoulli(x):
    """x / (e^x - 1) and its derivative."""
    small = np.abs(x) < 1e-2
    safe = np.where(small, 1.0, x)
    safe = np.clip(safe, -700.0, 700.0)
    grown = np.expm1(safe)
    value = np.where(small, 1 - x / 2 + x**2 / 12 - x**4 / 720 + x**6 / 30240, safe / grown)
    slope = np.where(small, -0.5 + x / 6 - x**3 / 180 + x**5 / 5040, (grown - safe * (grown + 1.0)) / grown**2)
    return value, slope


class Discrete:
    """One problem: its nodes, coefficients per cell, contacts, and Newton's method on (psi, phi_n, phi_p) in units of kT/q.

    Each cell has two ends; everything that belongs to a side of a node is an array [cells, 2]. A node's control volume is the half of
    the cell to its left plus the half of the cell to its right.
    """

    def __init__(self, problem):
        self.problem = problem
        self.law = STATISTICS[problem["statistics"]]
        constants = problem["constants"]
        self.q = constants["elementary_charge_C"]
        self.vt = constants["boltzmann_J_per_K"] * problem["temperature_K"] / self.q
        self.x = np.array(problem["nodes_m"])
        self.h = np.diff(self.x)
        which = problem["cell_layer"]
        layers = problem["layers"]

        def column(key):
            return np.array([layers[k][key] for k in which], dtype=float)

        self.nc, self.nv = column("nc_per_m3"), column("nv_per_m3")
        self.gap, self.affinity = column("gap_eV") / self.vt, column("affinity_eV") / self.vt
        self.eps = column("relative_permittivity") * constants["vacuum_permittivity_F_per_m"]
        self.charge = column("donors_per_m3") - column("acceptors_per_m3")
        self.mu_n, self.mu_p = column("electron_mobility_m2_per_Vs"), column("hole_mobility_m2_per_Vs")
        lifetimes = [[layers[k][key] for k in which] for key in ("electron_lifetime_s", "hole_lifetime_s")]
        self.srh = np.array([t is not None for t in lifetimes[0]])
        self.tau_n, self.tau_p = (np.array([1.0 if t is None else t for t in row]) for row in lifetimes)
        self.b, self.c_n, self.c_p = column("radiative_coefficient_m3_per_s"), column("electron_auger_m6_per_s"), column("hole_auger_m6_per_s")
        self.ni = np.sqrt(self.nc * self.nv) * np.exp(-self.gap / 2)
        # At both ends of each cell; equal here, and where a gap is graded within a layer they are not.
        self.affinity_at, self.gap_at, self.ni_at = (np.stack([v, v], axis=1) for v in (self.affinity, self.gap, self.ni))
        alpha = column("absorption_per_m")
        depth = np.concatenate(([0.0], np.cumsum(alpha * self.h)))[:-1]
        half = alpha * self.h / 2
        arriving = problem["photon_flux_per_m2_s"] * np.exp(-depth)
        # Pairs per area and time in the left and in the right half of each cell: exact for exponential absorption.
        self.generation = np.stack([-arriving * np.expm1(-half), -arriving * np.exp(-half) * np.expm1(-half)], axis=1)
        self.contacts = [self.contact(0, 0), self.contact(-1, 1)]
        self.contacts[0]["velocity"] = problem["left_recombination_velocity_m_per_s"]
        self.contacts[1]["velocity"] = problem["right_recombination_velocity_m_per_s"]
        assert self.contacts[0]["holes"] != self.contacts[1]["holes"], "one contact must be p and the other n"
        self.light = 1.0

    def contact(self, cell, end):
        """Neutral equilibrium at the contact: psi in kT/q, both densities."""
        low, high = -self.affinity[cell] - self.gap[cell] - 40.0, -self.affinity[cell] + 40.0
        for _ in range(200):
            psi = (low + high) / 2
            n, p = self.neutral(cell, psi)
            if p - n + self.charge[cell] > 0:
                low = psi
            else:
                high = psi
        n, p = self.neutral(cell, psi)
        return {"psi": psi, "n": n, "p": p, "holes": p > n}

    def neutral(self, cell, psi):
        eta = np.array([psi + self.affinity[cell], -psi - self.affinity[cell] - self.gap[cell]])
        gamma, _ = self.law.gamma_and_slope(np.minimum(eta, 29.0))
        n, p = np.array([self.nc[cell], self.nv[cell]]) * gamma * np.exp(np.minimum(eta, 29.0))
        return n, p

    def ends(self, node_values):
        return np.stack([node_values[:-1], node_values[1:]], axis=1)

    def densities(self, psi, fn, fp):
        """Dictionary of densities, effective levels and slopes at both ends of each cell."""
        psi, fn, fp = self.ends(psi), self.ends(fn), self.ends(fp)
        chi, gap = self.affinity_at, self.gap_at
        gamma_n, slope_n = self.law.gamma_and_slope(psi - fn + chi)
        gamma_p, slope_p = self.law.gamma_and_slope(fp - psi - chi - gap)
        w_n = psi + chi + np.log(self.nc[:, None] * gamma_n)
        w_p = -(psi + chi + gap) + np.log(self.nv[:, None] * gamma_p)
        return {"n": np.exp(w_n - fn), "p": np.exp(w_p + fp), "w_n": w_n, "w_p": w_p, "slope_n": slope_n, "slope_p": slope_p, "split": fp - fn}

    def rates(self, d):
        """Net recombination per volume at each end, and its partials by (ln n, ln p, splitting)."""
        n, p, split = d["n"], d["p"], d["split"]
        product = n * p
        x = -product * np.expm1(-split)
        dx_split = product * np.exp(-split)
        tau_n, tau_p, ni = self.tau_n[:, None], self.tau_p[:, None], self.ni_at
        denominator = tau_p * (n + ni) + tau_n * (p + ni)
        on = self.srh[:, None]
        kernel = np.where(on, 1.0 / denominator, 0.0) + self.b[:, None] + self.c_n[:, None] * n + self.c_p[:, None] * p
        kernel_n = np.where(on, -tau_p * n / denominator**2, 0.0) + self.c_n[:, None] * n
        kernel_p = np.where(on, -tau_n * p / denominator**2, 0.0) + self.c_p[:, None] * p
        return kernel * x, kernel_n * x + kernel * x, kernel_p * x + kernel * x, kernel * dx_split

    def assemble(self, state, bias, only_potential=False):
        """Residual [nodes, 3], band matrix for `solve_banded`, and the terminal current density in A/m2."""
        psi, fn, fp = state
        nodes, q = len(self.x), self.q
        d = self.densities(psi, fn, fp)
        n, p, gn, gp = d["n"], d["p"], d["slope_n"], d["slope_p"]
        volume = self.h / 2
        # Edge currents and their partials by (psi, phi) at the left and at the right end.
        drop = d["w_n"][:, 1] - d["w_n"][:, 0]
        (b_plus, s_plus), (b_minus, s_minus) = bernoulli(drop), bernoulli(-drop)
        scale = q * self.mu_n * self.vt / self.h
        i_n = scale * n[:, 0] * b_minus * np.expm1(-(fn[1:] - fn[:-1]))
        by_drop = scale * (n[:, 1] * s_plus + n[:, 0] * s_minus)
        i_n_psi = np.stack([-scale * n[:, 0] * gn[:, 0] * b_minus - by_drop * gn[:, 0], scale * n[:, 1] * gn[:, 1] * b_plus + by_drop * gn[:, 1]], 1)
        i_n_phi = np.stack(
            [scale * n[:, 0] * gn[:, 0] * b_minus - by_drop * (1 - gn[:, 0]), -scale * n[:, 1] * gn[:, 1] * b_plus + by_drop * (1 - gn[:, 1])], 1
        )
        drop = d["w_p"][:, 1] - d["w_p"][:, 0]
        (b_plus, s_plus), (b_minus, s_minus) = bernoulli(drop), bernoulli(-drop)
        scale = q * self.mu_p * self.vt / self.h
        i_p = -scale * p[:, 0] * b_minus * np.expm1(fp[1:] - fp[:-1])
        by_drop = -scale * (p[:, 1] * s_plus + p[:, 0] * s_minus)
        i_p_psi = np.stack([-scale * p[:, 0] * gp[:, 0] * b_minus + by_drop * gp[:, 0], scale * p[:, 1] * gp[:, 1] * b_plus - by_drop * gp[:, 1]], 1)
        i_p_phi = np.stack(
            [scale * p[:, 0] * gp[:, 0] * b_minus - by_drop * (gp[:, 0] - 1), -scale * p[:, 1] * gp[:, 1] * b_plus + by_drop * (gp[:, 1] - 1)], 1
        )
        rate, r_n, r_p, r_split = self.rates(d)
        source = q * (volume[:, None] * rate - self.light * self.generation)
        source_psi = q * volume[:, None] * (r_n * gn - r_p * gp)
        source_fn = q * volume[:, None] * (-r_n * gn - r_split)
        source_fp = q * volume[:, None] * (r_p * gp + r_split)
        displacement = self.eps * self.vt * (psi[1:] - psi[:-1]) / self.h

        row = np.zeros((nodes, 3))
        block = np.zeros((nodes, 3, 3, 3))  # node, row, neighbour (-1, 0, +1), unknown
        for end in (0, 1):
            at = slice(0, nodes - 1) if end == 0 else slice(1, nodes)
            sign = 1.0 if end == 0 else -1.0
            row[at, 0] += sign * displacement + q * volume * (p[:, end] - n[:, end] + self.charge)
            row[at, 1] += sign * i_n - source[:, end]
            row[at, 2] += sign * i_p + source[:, end]
            block[at, 0, 1, 0] += -q * volume * (p[:, end] * gp[:, end] + n[:, end] * gn[:, end])
            block[at, 0, 1, 1] += q * volume * n[:, end] * gn[:, end]
            block[at, 0, 1, 2] += q * volume * p[:, end] * gp[:, end]
            for other in (0, 1):
                place = 1 + other - end
                block[at, 0, place, 0] += sign * (1.0 if other else -1.0) * self.eps * self.vt / self.h
                block[at, 1, place, 0] += sign * i_n_psi[:, other]
                block[at, 1, place, 1] += sign * i_n_phi[:, other]
                block[at, 2, place, 0] += sign * i_p_psi[:, other]
                block[at, 2, place, 2] += sign * i_p_phi[:, other]
            for k, (r, s) in enumerate(((1, -1.0), (2, 1.0))):
                block[at, r, 1, 0] += s * source_psi[:, end]
                block[at, r, 1, 1] += s * source_fn[:, end]
                block[at, r, 1, 2] += s * source_fp[:, end]

        # Contacts, and the terminal current as an exact sum of rows: forward current is what recombines, whichever side p is on.
        total = source.sum()
        current = 0.0
        for k, contact in enumerate(self.contacts):
            i, cell = (0, 0) if k == 0 else (nodes - 1, -1)
            level = bias / self.vt if contact["holes"] else 0.0
            minority, majority = (1, 2) if contact["holes"] else (2, 1)
            density, slope = (n[cell, k], gn[cell, k]) if contact["holes"] else (p[cell, k], gp[cell, k])
            edge = (i_n[cell] if contact["holes"] else -i_p[cell]) * (1.0 if k == 0 else -1.0)
            velocity = contact["velocity"]
            if velocity is None:
                # The reaction of the pinned minority row: what flows through the edge, less the half cell, which then cancels.
                current += edge
                total -= source[cell, k]
                self.pin(row, block, i, minority, (fn, fp)[minority - 1][i] - level)
            else:
                excess = q * velocity * (density - (contact["n"] if contact["holes"] else contact["p"]))
                current += excess
                sign = -1.0 if minority == 1 else 1.0
                row[i, minority] += sign * excess
                way = 1.0 if minority == 1 else -1.0
                block[i, minority, 1, 0] += sign * q * velocity * density * slope * way
                block[i, minority, 1, minority] += -sign * q * velocity * density * slope * way
            self.pin(row, block, i, majority, (fn, fp)[majority - 1][i] - level)
            self.pin(row, block, i, 0, psi[i] - contact["psi"] - level)
        if only_potential:
            for i in range(nodes):
                self.pin(row, block, i, 1, 0.0)
                self.pin(row, block, i, 2, 0.0)
        return row, block, current + total

    @staticmethod
    def pin(row, block, i, which, value):
        row[i, which] = value
        block[i, which] = 0.0
        block[i, which, 1, which] = 1.0

    @staticmethod
    def step(row, block):
        nodes = len(row)
        size = np.abs(block).max(axis=(2, 3))
        row, block = row / size, block / size[:, :, None, None]
        band = np.zeros((11, 3 * nodes))
        for r in range(3):
            for place in range(3):
                for c in range(3):
                    offset = 3 * (place - 1) + c - r  # column minus row
                    columns = 3 * (np.arange(nodes) + place - 1) + c
                    ok = (columns >= 0) & (columns < 3 * nodes)
                    band[5 - offset, columns[ok]] = block[ok, r, place, c]
        return solve_banded((5, 5), band, -row.ravel()).reshape(nodes, 3)

    def newton(self, state, bias, only_potential=False, limit=120):
        """Newton's method, damped in the logarithm of the densities; three more steps once the update is below 1e-9."""
        psi, fn, fp = state
        extra = 0
        for _ in range(limit):
            row, block, current = self.assemble((psi, fn, fp), bias, only_potential)
            d = self.step(row, block)
            if not np.all(np.isfinite(d)):
                break
            if np.abs(d).max() < 1e-9:
                extra += 1
            dpsi = np.clip(d[:, 0], -4, 4)
            grow_n, grow_p = dpsi - d[:, 1], d[:, 2] - dpsi
            psi = psi + dpsi
            if only_potential:
                continue_small = np.abs(dpsi).max() < 1e-13
                if continue_small:
                    return (psi, fn, fp), current
                continue
            fn = fn + dpsi - self.damp(grow_n)
            fp = fp + dpsi + self.damp(grow_p)
            if extra >= 3:
                return (psi, fn, fp), self.assemble((psi, fn, fp), bias)[2]
        raise ArithmeticError(f"no convergence at {bias} V")

    @staticmethod
    def damp(growth):
        return np.where(growth > 0.7, np.log1p(np.maximum(growth, 0.0)), np.maximum(growth, -2.5))

    def equilibrium(self):
        """The state at zero bias in the dark."""
        guess = np.array([self.contact(c, 0)["psi"] for c in range(len(self.h))])
        psi = np.concatenate(([guess[0]], (guess[1:] + guess[:-1]) / 2, [guess[-1]]))
        psi[0], psi[-1] = self.contacts[0]["psi"], self.contacts[1]["psi"]
        zero = np.zeros_like(psi)
        saved, self.light = self.light, 0.0
        state, _ = self.newton((psi, zero, zero), 0.0, only_potential=True, limit=400)
        self.light = saved
        return state

    def split(self, state):
        """Recombination by layer and channel, and at both contacts, as current densities in A/m2 (None where the velocity is infinite)."""
        d = self.densities(*state)
        n, p = d["n"], d["p"]
        x = -n * p * np.expm1(-d["split"]) * self.q * (self.h / 2)[:, None]
        denominator = self.tau_p[:, None] * (n + self.ni_at) + self.tau_n[:, None] * (p + self.ni_at)
        channels = {
            "shockley_read_hall": np.where(self.srh[:, None], x / denominator, 0.0),
            "radiative": self.b[:, None] * x,
            "auger": (self.c_n[:, None] * n + self.c_p[:, None] * p) * x,
        }
        which = np.array(self.problem["cell_layer"])
        result = {l["name"]: {key: float(v[which == k].sum()) for key, v in channels.items()} for k, l in enumerate(self.problem["layers"])}
        for name, contact, i in (("left contact", self.contacts[0], (0, 0)), ("right contact", self.contacts[1], (-1, 1))):
            key, density = ("n", n) if contact["holes"] else ("p", p)
            velocity = contact["velocity"]
            result[name] = None if velocity is None else float(self.q * velocity * (density[i] - contact[key]))
        result["generation"] = float(self.q * self.generation.sum())
        return result

    def sweep(self, voltages, largest_step=0.1):
        """(voltage, state, current) for rising voltages, from equilibrium through intermediate steps."""
        state, bias, results = self.equilibrium(), 0.0, []
        if self.generation.any():
            for self.light in (1e-6, 1e-3, 0.1, 1.0):
                state, _ = self.newton(state, 0.0)
        for target in voltages:
            while True:
                near = target if abs(target - bias) <= largest_step else bias + np.copysign(largest_step, target - bias)
                state, current = self.newton(state, near)
                bias = near
                if near == target:
                    break
            results.append((target, state, current))
        return results


CASES = {
    "R1": (((34, 1.24), (50, 1.2)), [0.1, 0.3, 0.5, 0.7, 0.9, 1.0, 1.1]),
    "R3": (((8, 1.25), (40, 1.2), (50, 1.18), (10, 1.25)), [-0.5, 0.0, 0.4, 0.8, 0.95, 1.0, 1.05]),
    "window_n_on_p": (((8, 1.25), (30, 1.2), (50, 1.18)), [0.0, 0.4, 0.85, 0.95, 1.0]),
}
STATE_AT = {"R1": 0.9, "R3": 0.8, "window_n_on_p": 0.85}


def compute(with_digits=True, cases=tuple(CASES)):
    result = {
        "about": "The discrete equations of README.md solved on fixed coarse meshes; currents in A/m2, forward positive. "
        "`double` is from discrete_cell.py; `digits` and the slopes are from discrete_equations.py; `continuous` is the mesh-free value.",
        "problems": {},
    }
    for name in cases:
        counts, voltages = CASES[name]
        if name in ("R1", "R3"):
            p = problems.reference_case(name, counts)
            stored = read("reference_cases.json")["cases"][name]["results"]
            continuous = {v: 1e4 * j for v, j in zip(stored["V"], stored["J_reference"])}
        else:
            p, continuous = problems.device_file("heterojunction_with_window", counts), {}
        points = []
        discrete = Discrete(p)
        for voltage, state, current in discrete.sweep(voltages):
            digits = conductance = response = None
            if with_digits:
                digits, conductance, response = discrete_equations.solve(p, voltage, state, slopes=True)
            point = {"voltage_V": voltage, "double": current, "digits": digits, "conductance_S_per_m2": conductance, "response": response}
            points.append({**point, "continuous": continuous.get(voltage), "split_A_per_m2": discrete.split(state)})
            if voltage == STATE_AT[name]:
                p["state"] = {"voltage_V": voltage, **{key: [float(x) for x in discrete.vt * v] for key, v in zip(("psi_V", "phi_n_V", "phi_p_V"), state)}}
        p["points"] = points
        result["problems"][name] = p
    return result


if __name__ == "__main__":
    write("discrete_cell.json", compute())
