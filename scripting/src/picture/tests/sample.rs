//! Snapshots made from formulas of a few lines, one for each kind of chart, so that no change of the solver moves a drawing.

use epiloom_solver::math::elementary::{exp, exp_m1, log10, pow, sin};

use crate::archive::*;
use crate::picture::charts::{Columns, Numbers};

/// The thermal voltage of the samples, V.
pub const THERMAL: f64 = 0.025;

fn begin(name: &str, kind: &str, light: &str) -> Snapshot {
    let layer = |name: &str, thickness: f64, unit: &str, doping: &str| Layer {
        name: name.to_string(),
        material: "GaAs".to_string(),
        thickness: Value::number(thickness, unit),
        doping: doping.to_string(),
        settings: Vec::new(),
    };
    Snapshot {
        label: Label { name: name.to_string(), kind: kind.to_string(), ..Label::default() },
        conditions: vec![
            Condition::new("light", Value::text(light)),
            Condition::new("temperature", Value::number(298.15, "K")),
        ],
        stack: Stack {
            name: "Larch Bay 12".to_string(),
            layers: vec![
                layer("window", 30.0, "nm", "donors 2e18 cm^-3"),
                layer("emitter", 120.0, "nm", "donors 2e18 cm^-3"),
                layer("base", 2.5, "um", "acceptors 1e17 cm^-3"),
            ],
            settings: vec![Condition::new("lit from", Value::text("front"))],
        },
        ..Snapshot::default()
    }
}

fn column(name: &str, unit: &str, values: Vec<f64>) -> Column {
    Column::new(name, unit, values)
}

/// J = -29 + 1e-12 (exp(V / 2 / 0.025) - 1) on 0 to 1.2 V.
pub fn light(name: &str, photocurrent: f64) -> Snapshot {
    let voltage: Vec<f64> = (0..=60).map(|k| f64::from(k) / 50.0).collect();
    let current: Vec<f64> =
        voltage.iter().map(|v| 1e-9 * exp_m1(v / (1.6 * THERMAL)) - photocurrent).collect();
    let power: Vec<f64> = voltage.iter().zip(&current).map(|(v, j)| -v * j).collect();
    let best = (0..power.len()).max_by(|a, b| power[*a].total_cmp(&power[*b])).unwrap_or(0);
    let figure = |name: &str, value: f64, unit: &str| Figure {
        name: name.to_string(),
        value: Some(value),
        error: Some(1e-5),
        unit: unit.to_string(),
        ..Figure::default()
    };
    let mut snapshot = begin(name, "light J-V", "AM1.5G");
    snapshot.figures = vec![
        figure("jsc", photocurrent, "mA_per_cm2"),
        figure("max_power", power[best], "mW_per_cm2"),
        figure("mpp_voltage", voltage[best], "V"),
        figure("mpp_current_density", -current[best], "mA_per_cm2"),
    ];
    snapshot.tables = vec![Table::new(
        "points",
        vec![
            column("voltage_V", "V", voltage),
            column("extrapolated_current_density_mA_per_cm2", "mA_per_cm2", current),
            column("delivered_power_mW_per_cm2", "mW_per_cm2", power),
        ],
    )];
    snapshot
}

/// C = 60 nF/cm2 / sqrt(1 - V / 1.2 V) on -3 to 0.6 V, and from 0.2 V on what is stored in forward bias.
pub fn capacitance() -> Snapshot {
    let voltage: Vec<f64> = (-30..=6).map(|k| f64::from(k) / 10.0).collect();
    let stored = |v: f64| if v > 0.2 { 2.0 * exp_m1((v - 0.2) / 0.15) } else { 0.0 };
    let values: Vec<f64> = voltage.iter().map(|v| 60.0 * pow(1.0 - v / 1.2, -0.5) + stored(*v)).collect();
    let inverse = values.iter().map(|c| 1.0 / (c * c)).collect();
    let mut snapshot = begin("C-V", "C-V", "dark");
    snapshot.tables = vec![Table::new(
        "capacitance",
        vec![
            column("voltage_V", "V", voltage),
            column("capacitance_nF_per_cm2", "nF_per_cm2", values),
            column("inverse_square_capacitance_cm4_per_nF2", "cm4_per_nF2", inverse),
        ],
    )];
    snapshot
}

/// A dark curve down to 1e-25 mA/cm2 with an ideality that goes from 2 to 1, and reverse bias.
pub fn dark() -> Snapshot {
    let voltage: Vec<f64> = (-10..=50).map(|k| f64::from(k) / 50.0).collect();
    let current: Vec<f64> =
        voltage.iter().map(|v| 1e-25 * exp_m1(v / (0.5 * THERMAL)) + 1e-24 * exp_m1(v / THERMAL)).collect();
    let ideality =
        voltage.iter().map(|v| if *v < 0.075 { f64::NAN } else { 1.0 + exp(-(v - 0.075) / 0.3) }).collect();
    let mut snapshot = begin("dark J-V", "dark J-V", "dark");
    snapshot.tables = vec![Table::new(
        "points",
        vec![
            column("voltage_V", "V", voltage),
            column("extrapolated_current_density_mA_per_cm2", "mA_per_cm2", current),
            column("local_ideality", "", ideality),
        ],
    )];
    snapshot
}

