"""The discrete equations of a 1.9 eV diode in the dark at 1 to 50 mV, solved in 50-digit arithmetic on a fixed coarse mesh.

Near zero bias such a diode carries 1e-27 A/cm2 (radiative recombination alone), twenty-odd orders below the currents that
cancel within it. The solutions here are exact for the given nodes, so they test how a solver in double precision evaluates its
current, and nothing else. Four variants: with Shockley-Read-Hall recombination or radiative alone, each with one of the two
statistics and with an infinite or a finite recombination velocity at both contacts.

Writes `dark_diode_50_digits.json`: everything that is needed to build the same discrete problem, and J in A/m2 to 20 digits at each
voltage. All numbers, voltages too, mean the nearest double.

Run: python dark_diode_50_digits.py   (some three minutes)
"""

import discrete_equations
import problems
from constants import write
from discrete_cell import Discrete

VOLTAGES = [0.001, 0.002, 0.005, 0.010, 0.020, 0.050]
VARIANTS = {
    "recombination_centres_boltzmann": ("boltzmann", True, None),
    "recombination_centres_fermi_dirac": ("fermi_dirac", True, 1e4),
    "radiative_boltzmann": ("boltzmann", False, 1e4),
    "radiative_fermi_dirac": ("fermi_dirac", False, None),
}


def compute(names=tuple(VARIANTS), voltages=tuple(VOLTAGES)):
    result = {
        "about": "Exact currents of the discrete equations of README.md on a fixed mesh; A/m2, forward positive; p side on the left.",
        "tool": f"mpmath, {discrete_equations.WORKING_DIGITS} digits carried, {discrete_equations.DIGITS} asked for, 20 kept",
        "problems": {},
    }
    for name in names:
        p = problems.wide_gap_diode(*VARIANTS[name])
        p["points"] = []
        for voltage, state, current in Discrete(p).sweep(voltages):
            digits = discrete_equations.solve(p, voltage, state)
            p["points"].append({"voltage_V": voltage, "current_density_A_per_m2": digits, "double": current})
        result["problems"][name] = p
    return result


if __name__ == "__main__":
    write("dark_diode_50_digits.json", compute())
