"""The devices and fixed meshes on which the discrete equations are solved, as plain dictionaries that JSON can hold.

Every number is meant as the nearest double; lengths in m, densities in 1/m3, everything SI but energies, which are in eV.
A lifetime of None switches Shockley-Read-Hall recombination off, a recombination velocity of None means an infinite one.
"""

from constants import EPS0, K, Q, read


def graded(thickness, cells, ratio):
    """Widths of `cells` intervals that grow by `ratio` from both ends of a layer to its middle."""
    weights = [ratio ** min(k, cells - 1 - k) for k in range(cells)]
    return [thickness * w / sum(weights) for w in weights]


def mesh(layers, counts):
    """Node positions, rounded to 0.1 pm so that the file shows them in full, and the layer of each cell."""
    nodes, cell_layer, start = [0.0], [], 0.0
    for number, (layer, (cells, ratio)) in enumerate(zip(layers, counts)):
        x = start
        for width in graded(layer["thickness_m"], cells, ratio):
            x += width
            nodes.append(round(x * 1e13) / 1e13)
            cell_layer.append(number)
        start = round((start + layer["thickness_m"]) * 1e13) / 1e13
        nodes[-1] = start
    return nodes, cell_layer


def problem(title, statistics, temperature, layers, velocities, photon_flux, counts):
    nodes, cell_layer = mesh(layers, counts)
    return {
        "title": title,
        "statistics": statistics,
        "temperature_K": temperature,
        "constants": {"elementary_charge_C": float(Q), "boltzmann_J_per_K": float(K), "vacuum_permittivity_F_per_m": float(EPS0)},
        "layers": layers,
        "left_recombination_velocity_m_per_s": velocities[0],
        "right_recombination_velocity_m_per_s": velocities[1],
        "photon_flux_per_m2_s": photon_flux,
        "nodes_m": nodes,
        "cell_layer": cell_layer,
    }


def si(value, power):
    """value * 10^power without the last-digit noise of a binary product."""
    return float(f"{value * 10.0**power:.13g}")


def layer(name, thickness_m, donors, acceptors, gap, affinity, permittivity, nc, nv, mu_n, mu_p, tau_n, tau_p, b, c_n, c_p, alpha):
    """One layer from values in the trade's units (1/cm3, cm2/Vs, s, cm3/s, cm6/s, 1/cm)."""
    return {
        "name": name,
        "thickness_m": thickness_m,
        "donors_per_m3": si(donors, 6),
        "acceptors_per_m3": si(acceptors, 6),
        "gap_eV": gap,
        "affinity_eV": affinity,
        "relative_permittivity": permittivity,
        "nc_per_m3": si(nc, 6),
        "nv_per_m3": si(nv, 6),
        "electron_mobility_m2_per_Vs": si(mu_n, -4),
        "hole_mobility_m2_per_Vs": si(mu_p, -4),
        "electron_lifetime_s": tau_n,
        "hole_lifetime_s": tau_p,
        "radiative_coefficient_m3_per_s": si(b, -6),
        "electron_auger_m6_per_s": si(c_n, -12),
        "hole_auger_m6_per_s": si(c_p, -12),
        "absorption_per_m": si(alpha, 2),
    }


def reference_case(name, counts):
    """Case R1 or R3 of `reference_cases.json` on a fixed mesh."""
    case = read("reference_cases.json")["cases"][name]
    light = case.get("generation", {"alpha": 0.0, "Phi": 0.0})
    layers = [
        layer(
            c["name"], si(c["thickness_um"], -6), c["Nd"], c["Na"], c["Eg"], c["chi"], c["eps_r"], c["Nc"], c["Nv"], c["mu_n"], c["mu_p"],
            c["tau_n"], c["tau_p"], c["B"], c["Cn"], c["Cp"], light["alpha"] if c.get("absorbs") else 0.0,
        )
        for c in case["layers"]
    ]
    # Only the minority carrier's velocity acts, and each contact of these cases gives both the same.
    velocities = [si(case["contacts"][side]["S_n"], -2) for side in ("left", "right")]
    statistics = {"FD": "fermi_dirac", "Boltzmann": "boltzmann"}[case["statistics"]]
    return problem(case["title"], statistics, 300.0, layers, velocities, si(light["Phi"], 4), counts)


def layers_of(device):
    """The layers of one of the files in `devices/`, in SI."""
    return [
        layer(
            l["name"], si(l["thickness_um"], -6), l["donors_per_cm3"], l["acceptors_per_cm3"], l["gap_eV"], l["affinity_eV"], l["permittivity"],
            l["nc_per_cm3"], l["nv_per_cm3"], l["electron_mobility_cm2_per_Vs"], l["hole_mobility_cm2_per_Vs"], si(l["electron_lifetime_ns"], -9),
            si(l["hole_lifetime_ns"], -9), l["radiative_coefficient_cm3_per_s"], l["electron_auger_cm6_per_s"], l["hole_auger_cm6_per_s"], l["absorption_per_cm"],
        )
        for l in device["layers"]
    ]


def device_file(name, counts):
    """One of the files in `devices/` with its light on, on a fixed mesh."""
    device = read(f"devices/{name}.json")
    velocities = [si(device[f"{side}_recombination_velocity_cm_per_s"], -2) for side in ("front", "rear")]
    flux = si(device["photon_flux_per_cm2_s"], 4)
    return problem(device["title"], device["statistics"], device["temperature_K"], layers_of(device), velocities, flux, counts)


def wide_gap_diode(statistics, shockley_read_hall, velocity):
    """A homojunction of 1.9 eV in the dark, p on n."""
    lifetimes = (2e-9, 5e-9) if shockley_read_hall else (None, None)
    common = (1.9, 4.0, 11.8, 6.5e17, 1.4e19, 1500.0, 60.0, *lifetimes, 1e-10, 0.0, 0.0, 0.0)
    layers = [layer("p side", 0.3e-6, 0.0, 2e18, *common), layer("n side", 1.2e-6, 1e17, 0.0, *common)]
    title = f"1.9 eV diode, {'Shockley-Read-Hall and radiative' if shockley_read_hall else 'radiative alone'}"
    return problem(title, statistics, 300.0, layers, (velocity, velocity), 0.0, ((30, 1.22), (44, 1.16)))
