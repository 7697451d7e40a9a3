"""The discrete device equations in arbitrary precision (mpmath), for the scripts that need more digits than a double holds.

Written apart from `discrete_cell.py`: each cell is an element that adds six numbers to the balances of its two nodes, the Jacobian is
a difference quotient taken with a step of 10^-30 in twice that precision, and the linear system is solved by block elimination.
The two forms of each edge current (difference of B-weighted densities, and B times expm1 of the level's drop) are compared with
each other on every cell of every final state.

Not run by itself; `solve(problem, voltage, start)` is called by dark_diode_50_digits.py and discrete_cell.py.
"""

from functools import lru_cache

import mpmath as mp

DIGITS = 50  # digits that the stopping test asks for; the working precision is larger
WORKING_DIGITS = 75
STEP = mp.mpf(10) ** -34


@lru_cache(maxsize=None)
def trapezoid(bucket, precision):
    """(step, [(t^2, e^(t^2))]) of a rule for the Fermi-Dirac integrals that holds for eta up to `bucket`, at mpmath's present `precision`."""
    goal = 72 * mp.log(10)
    distance = mp.im(mp.sqrt(bucket + mp.pi * 1j))
    step = min(2 * mp.pi * distance / goal, mp.pi / mp.sqrt(goal))
    count = int(mp.sqrt(max(bucket, 0) + goal) / step) + 2
    squares = [(k * step) ** 2 for k in range(1, count + 1)]
    return step, [(s, mp.exp(s)) for s in squares]


def ln_gamma(eta, fermi_dirac):
    """ln(F(eta) e^-eta): 0 for Boltzmann statistics."""
    return fermi_dirac_ln_gamma(eta, mp.mp.prec) if fermi_dirac else mp.mpf(0)


@lru_cache(maxsize=4096)
def fermi_dirac_ln_gamma(eta, precision):
    """Kept for a while, because both sides of a node within a layer, and most steps of a difference quotient, ask for the same value."""
    if eta < -200:
        return -mp.exp(eta) / mp.sqrt(8)
    step, rule = trapezoid(-4 if eta < -4 else 4 * int(mp.ceil(eta / 4)), precision)
    boltzmann = mp.exp(eta)
    return mp.log(4 * step / mp.sqrt(mp.pi) * mp.fsum(s / (boltzmann + e) for s, e in rule))


def bernoulli(x):
    return x / mp.expm1(x) if x else mp.mpf(1)


class Material:
    """The numbers of one layer, potentials in units of kT/q."""

    def __init__(self, layer, vt, fermi_dirac, eps0):
        def exact(key):
            return None if layer[key] is None else mp.mpf(layer[key])

        self.fermi_dirac = fermi_dirac
        self.nc, self.nv = exact("nc_per_m3"), exact("nv_per_m3")
        self.ln_nc, self.ln_nv = mp.log(self.nc), mp.log(self.nv)
        self.chi, self.gap = exact("affinity_eV") / vt, exact("gap_eV") / vt
        self.eps = exact("relative_permittivity") * eps0
        self.charge = exact("donors_per_m3") - exact("acceptors_per_m3")
        self.mu_n, self.mu_p = exact("electron_mobility_m2_per_Vs"), exact("hole_mobility_m2_per_Vs")
        self.tau_n, self.tau_p = exact("electron_lifetime_s"), exact("hole_lifetime_s")
        self.b, self.c_n, self.c_p = exact("radiative_coefficient_m3_per_s"), exact("electron_auger_m6_per_s"), exact("hole_auger_m6_per_s")
        self.alpha = exact("absorption_per_m")
        self.ni = mp.sqrt(self.nc * self.nv) * mp.exp(-self.gap / 2)

    def side(self, psi, fn, fp):
        """(n, p, W_n, W_p, R) of one side of a node."""
        w_n = psi + self.chi + self.ln_nc + ln_gamma(psi - fn + self.chi, self.fermi_dirac)
        w_p = -(psi + self.chi + self.gap) + self.ln_nv + ln_gamma(fp - psi - self.chi - self.gap, self.fermi_dirac)
        n, p = mp.exp(w_n - fn), mp.exp(w_p + fp)
        kernel = self.b + self.c_n * n + self.c_p * p
        if self.tau_n is not None:
            kernel += 1 / (self.tau_p * (n + self.ni) + self.tau_n * (p + self.ni))
        return n, p, w_n, w_p, -kernel * n * p * mp.expm1(fn - fp)

    def neutral(self):
        """(psi, n, p) where the layer is neutral at equilibrium."""
        def total(psi):
            n, p, *_ = self.side(psi, mp.mpf(0), mp.mpf(0))
            return p - n + self.charge

        low, high = -self.chi - self.gap - 10, -self.chi + 10
        for _ in range(280):
            middle = (low + high) / 2
            low, high = (middle, high) if total(middle) > 0 else (low, middle)
        n, p, *_ = self.side(low, mp.mpf(0), mp.mpf(0))
        return low, n, p


