"""Runs every generator of the reference numbers and compares what it makes with the stored JSON files; exits 1 on a difference.

Whole: fermi_dirac_points, detailed_balance, closed_forms, manufactured, and every current of discrete_cell and dark_diode_50_digits in
double precision. Of what takes minutes, a part: one current of two problems again in 50 digits (every one without --quick, with the
diodes at a few millivolts), one point of each collocation device (with --quick of the
homojunction alone, at a looser tolerance of the collocation), and the
refinement of the discrete equations towards the continuous currents of reference_cases.json (with --quick of one case).

Run: python check_stored.py [--quick] [TABLE.csv]   (--quick: about two minutes of one core; without it a few; the table of ASTM G173-03 is looked for in
the solver's data if not given)
"""

import sys

import mpmath as mp

import closed_forms
import collocation_devices
import dark_diode_50_digits
import detailed_balance
import discrete_cell
import discrete_equations
import fermi_dirac_points
import manufactured
import problems
from constants import HERE, read

FAULTS = []
QUICK_COLLOCATION = (1e-4, 1e-5)


def report(what, worst, bound):
    ok = worst <= bound
    print(f"{'ok   ' if ok else 'WRONG'} {what}: {float(worst):.2e} (bound {bound:.0e})", flush=True)
    if not ok:
        FAULTS.append(what)


def relative(a, b):
    a, b = mp.mpf(a), mp.mpf(b)
    return abs(a - b) / abs(b) if b else abs(a)


def numbers(value, path=""):
    """Every number in a JSON value, with where it stands; strings of digits count as numbers."""
    if isinstance(value, dict):
        for key, item in value.items():
            yield from numbers(item, f"{path}/{key}")
    elif isinstance(value, list):
        for index, item in enumerate(value):
            yield from numbers(item, f"{path}/{index}")
    else:
        try:
            yield path, mp.mpf(value)
        except (TypeError, ValueError):
            yield path, None


def worst_difference(new, stored):
    pairs = list(zip(numbers(new), numbers(stored), strict=True))
    assert all(a[0] == b[0] for a, b in pairs), "the files differ in shape"
    return max(relative(a[1], b[1]) for a, b in pairs if a[1] is not None and not a[0].startswith("/largest_difference"))


def check_tables(table):
    # Twenty digits are stored of the first and ten of the second.
    report("Fermi-Dirac, inverse, Bernoulli, interval flux", worst_difference(fermi_dirac_points.compute(), read("fermi_dirac_points.json")), 1e-18)
    report("detailed balance", worst_difference(detailed_balance.compute(table), read("detailed_balance.json")), 1e-9)


def check_closed_forms():
    # Ten and fifteen digits are stored; the collocation is solved to 1e-12.
    report("slabs and the parabolic edge", worst_difference(closed_forms.compute(), read("closed_forms.json")), 2e-9)


def check_discrete(quick):
    stored = read("discrete_cell.json")["problems"]
    fresh = discrete_cell.compute(with_digits=False)["problems"]
    for name, p in stored.items():
        again = fresh[name]
        assert again["nodes_m"] == p["nodes_m"] and again["layers"] == p["layers"]
        report(f"{name}, double against stored 50 digits", max(relative(a["double"], b["digits"]) for a, b in zip(again["points"], p["points"])), 1e-10)
        point, h = p["points"][2], 1e-4
        device = discrete_cell.Discrete(p)
        voltage, state, _ = device.sweep([point["voltage_V"]])[0]
        slope = (device.newton(state, voltage + h)[1] - device.newton(state, voltage - h)[1]) / (2 * h)
        # A central difference of 0.1 mV errs by (h/Vt)^2 / 6.
        report(f"{name} at {voltage} V, conductance against a central difference", relative(slope, point["conductance_S_per_m2"]), 1e-5)
        if point["response"]:
            currents = []
            for device.light in (1 + h, 1 - h):
                currents.append(device.newton(state, voltage)[1])
            slope = (currents[1] - currents[0]) / (2 * h) / (device.q * p["photon_flux_per_m2_s"])
            report(f"{name} at {voltage} V, response against a central difference", relative(slope, point["response"]), 1e-7)
        parts = p["points"][0]["split_A_per_m2"]
        total = sum(sum(v.values()) if isinstance(v, dict) else v for key, v in parts.items() if key != "generation") - parts["generation"]
        report(f"{name}, the split adds up to the current", relative(total, p["points"][0]["digits"]), 1e-11)
    for name in ("R1",) if quick else ("R1", "window_n_on_p"):
        p, point = stored[name], stored[name]["points"][1]
        voltage, state, _ = discrete_cell.Discrete(p).sweep([point["voltage_V"]])[0]
        report(f"{name} at {voltage} V, 50 digits again", relative(discrete_equations.solve(p, voltage, state), point["digits"]), 1e-18)