/// Three layers that absorb one after the other, a reflectance that waves, 4 % shading.
pub fn response() -> Snapshot {
    let wavelength: Vec<f64> = (0..=60).map(|k| 300.0 + 10.0 * f64::from(k)).collect();
    let each = |f: &dyn Fn(f64) -> f64| -> Vec<f64> { wavelength.iter().map(|w| f(*w)).collect() };
    let shaded = 0.04;
    let reflected = |w: f64| (1.0 - shaded) * (0.06 + 0.04 * sin(w / 60.0));
    let enters = |w: f64| 1.0 - shaded - reflected(w);
    let step = |w: f64, edge: f64, width: f64| 1.0 / (1.0 + exp((w - edge) / width));
    let window = |w: f64| enters(w) * 0.8 * step(w, 360.0, 30.0);
    let emitter = |w: f64| (enters(w) - window(w)) * 0.7 * step(w, 550.0, 80.0);
    let base = |w: f64| (enters(w) - window(w) - emitter(w)) * step(w, 870.0, 6.0);
    let external = |w: f64| 0.3 * window(w) + 0.93 * emitter(w) + 0.98 * base(w);
    let mut snapshot = begin("response", "spectral response", "dark");
    snapshot.tables = vec![Table::new(
        "response",
        vec![
            column("wavelength_nm", "nm", wavelength.clone()),
            column("eqe", "", each(&external)),
            column("error", "", each(&|_| 1e-6)),
            column("iqe", "", each(&|w| external(w) / enters(w))),
            column("absorbed in window", "", each(&window)),
            column("absorbed in emitter", "", each(&emitter)),
            column("absorbed in base", "", each(&base)),
            column("shaded_share", "", each(&|_| shaded)),
            column("reflected_share", "", each(&reflected)),
            column("coating_share", "", each(&|_| 0.0)),
        ],
    )];
    snapshot
}

/// Profiles of a junction at 0.15 um; with `thick`, a base of 180 um.
pub fn profiles(thick: bool) -> Snapshot {
    let end = if thick { 180.0 } else { 2.65 };
    let (mut depth, mut layer) = (Vec::new(), Vec::new());
    for (index, (from, to)) in [(0.0, 0.03), (0.03, 0.15), (0.15, end)].into_iter().enumerate() {
        for k in 0..=40 {
            depth.push(from + (to - from) * f64::from(k) / 40.0);
            layer.push(index as f64);
        }
    }
    let each = |f: &dyn Fn(f64, f64) -> f64| -> Vec<f64> {
        depth.iter().zip(&layer).map(|(x, l)| f(*x, *l)).collect()
    };
    let bend = |x: f64| 1.2 / (1.0 + exp(-(x - 0.18) / 0.02));
    let step = |l: f64| if l == 0.0 { 0.3 } else { 0.0 };
    let rate = |scale: f64, length: f64| {
        move |x: f64, l: f64| scale * exp(-x / length) * if l == 0.0 { 0.1 } else { 1.0 }
    };
    let mut snapshot = begin("bands at 0.9 V", "bias point", "AM1.5G");
    snapshot.conditions.push(Condition::new("voltage", Value::number(0.9, "V")));
    snapshot.tables = vec![Table::new(
        "profiles",
        vec![
            column("depth_um", "um", depth.clone()),
            column("layer", "", layer.clone()),
            column("conduction_band_eV", "eV", each(&|x, l| bend(x) - 0.1 + step(l))),
            column("valence_band_eV", "eV", each(&|x, l| bend(x) - 1.52 - step(l))),
            column("electron_level_eV", "eV", each(&|_, _| 0.0)),
            column("hole_level_eV", "eV", each(&|_, _| -0.9)),
            column("electrons_per_cm3", "per_cm3", each(&|x, _| 2e18 * exp(-bend(x) / THERMAL))),
            column("holes_per_cm3", "per_cm3", each(&|x, _| 1e17 * exp((bend(x) - 1.2) / THERMAL))),
            column("field_V_per_cm", "V_per_cm", each(&|x, _| 2e5 * exp(-pow((x - 0.18) / 0.03, 2.0)))),
            column("shockley_read_hall_per_cm3_s", "per_cm3_s", each(&rate(1e18, 5.0))),
            column("radiative_per_cm3_s", "per_cm3_s", each(&rate(3e17, 2.0))),
            column("auger_per_cm3_s", "per_cm3_s", each(&rate(1e2, 0.5))),
            column("generation_per_cm3_s", "per_cm3_s", each(&rate(1e22, 0.6))),
        ],
    )];
    snapshot.ledgers = ledgers();
    snapshot
}