class Equations:
    def __init__(self, problem):
        constants = problem["constants"]
        self.q = mp.mpf(constants["elementary_charge_C"])
        self.vt = mp.mpf(constants["boltzmann_J_per_K"]) * mp.mpf(problem["temperature_K"]) / self.q
        fermi_dirac = problem["statistics"] == "fermi_dirac"
        self.materials = [Material(l, self.vt, fermi_dirac, mp.mpf(constants["vacuum_permittivity_F_per_m"])) for l in problem["layers"]]
        self.x = [mp.mpf(x) for x in problem["nodes_m"]]
        self.cell = [self.materials[k] for k in problem["cell_layer"]]
        self.velocity = [problem["left_recombination_velocity_m_per_s"], problem["right_recombination_velocity_m_per_s"]]
        self.contact = [self.cell[0].neutral(), self.cell[-1].neutral()]
        self.p_side = [c[2] > c[1] for c in self.contact]
        self.generation, flux = [], mp.mpf(problem["photon_flux_per_m2_s"])
        for c, material in enumerate(self.cell):
            left = flux * mp.exp(-material.alpha * (self.x[c + 1] - self.x[c]) / 2)
            right = flux * mp.exp(-material.alpha * (self.x[c + 1] - self.x[c]))
            self.generation.append((flux - left, left - right))
            flux = right

    def edge(self, c, a, b, ua, ub):
        """(D, I_n, I_p) of cell `c` between sides a and b, from the expm1 form."""
        m, h = self.cell[c], self.x[c + 1] - self.x[c]
        i_n = self.q * m.mu_n * self.vt / h * a[0] * bernoulli(a[2] - b[2]) * mp.expm1(ua[1] - ub[1])
        i_p = -self.q * m.mu_p * self.vt / h * a[1] * bernoulli(a[3] - b[3]) * mp.expm1(ub[2] - ua[2])
        return m.eps * self.vt * (ub[0] - ua[0]) / h, i_n, i_p

    def element(self, c, a, b, ua, ub):
        """What the cell adds to the three balances of its left and of its right node."""
        m, volume = self.cell[c], (self.x[c + 1] - self.x[c]) / 2
        d, i_n, i_p = self.edge(c, a, b, ua, ub)
        net = [self.q * (volume * s[4] - g) for s, g in zip((a, b), self.generation[c])]
        left = (d + self.q * volume * (a[1] - a[0] + m.charge), i_n - net[0], i_p + net[0])
        right = (-d + self.q * volume * (b[1] - b[0] + m.charge), -i_n - net[1], -i_p + net[1])
        return left + right

    def sides(self, u):
        return [(m.side(*u[c]), m.side(*u[c + 1])) for c, m in enumerate(self.cell)]

    def boundary(self, which, u, bias):
        """Rows of a contact node: (row number, value) for what is pinned, and what the surface adds to the minority row."""
        node = 0 if which == 0 else -1
        m = self.cell[node]
        psi0, n0, p0 = self.contact[which]
        level = bias / self.vt if self.p_side[which] else mp.mpf(0)
        minority = 1 if self.p_side[which] else 2
        pinned = {0: u[node][0] - psi0 - level, 3 - minority: u[node][3 - minority] - level}
        surface = mp.mpf(0)
        if self.velocity[which] is None:
            pinned[minority] = u[node][minority] - level
        else:
            n, p, *_ = m.side(*u[node])
            velocity = mp.mpf(self.velocity[which])
            surface = -self.q * velocity * (n - n0) if minority == 1 else self.q * velocity * (p - p0)
        return minority, pinned, surface

    def residual(self, u, bias):
        """Rows of all nodes with contacts, and the terminal current."""
        rows = [[mp.mpf(0)] * 3 for _ in u]
        sides = self.sides(u)
        for c, (a, b) in enumerate(sides):
            e = self.element(c, a, b, u[c], u[c + 1])
            for k in range(3):
                rows[c][k] += e[k]
                rows[c + 1][k] += e[k + 3]
        current = self.q * mp.fsum((self.x[c + 1] - self.x[c]) / 2 * (a[4] + b[4]) - sum(self.generation[c]) for c, (a, b) in enumerate(sides))
        for which in (0, 1):
            node = 0 if which == 0 else -1
            minority, pinned, surface = self.boundary(which, u, bias)
            # The minority row without its surface term is the particle current into the contact; it equals q S (n - n0) where that law holds.
            current += rows[node][1] if minority == 1 else -rows[node][2]
            rows[node][minority] += surface
            for k, value in pinned.items():
                rows[node][k] = value
        return rows, current

    def jacobian(self, u, bias):
        """(lower, diagonal, upper): 3x3 blocks per node."""
        count = len(u)
        lower, diagonal, upper = ([[[mp.mpf(0)] * 3 for _ in range(3)] for _ in range(count)] for _ in range(3))
        sides = self.sides(u)
        for c, (a, b) in enumerate(sides):
            base = self.element(c, a, b, u[c], u[c + 1])
            for end in (0, 1):
                for k in range(3):
                    moved = list(u[c + end])
                    moved[k] += STEP
                    side = self.cell[c].side(*moved)
                    e = self.element(c, side, b, moved, u[c + 1]) if end == 0 else self.element(c, a, side, u[c], moved)
                    slope = [(y - z) / STEP for y, z in zip(e, base)]
                    for r in range(3):
                        (diagonal if end == 0 else upper)[c][r][k] += slope[r]
                        (lower if end == 0 else diagonal)[c + 1][r][k] += slope[r + 3]
        for which in (0, 1):
            node = 0 if which == 0 else count - 1
            minority, pinned, surface = self.boundary(which, u, bias)
            for k in range(3):
                moved = list(u)
                moved[node] = list(u[node])
                moved[node][k] += STEP
                diagonal[node][minority][k] += (self.boundary(which, moved, bias)[2] - surface) / STEP
            for r in pinned:
                for k in range(3):
                    diagonal[node][r][k] = mp.mpf(1 if r == k else 0)
                    (upper if which == 0 else lower)[node][r][k] = mp.mpf(0)
        return lower, diagonal, upper

    def newton(self, u, bias, jacobian=None):
        """(state, current, Jacobian used last); with a `jacobian` given, no other is formed."""
        fresh = jacobian is None
        for iteration in range(20):
            rows, _ = self.residual(u, bias)
            if fresh and iteration < 2:  # the start is good to ten digits or more: two Jacobians are enough
                jacobian = self.jacobian(u, bias)
            step = eliminate(*jacobian, [[-v for v in row] for row in rows])
            largest = max(abs(v) for row in step for v in row)
            u = [[a + b for a, b in zip(x, y)] for x, y in zip(u, step)]
            if largest < mp.mpf(10) ** -(DIGITS + 10):
                return u, self.residual(u, bias)[1], jacobian
            if largest > 2:
                break
        raise ArithmeticError(f"the start was too far away, last step {mp.nstr(largest, 5)}")

    def check_forms(self, u):
        """Largest difference between the two forms of the edge currents, over the sum of the difference form's terms."""
        worst = mp.mpf(0)
        for c, (a, b) in enumerate(self.sides(u)):
            m, h = self.cell[c], self.x[c + 1] - self.x[c]
            _, i_n, i_p = self.edge(c, a, b, u[c], u[c + 1])
            for k, mobility, sign, value in ((0, m.mu_n, 1, i_n), (1, m.mu_p, -1, i_p)):
                d, scale = b[k + 2] - a[k + 2], self.q * mobility * self.vt / h
                forward, back = scale * b[k] * bernoulli(d), scale * a[k] * bernoulli(-d)
                worst = max(worst, abs(sign * (forward - back) - value) / (forward + back))
        return worst


