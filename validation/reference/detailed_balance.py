"""Detailed-balance limit of a single junction under the global standard spectrum, for a list of gaps.

Step absorptance at the gap, one electron-hole pair per absorbed photon, radiative recombination alone:

    Jsc = q * integral of E(wavelength) wavelength / (h c)  from 280 nm to h c / gap
    J0  = q * sides * 2 pi / (h^3 c^2) * integral from the gap of E^2 / (e^(E/kT) - 1) dE
    J   = Jsc - J0 (e^(qV/kT) - 1)

The tabulated irradiance is joined by straight lines and E(wavelength) * wavelength integrated exactly. `sides` is 1 for a perfect
mirror at the rear and 2 for emission from both faces into vacuum. Efficiency divides by 1000 W/m2 (`efficiency`) and, beside it,
by the table's own integral (`efficiency_by_table_integral`). Temperature 298.15 K; the second list is for 300 K.

Run: python detailed_balance.py TABLE.csv   (the table of ASTM G173-03: wavelength in nm, irradiance in W/m2/nm, columns by name)
The table belongs to the solver's data; a second's work. Writes `detailed_balance.json`.
"""

import sys

import mpmath as mp

from constants import C, H, K, Q, write

GAPS = ["0.66", "0.74", "1.00", "1.12", "1.34", "1.42", "1.424", "1.60", "1.81"]
DIGITS = 30


def spectrum(path, column="am15g"):
    """Wavelengths (nm) and irradiance (W/m2/nm) as exact decimals."""
    names, rows = None, []
    for line in open(path, encoding="utf-8"):
        line = line.strip()
        if not line or line.startswith("#"):
            continue
        fields = line.split(",")
        if names is None:
            names = [f.strip() for f in fields]
            continue
        rows.append((mp.mpf(fields[names.index("wavelength_nm")]), mp.mpf(fields[names.index(column)])))
    return rows


def integrals(rows, end):
    """(integral of irradiance, integral of irradiance * wavelength) up to `end` nm, exact for straight lines between the points."""
    power, weighted = mp.mpf(0), mp.mpf(0)
    for (x0, y0), (x1, y1) in zip(rows, rows[1:]):
        if x0 >= end:
            break
        if x1 > end:
            y1 = y0 + (y1 - y0) * (end - x0) / (x1 - x0)
            x1 = end
        power += (x1 - x0) * (y0 + y1) / 2
        # Simpson's rule is exact for the quadratic E * wavelength.
        weighted += (x1 - x0) * (x0 * y0 + (x0 + x1) * (y0 + y1) + x1 * y1) / 6
    return power, weighted


def limit(rows, gap, temperature, sides):
    q, k, h, c = mp.mpf(Q), mp.mpf(K), mp.mpf(H), mp.mpf(C)
    vt = k * temperature / q
    edge = h * c / (q * gap) * mp.mpf(10) ** 9
    jsc = q * integrals(rows, edge)[1] * mp.mpf(10) ** -9 / (h * c)
    # integral of u^2 / (e^u - 1) from u0 = sum over m of e^(-m u0) (u0^2/m + 2 u0/m^2 + 2/m^3)
    u0 = gap / vt
    planck = mp.mpf(0)
    for m in range(1, 40):
        planck += mp.exp(-m * u0) * (u0**2 / m + 2 * u0 / m**2 + mp.mpf(2) / m**3)
    j0 = q * sides * 2 * mp.pi / (h**3 * c**2) * (k * temperature) ** 3 * planck
    voc = vt * mp.log1p(jsc / j0)
    # d(JV)/dV = 0: Jsc + J0 = J0 e^v (1 + v)
    v = mp.lambertw(mp.e * (1 + jsc / j0)).real - 1
    vm = v * vt
    jm = jsc - j0 * mp.expm1(v)
    power = vm * jm
    return {
        "jsc_mA_per_cm2": jsc / 10, "j0_mA_per_cm2": j0 / 10, "voc_V": voc, "vmp_V": vm, "jmp_mA_per_cm2": jm / 10,
        "fill_factor": power / (jsc * voc), "efficiency": power / 1000,
    }


def compute(path):
    with mp.workdps(DIGITS):
        return compute_in_present_precision(path)


def compute_in_present_precision(path):
    rows = spectrum(path)
    total = integrals(rows, rows[-1][0])[0]
    result = {
        "about": "Detailed-balance limits under ASTM G173-03 global; see detailed_balance.py for the law used.",
        "table": {"points": len(rows), "first_nm": float(rows[0][0]), "last_nm": float(rows[-1][0]), "integral_W_per_m2": mp.nstr(total, 12)},
        "input_power_W_per_m2": 1000.0,
        "rows": [], "rows_300K": [],
    }
    for temperature, key in (("298.15", "rows"), ("300", "rows_300K")):
        for gap in GAPS:
            for sides in (1, 2):
                row = limit(rows, mp.mpf(gap), mp.mpf(temperature), sides)
                row["efficiency_by_table_integral"] = row["efficiency"] * 1000 / total
                result[key].append({"gap_eV": float(gap), "temperature_K": float(temperature), "sides": sides, **{k: float(mp.nstr(v, 10)) for k, v in row.items()}})
    best = []
    for sides in (1, 2):
        gaps = [mp.mpf(k) / 1000 for k in range(1300, 1401)]
        best.append(max((limit(rows, g, mp.mpf("298.15"), sides)["efficiency"], g) for g in gaps))
    result["best"] = [{"sides": s, "gap_eV": float(g), "efficiency": float(mp.nstr(e, 10)), "temperature_K": 298.15} for s, (e, g) in zip((1, 2), best)]
    return result


if __name__ == "__main__":
    if len(sys.argv) != 2:
        sys.exit(__doc__)
    write("detailed_balance.json", compute(sys.argv[1]))