fn ledgers() -> Vec<Ledger> {
    let line = |group: &str, label: &str, value: f64, note: &str| LedgerLine {
        group: group.to_string(),
        label: label.to_string(),
        value: Some(value),
        note: note.to_string(),
        ..LedgerLine::default()
    };
    let ledger = |title: &str, lines: Vec<LedgerLine>| Ledger { title: title.to_string(), lines };
    let small = (0..12).map(|k| line(&format!("layer {k}"), "Auger", 1e-4 * f64::from(k), ""));
    let mut carriers = vec![
        line("emitter", "generation", 11.0, "comes in"),
        line("base", "generation", 19.0, "comes in"),
        line("base", "Shockley-Read-Hall", 1.5, ""),
        line("base", "radiative", 0.5, ""),
        line("front contact", "surface recombination", 0.9934, ""),
    ];
    carriers.extend(small);
    carriers.push(line("", "extracted", 27.0, ""));
    carriers.push(line("", "terminal current minus edge current", 1e-14, "allowed: 2.9e-8 mA/cm2"));
    vec![
        ledger(
            "photons",
            vec![
                line("", "incident", 40.0, "comes in"),
                line("", "reflected", 3.0, ""),
                line("emitter", "absorbed", 11.0, ""),
                line("base", "absorbed", 19.0, ""),
                line("", "transmitted", 7.0, ""),
                line("", "unaccounted share", 2e-16, ""),
            ],
        ),
        ledger("carriers", carriers),
        ledger(
            "free energy",
            vec![
                line("base", "free energy generated", 30.0, "comes in"),
                line("base", "Shockley-Read-Hall", 4.0, ""),
                line("emitter", "hole transport", 2.0, ""),
                line("", "delivered to the terminals", 24.0, ""),
                line("", "unaccounted", 1e-14, "allowed: 6.1e-11 mW/cm2"),
            ],
        ),
        ledger(
            "photon energy",
            vec![
                line("", "incident", 100.0, "comes in"),
                line("", "reflected", 8.0, ""),
                line("base", "absorbed", 70.0, ""),
                line("", "transmitted", 22.0, ""),
                line("", "of it above the gap, to heat", 20.0, ""),
                line("", "of it gap less splitting", 20.0, ""),
                line("", "of it free energy generated", 30.0, ""),
            ],
        ),
    ]
}

/// Efficiency over thickness (9 values, equal ratios) and composition (7 values), with a hole.
pub fn sweep() -> Columns {
    let (mut thickness, mut composition, mut efficiency, mut voltage) = (vec![], vec![], vec![], vec![]);
    for k in 0..9 {
        for m in 0..7 {
            let (t, x) = (10.0 * pow(2.0, f64::from(k)), 0.05 * f64::from(m));
            thickness.push(t);
            composition.push(x);
            let hill = 26.0 - 1.5 * pow(log10(t / 300.0), 2.0) - 60.0 * pow(x - 0.18, 2.0);
            efficiency.push(if (k, m) == (8, 6) { f64::NAN } else { hill });
            voltage.push(1.0 + 0.1 * x + 0.01 * log10(t));
        }
    }
    let rows = efficiency.len();
    let column = |name: &str, unit: &str, values, varied| Numbers {
        name: name.to_string(),
        unit: unit.to_string(),
        values,
        error: if varied { Vec::new() } else { vec![1e-4; rows] },
        varied,
        ..Numbers::default()
    };
    Columns {
        columns: vec![
            column("bsf_thickness", "nm", thickness, true),
            column("x", "", composition, true),
            column("efficiency", "", efficiency, false),
            column("voc", "V", voltage, false),
        ],
        notes: Vec::new(),
        conditions: "grid of bsf_thickness (9) by x (7)".to_string(),
    }
}

/// 400 points of one output from a fixed sequence.
pub fn yields() -> Columns {
    let mut state = 7_u64;
    let mut random = || {
        state = state.wrapping_mul(6364136223846793005).wrapping_add(1442695040888963407);
        (state >> 11) as f64 / (1_u64 << 53) as f64
    };
    let values = (0..400).map(|_| 25.0 + (0..6).map(|_| random()).sum::<f64>() / 3.0).collect();
    let number =
        |name: &str, values, varied| Numbers { name: name.to_string(), values, varied, ..Numbers::default() };
    Columns {
        columns: vec![
            number("draw", (0..400).map(f64::from).collect(), true),
            number("efficiency", values, false),
        ],
        ..Columns::default()
    }
}