def solve3(matrix, columns):
    """Gaussian elimination with pivoting: `matrix` 3x3, `columns` a list of right-hand sides."""
    a = [row[:] + [column[r] for column in columns] for r, row in enumerate(matrix)]
    width = len(a[0])
    for k in range(3):
        best = max(range(k, 3), key=lambda r: abs(a[r][k]) / max(abs(v) for v in a[r][:3]))
        a[k], a[best] = a[best], a[k]
        inverse = 1 / a[k][k]
        a[k] = [v * inverse for v in a[k]]
        for r in range(3):
            if r != k and a[r][k]:
                factor = a[r][k]
                a[r] = [v - factor * w for v, w in zip(a[r], a[k])]
    return [[a[r][c] for r in range(3)] for c in range(3, width)]


def eliminate(lower, diagonal, upper, right):
    """Solves the block tridiagonal system from the left to the right and back."""
    count = len(diagonal)
    carried, moved = [], []
    for i in range(count):
        d, r = [row[:] for row in diagonal[i]], right[i][:]
        if i:
            for a in range(3):
                for b in range(3):
                    d[a][b] -= sum(lower[i][a][k] * carried[-1][b][k] for k in range(3))
                r[a] -= sum(lower[i][a][k] * moved[-1][k] for k in range(3))
        columns = solve3(d, [[upper[i][r_][c] for r_ in range(3)] for c in range(3)] + [r])
        carried.append(columns[:3])
        moved.append(columns[3])
    x = [None] * count
    x[-1] = moved[-1]
    for i in range(count - 2, -1, -1):
        x[i] = [moved[i][r] - sum(carried[i][c][r] * x[i + 1][c] for c in range(3)) for r in range(3)]
    return x