def check_dark_diode(quick):
    for name, p in read("dark_diode_50_digits.json")["problems"].items():
        again = problems.wide_gap_diode(*dark_diode_50_digits.VARIANTS[name])
        assert again["nodes_m"] == p["nodes_m"] and again["layers"] == p["layers"]
        sweep = discrete_cell.Discrete(p).sweep([q["voltage_V"] for q in p["points"]])
        # Rounding of quasi-Fermi levels near 40 kT/q limits a double at 1 mV to about 1e-12.
        report(f"{name}, double against stored 50 digits", max(relative(s[2], q["current_density_A_per_m2"]) for s, q in zip(sweep, p["points"])), 1e-10)
        if p["statistics"] == "boltzmann" and not quick:
            voltage, state, _ = sweep[0]
            report(f"{name} at {voltage} V, 50 digits again", relative(discrete_equations.solve(p, voltage, state), p["points"][0]["current_density_A_per_m2"]), 1e-18)


def check_refinement(quick):
    """The discrete equations converge to the continuous currents: two halvings of the stored mesh, extrapolated."""
    cases = (("R3", ((20, 1.1), (80, 1.1), (100, 1.1), (20, 1.1))), ("R1", ((200, 1.03), (300, 1.025))))
    for name, counts in cases[:1] if quick else cases:
        p = problems.reference_case(name, counts)
        stored = read("reference_cases.json")["cases"][name]["results"]
        chosen = [v for v in stored["V"] if v in ((0.7, 1.0) if name == "R1" else (0.0, 0.8, 1.0))]
        raw = []
        for _ in range(3):
            raw.append([c for _, _, c in discrete_cell.Discrete(p).sweep(chosen)])
            x = p["nodes_m"]
            p["nodes_m"] = [v for a, b in zip(x, x[1:]) for v in (a, (a + b) / 2)] + [x[-1]]
            p["cell_layer"] = [k for k in p["cell_layer"] for _ in (0, 1)]
        worst = 0.0
        for a, b, c, v in zip(*raw, chosen):
            first, second = b + (b - a) / 3, c + (c - b) / 3
            worst = max(worst, relative(second + (second - first) / 15, 1e4 * stored["J_reference"][stored["V"].index(v)]))
        report(f"{name} refined towards the continuous currents", worst, 3e-7)


def check_collocation(quick):
    stored = read("collocation_devices.json")["devices"]
    again = (("homojunction_n_on_p", "lit", 0.0), ("heterojunction_with_window", "lit", 0.0))
    if quick:
        print("left out with --quick: collocation of heterojunction_with_window, which takes minutes")
        again = again[:1]
    for name, kind, voltage in again:
        point = next(p for p in stored[name][kind] if p["voltage_V"] == voltage)
        device = read(f"devices/{name}.json")
        tolerances = QUICK_COLLOCATION if quick else None
        fresh = collocation_devices.device_currents(device, kind == "lit", [voltage], lambda text: None, tolerances)[0]
        report(f"{name} by collocation", relative(fresh["current_density_A_per_m2"], point["current_density_A_per_m2"]), 1e-7 if quick else 1e-8)
    # In the dark at 0.2 V recombination sits in a layer of a few nm, which limits the extrapolated finite volumes to about 1e-6.
    for name, device in stored.items():
        rows = device["dark"] + device["lit"]
        report(f"{name}, stored collocation against stored finite volumes", max(abs(r["relative_difference_of_the_two"]) for r in rows), 3e-6)


def check_manufactured():
    stored, again = read("manufactured.json"), manufactured.compute()
    report("imposed fields", worst_difference(again["points"], stored["points"]), 1e-17)
    # Stored to three digits, so a last digit may fall either way.
    report("errors on the five meshes", worst_difference(again["meshes"], stored["meshes"]), 1e-2)
    report("orders of accuracy, distance from 2 on the last halving", max(abs(v - 2) for v in again["orders"][-1].values()), 0.05)


if __name__ == "__main__":
    mp.mp.dps = 30  # strings of 20 digits are read in full
    arguments = sys.argv[1:]
    quick = "--quick" in arguments
    tables = [a for a in arguments if a != "--quick"]
    if tables:
        table = tables[0]
    else:
        found = sorted((HERE.parent.parent / "solver" / "src").glob("**/astm_g173_03.csv"))
        if not found:
            sys.exit("the table of ASTM G173-03 was not found; give its path")
        table = found[0]
    check_tables(table)
    check_closed_forms()
    check_manufactured()
    check_discrete(quick)
    check_dark_diode(quick)
    check_refinement(quick)
    check_collocation(quick)
    sys.exit(1 if FAULTS else 0)
