"""Numbers that closed forms are checked against, by other means than the closed forms.

`slabs`: share of the incident photons that diffuses out of a field-free slab, D n'' - n/tau + alpha e^(-alpha x) = 0 with
D n' = S n at the surface and n = 0 at the other face, by collocation (scipy.integrate.solve_bvp), 8 digits. `emitter`: light enters at the
surface; `base`: light enters at the face that collects. Lengths in cm.

`parabolic_edge`: 8 pi/(h^3 c^2) int n^2 alpha E^2/(e^(E/kT) - 1) dE, alpha = strength sqrt(E - gap), from the gap to `top`, by quadrature (mpmath), 1/m3s.

Run: python closed_forms.py   (a second)   writes `closed_forms.json`.
"""

import mpmath as mp
import numpy as np
from scipy.integrate import solve_bvp

from constants import C, H, K, Q, write

SLABS = [
    {"absorption_per_cm": 1.2e4, "length_cm": 1e-4, "diffusion_cm2_per_s": 5.0, "velocity_cm_per_s": 1e4, "thickness_cm": 0.5e-4},
    {"absorption_per_cm": 5e4, "length_cm": 0.5e-4, "diffusion_cm2_per_s": 5.0, "velocity_cm_per_s": 1e6, "thickness_cm": 1e-5},
    {"absorption_per_cm": 3e3, "length_cm": 5e-4, "diffusion_cm2_per_s": 100.0, "velocity_cm_per_s": 1e3, "thickness_cm": 3e-4},
]


def collected(slab, lit_surface):
    """The slab is mapped to 0..1 with its surface at 0; n is in units of thickness / D."""
    d = slab["thickness_cm"]
    ad, over, s = slab["absorption_per_cm"] * d, d / slab["length_cm"], slab["velocity_cm_per_s"] * d / slab["diffusion_cm2_per_s"]

    def slopes(x, y):
        deep = x if lit_surface else 1 - x
        return np.vstack((y[1], over**2 * y[0] - ad * np.exp(-ad * deep)))

    x = np.linspace(0, 1, 400)
    solution = solve_bvp(slopes, lambda a, b: np.array([a[1] - s * a[0], b[0]]), x, np.zeros((2, len(x))), tol=1e-12, max_nodes=50000)
    assert solution.success, solution.message
    return float(f"{-solution.y[1, -1]:.10f}")


def parabolic_edge():
    with mp.workdps(25):
        q, k, h, c = mp.mpf(Q), mp.mpf(K), mp.mpf(H), mp.mpf(C)
        kt, gap, top = k * 300 / q, mp.mpf("1.424"), mp.mpf("2.2")
        points = [gap, gap + kt, gap + 5 * kt, gap + 15 * kt, top]
        integral = mp.quad(lambda e: mp.sqrt(e - gap) * e**2 / mp.expm1(e / kt), points)
        rate = 8 * mp.pi / (h**3 * c**2) * mp.mpf("3.5") ** 2 * mp.mpf("3e6") * q**3 * integral
        return {"gap_eV": 1.424, "top_eV": 2.2, "index": 3.5, "strength_per_m_per_sqrt_eV": 3e6, "temperature_K": 300.0, "rate_per_m3_s": mp.nstr(rate, 15)}


def compute():
    slabs = [{**s, "emitter": collected(s, True), "base": collected(s, False)} for s in SLABS]
    return {"about": "Numbers that closed forms are checked against; see closed_forms.py.", "slabs": slabs, "parabolic_edge": parabolic_edge()}


if __name__ == "__main__":
    write("closed_forms.json", compute())