def solve(problem, voltage, start, slopes=False, count=20):
    """The terminal current in A/m2 as a string of `count` digits; `start` is (psi, phi_n, phi_p) in units of kT/q.

    With `slopes`: the current, dJ/dV in S/m2, and -dJ/d(photon flux)/q (the response of the lit device to a little more of the same
    light, None in the dark), from solutions 10^-25 V and 10^-25 of the flux away.
    """
    with mp.workdps(WORKING_DIGITS):
        equations = Equations(problem)
        u = [[mp.mpf(float(v)) for v in node] for node in zip(*start)]
        bias = mp.mpf(voltage)
        u, current, jacobian = equations.newton(u, bias)
        worst = equations.check_forms(u)
        assert worst < mp.mpf(10) ** -60, mp.nstr(worst, 5)
        digits = mp.nstr(current, count, strip_zeros=False)
        if not slopes:
            return digits
        small = mp.mpf(10) ** -25
        conductance = (equations.newton(u, bias + small, jacobian)[1] - current) / small
        response = None
        if problem["photon_flux_per_m2_s"]:
            equations.generation = [(a * (1 + small), b * (1 + small)) for a, b in equations.generation]
            brighter = equations.newton(u, bias, jacobian)[1]
            response = mp.nstr((current - brighter) / small / (equations.q * mp.mpf(problem["photon_flux_per_m2_s"])), count, strip_zeros=False)
        return digits, mp.nstr(conductance, count, strip_zeros=False), response
