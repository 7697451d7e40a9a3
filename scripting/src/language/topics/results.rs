//! What comes back: figures of merit, points, profiles, ledgers, and what is stored of them.

use epiloom_solver::analysis::{self, BiasPoint, LedgerLine, LedgerPart, SpectralResponse};
use rhai::{Array, Dynamic, Map};

use crate::archive::Snapshot;
use crate::diagnostics::codes;
use crate::language::dimension::Dimension;
use crate::language::fault::{Fault, Place};
use crate::language::point;
use crate::language::quantity::Quantity;
use crate::language::result_value::{
    CapacitanceValue, CurveValue, FIGURES, ResponseValue, Solved, StateValue, figure, outcome,
};
use crate::language::snapshot;
use crate::language::table::{Extent, TableValue};
use crate::language::value::{Unknown, give, take, text};
use crate::language::vocabulary::{
    Answer, Call, function, getter, index_getter, method, topic, unknown_property,
};

topic! {
    "Results and storing",
    "Every figure of merit is solved for, carries its numerical error, and is `()` where it does not exist, with the reason in \
     `.reason(\"name\")`. Nothing is in the archive but what `store` puts there.";

    Property "jsc" of "J-V curve" {
        forms: ["jv.jsc", "jv.voc", "jv.ff", "jv.efficiency", "jv.max_power"],
        doc: "Figures of merit, quantities with their numerical error: short-circuit current density (positive), open-circuit voltage, \
              fill factor, efficiency (shares, printed in percent), maximum power. `()` where one does not exist.",
        example: "let gaas = material(\"GaAs\", #{ electron_lifetime: 20.ns, hole_lifetime: 20.ns });\nlet cell = stack(\"diode\", [layer(\"emitter\", gaas, 100.nm, donors(2e18.per_cm3)), layer(\"base\", gaas, 2.um, acceptors(1e17.per_cm3))]);\nlet jv = cell.jv(spectrum(\"AM1.5G\"));\nprint(`${jv.jsc} ${jv.voc} ${jv.ff} ${jv.efficiency} ${jv.max_power}`);",
        register: |engine, session| {
            // each word is its own property, so that the body need not know which was asked for
            getter::<CurveValue>(engine, session, "jsc", |_, a| Ok(named(a[0], "jsc")?));
            getter::<CurveValue>(engine, session, "voc", |_, a| Ok(named(a[0], "voc")?));
            getter::<CurveValue>(engine, session, "ff", |_, a| Ok(named(a[0], "ff")?));
            getter::<CurveValue>(engine, session, "efficiency", |_, a| Ok(named(a[0], "efficiency")?));
            getter::<CurveValue>(engine, session, "max_power", |_, a| Ok(named(a[0], "max_power")?));
            index_getter::<CurveValue>(engine, session, |_, arguments| {
                let name = text(arguments[1], "a property")?;
                let known = ["jsc", "voc", "ff", "efficiency", "max_power", "mpp", "points", "stopped"];
                Err(unknown_property("J-V curve", &name).candidates(&name, known).into())
            });
        },
    }
    Property "mpp" of "J-V curve" {
        forms: ["jv.mpp.voltage", "jv.mpp.current_density", "jv.mpp.power"],
        doc: "The maximum power point: terminal voltage, current density delivered (positive) and power.",
        example: "let gaas = material(\"GaAs\", #{ electron_lifetime: 20.ns, hole_lifetime: 20.ns });\nlet cell = stack(\"diode\", [layer(\"emitter\", gaas, 100.nm, donors(2e18.per_cm3)), layer(\"base\", gaas, 2.um, acceptors(1e17.per_cm3))]);\nprint(cell.jv(spectrum(\"AM1.5G\")).mpp.voltage);",
        register: |engine, session| {
            getter::<CurveValue>(engine, session, "mpp", |_, arguments| {
                let mut map = Map::new();
                map.insert("voltage".into(), named(arguments[0], "mpp_voltage")?);
                map.insert("current_density".into(), named(arguments[0], "mpp_current_density")?);
                map.insert("power".into(), named(arguments[0], "max_power")?);
                Ok(map.into())
            });
        },
    }
    Property "points" of "J-V curve" {
        forms: ["jv.points"],
        doc: "Its points, maps with `voltage`, `current_density` (negative for photocurrent; the finest mesh's own value), \
              `extrapolated` (the current density extrapolated over the meshes, with its error), `junction_voltage` and `conductance` (dJ/dV).",
        example: "let gaas = material(\"GaAs\", #{ electron_lifetime: 20.ns, hole_lifetime: 20.ns });\nlet cell = stack(\"diode\", [layer(\"emitter\", gaas, 100.nm, donors(2e18.per_cm3)), layer(\"base\", gaas, 2.um, acceptors(1e17.per_cm3))]);\nfor p in cell.jv(dark(), [0.3.V, 0.6.V]).points { print(`${p.voltage}  ${p.current_density}`); }",
        register: |engine, session| {
            getter::<CurveValue>(engine, session, "points", |_, arguments| {
                let curve: CurveValue = take(arguments[0], "the curve", "a J-V curve")?;
                Ok(match &curve.0.result {
                    None => Dynamic::from(Unknown),
                    Some(result) => result.points.iter().map(point_map).collect::<Array>().into(),
                })
            });
        },
    }
    Property "stopped" of "J-V curve" {
        forms: ["jv.stopped"],
        doc: "Why the curve stopped before its last voltage; `()` for a whole curve.",
        example: "let gaas = material(\"GaAs\", #{ electron_lifetime: 20.ns, hole_lifetime: 20.ns });\nlet cell = stack(\"diode\", [layer(\"emitter\", gaas, 100.nm, donors(2e18.per_cm3)), layer(\"base\", gaas, 2.um, acceptors(1e17.per_cm3))]);\nif cell.jv(dark(), [0.V, 0.5.V]).stopped != () { print(\"cut short\"); }",
        register: |engine, session| {
            getter::<CurveValue>(engine, session, "stopped", |_, arguments| {
                let curve: CurveValue = take(arguments[0], "the curve", "a J-V curve")?;
                let stopped = curve.0.result.as_ref().and_then(|r| r.stopped.clone());
                Ok(stopped.map_or(Dynamic::UNIT, Dynamic::from))
            });
        },
    }
    Method "reason" of "J-V curve" {
        forms: ["jv.reason(\"voc\")"],
        doc: "Why a figure of merit does not exist; `()` if it does.",
        example: "let gaas = material(\"GaAs\", #{ electron_lifetime: 20.ns, hole_lifetime: 20.ns });\nlet bar = stack(\"bar\", [layer(\"bar\", gaas, 1.um, donors(1e17.per_cm3))]);\nprint(bar.jv(dark(), [0.V, 0.1.V]).reason(\"voc\"));",
        register: |engine, session| {
            method::<CurveValue>(engine, session, "reason", 1..=1, |_, arguments| {
                let curve: CurveValue = take(arguments[0], "the curve", "a J-V curve")?;
                let name = text(arguments[1], "the name of a figure of merit").map_err(|f| f.at(Place::Argument(0)))?;
                let Some(row) = FIGURES.iter().find(|row| row.0 == name || (name == "mpp" && row.0 == "mpp_voltage")) else {
                    let known: Vec<&str> = FIGURES.iter().map(|row| row.0).collect();
                    return Err(Fault::new(codes::WRONG_CHOICE, format!("no figure of merit is called \"{name}\""))
                        .candidates(&name, known.iter().copied())
                        .at(Place::Argument(0))
                        .into());
                };
                let reason = curve.0.result.as_ref().and_then(|r| row.3(r).as_ref().err().map(|absent| absent.reason.clone()));
                Ok(reason.map_or(Dynamic::UNIT, Dynamic::from))
            });
        },
    }
    Property "points" of "C-V curve" {
        forms: ["cv.points"],
        doc: "Its points, maps with `voltage`, `capacitance` (as the frequency goes to zero) and `stored` (the derivative of the stored \
              charge), both per area with their numerical error, and `conductance` (dJ/dV).",
        example: "let gaas = material(\"GaAs\", #{ electron_lifetime: 20.ns, hole_lifetime: 20.ns });\nlet cell = stack(\"diode\", [layer(\"emitter\", gaas, 100.nm, donors(2e18.per_cm3)), layer(\"base\", gaas, 2.um, acceptors(1e17.per_cm3))]);\nfor p in cell.capacitance(dark(), -3.V, 0.V, 1.V).points { print(`${p.voltage} ${1.0 / (p.capacitance * p.capacitance)}`); }",
        register: |engine, session| {
            getter::<CapacitanceValue>(engine, session, "points", |_, arguments| {
                let curve: CapacitanceValue = take(arguments[0], "the curve", "a C-V curve")?;
                Ok(match &curve.0.result {
                    None => Dynamic::from(Unknown),
                    Some(result) => result.points.iter().map(capacitance_point).collect::<Array>().into(),
                })
            });
            index_getter::<CapacitanceValue>(engine, session, |_, arguments| {
                let name = text(arguments[1], "a property")?;
                Err(unknown_property("C-V curve", &name).candidates(&name, ["points"]).into())
            });
        },
    }
    Property "voltage" of "bias point" {
        forms: ["point.voltage", "point.junction_voltage", "point.current_density", "point.conductance"],
        doc: "Terminal voltage; voltage inside the series resistance; terminal current density, positive for forward diode \
              current, extrapolated with its error; dJ/dV.",
        example: "let gaas = material(\"GaAs\", #{ electron_lifetime: 20.ns, hole_lifetime: 20.ns });\nlet cell = stack(\"diode\", [layer(\"emitter\", gaas, 100.nm, donors(2e18.per_cm3)), layer(\"base\", gaas, 2.um, acceptors(1e17.per_cm3))]);\nlet point = cell.at(0.5.V, dark());\nprint(`${point.voltage} ${point.junction_voltage} ${point.current_density} ${point.conductance}`);",
        register: |engine, session| {
            getter::<StateValue>(engine, session, "voltage", |_, a| of_state(a[0], Dimension::VOLTAGE, |s| Quantity::si(s.voltage, Dimension::VOLTAGE)));
            getter::<StateValue>(engine, session, "junction_voltage", |_, a| of_state(a[0], Dimension::VOLTAGE, |s| Quantity::si(s.junction_voltage, Dimension::VOLTAGE)));
            getter::<StateValue>(engine, session, "current_density", |_, a| {
                of_state(a[0], Dimension::CURRENT_DENSITY, |s| figure(&s.current_density, Dimension::CURRENT_DENSITY, "mA_per_cm2"))
            });
            getter::<StateValue>(engine, session, "conductance", |_, a| of_state(a[0], Dimension::AREA_CONDUCTANCE, |s| Quantity::si(s.conductance, Dimension::AREA_CONDUCTANCE).with_error(s.conductance_error)));
            index_getter::<StateValue>(engine, session, |_, arguments| {
                let name = text(arguments[1], "a property")?;
                let known = ["voltage", "junction_voltage", "current_density", "conductance", "profiles", "ledger", "sheet_resistance", "barriers", "interfaces"];
                Err(unknown_property("bias point", &name).candidates(&name, known).into())
            });
        },
    }
    Property "profiles" of "bias point" {
        forms: ["point.profiles"],
        doc: "A map of arrays against depth, the finest mesh's own values: `depth`, `layer`, `potential`, `conduction_band`, \
              `valence_band`, `electron_level`, `hole_level`, `electrons`, `holes`, `field`, `electron_current`, `hole_current`, \
              `shockley_read_hall`, `radiative`, `auger`, `generation`, `collection`; where a layer has defects or dopants ionised in part also \
              `defects` (their recombination) and `fixed_charge`. An interface stands twice, once with each side's material.",
        example: "let gaas = material(\"GaAs\", #{ electron_lifetime: 20.ns, hole_lifetime: 20.ns });\nlet cell = stack(\"diode\", [layer(\"emitter\", gaas, 100.nm, donors(2e18.per_cm3)), layer(\"base\", gaas, 2.um, acceptors(1e17.per_cm3))]);\nlet p = cell.equilibrium().profiles;\nprint(`${p.depth[0]} ${p.electrons[0]}`);",
        register: |engine, session| {
            getter::<StateValue>(engine, session, "profiles", |_, arguments| {
                let state: StateValue = take(arguments[0], "the bias point", "a bias point")?;
                Ok(state.0.result.as_ref().map_or(Dynamic::from(Unknown), |s| profiles(&state.0, s).into()))
            });
        },
    }
    Property "ledger" of "bias point" {
        forms: ["point.ledger"],
        doc: "The account of photons, carriers and energy: an array of maps with `account` (\"photons\", \"carriers\", \"free energy\", \
              \"photon energy\"), `place` (a layer, contact or interface; empty for the whole), `channel`, `value` (a current density \
              or a power per area), `share` (of what came in) and `source` (true for what comes in). Values are those of the finest mesh, with which \
              the account closes; lines of \"carriers\" have `extrapolated` beside them, with its error.",
        example: "let gaas = material(\"GaAs\", #{ electron_lifetime: 20.ns, hole_lifetime: 20.ns });\nlet cell = stack(\"diode\", [layer(\"emitter\", gaas, 100.nm, donors(2e18.per_cm3)), layer(\"base\", gaas, 2.um, acceptors(1e17.per_cm3))]);\nfor line in cell.at(0.9.V, dark()).ledger { print(`${line.place} ${line.channel} ${line.value}`); }",
        register: |engine, session| {
            getter::<StateValue>(engine, session, "ledger", |_, arguments| {
                let state: StateValue = take(arguments[0], "the bias point", "a bias point")?;
                Ok(state.0.result.as_ref().map_or(Dynamic::from(Unknown), |s| ledger(s).into()))
            });
        },
    }
    Method "total" of "bias point" {
        forms: ["point.total(\"carriers\", \"Auger\")", "point.total(\"carriers\", \"Auger\", \"base\")"],
        doc: "Sum over all places of one channel of an account of the ledger, or what it is at one place: a layer, \"front contact\", \
              \"rear contact\", or an interface, \"window / emitter\".",
        example: "let gaas = material(\"GaAs\", #{ electron_lifetime: 20.ns, hole_lifetime: 20.ns });\nlet cell = stack(\"diode\", [layer(\"emitter\", gaas, 100.nm, donors(2e18.per_cm3)), layer(\"base\", gaas, 2.um, acceptors(1e17.per_cm3))]);\nlet point = cell.at(0.9.V, dark());\nprint(point.total(\"carriers\", \"Auger\") / point.total(\"carriers\", \"radiative\"));",
        register: |engine, session| {
            method::<StateValue>(engine, session, "total", 2..=3, total);
        },
    }
    Property "sheet_resistance" of "bias point" {
        forms: ["point.sheet_resistance[\"layer\"]"],
        doc: "Sheet resistance of each layer by its majority carriers at this bias, a map by layer.",
        example: "let gaas = material(\"GaAs\", #{ electron_lifetime: 20.ns, hole_lifetime: 20.ns });\nlet cell = stack(\"diode\", [layer(\"emitter\", gaas, 100.nm, donors(2e18.per_cm3)), layer(\"base\", gaas, 2.um, acceptors(1e17.per_cm3))]);\nprint(cell.equilibrium().sheet_resistance[\"base\"]);",
        register: |engine, session| {
            getter::<StateValue>(engine, session, "sheet_resistance", |_, arguments| {
                let state: StateValue = take(arguments[0], "the bias point", "a bias point")?;
                let Some(result) = &state.0.result else { return Ok(Dynamic::from(Unknown)) };
                let mut map = Map::new();
                for (layer, value) in state.0.stack.layers.iter().zip(&result.sheet_resistance) {
                    map.insert(layer.name.as_str().into(), give(Quantity::si(*value, Dimension::RESISTANCE)));
                }
                Ok(map.into())
            });
        },
    }
    Property "barriers" of "bias point" {
        forms: ["point.barriers"],
        doc: "The steps of the band edges at each interface: an array of maps with `front`, `rear` (the two layers), `electrons` and `holes`, \
              energies that the carrier must climb on its way to the rear.",
        example: "let gaas = material(\"GaAs\", #{ electron_lifetime: 20.ns, hole_lifetime: 20.ns });\nlet cell = stack(\"diode\", [layer(\"emitter\", gaas, 100.nm, donors(2e18.per_cm3)), layer(\"base\", gaas, 2.um, acceptors(1e17.per_cm3))]);\nprint(cell.equilibrium().barriers[0].electrons);",
        register: |engine, session| {
            getter::<StateValue>(engine, session, "barriers", |_, arguments| {
                let state: StateValue = take(arguments[0], "the bias point", "a bias point")?;
                let Some(result) = &state.0.result else { return Ok(Dynamic::from(Unknown)) };
                let pairs = state.0.stack.layers.windows(2).zip(&result.barriers);
                Ok(pairs
                    .map(|(pair, (electrons, holes))| {
                        let mut map = Map::new();
                        map.insert("front".into(), pair[0].name.clone().into());
                        map.insert("rear".into(), pair[1].name.clone().into());
                        map.insert("electrons".into(), give(Quantity::si(*electrons, Dimension::ENERGY)));
                        map.insert("holes".into(), give(Quantity::si(*holes, Dimension::ENERGY)));
                        Dynamic::from(map)
                    })
                    .collect::<Array>()
                    .into())
            });
        },
    }
    Property "interfaces" of "bias point" {
        forms: ["point.interfaces"],
        doc: "What each interface does: an array of maps with `front`, `rear` (the two layers), `seen_from_front` and `seen_from_rear`, the \
              effective recombination velocity that the minority carriers of either layer meet there: their flux into the plane of the \
              interface over their excess, the density less that in balance with the majority (`()` in equilibrium, negative where the interface injects); \
              `electron_jump` and `hole_jump`, rises of the quasi-Fermi levels on the way to the rear; `charge`; `occupancy` of the \
              level by electrons (`()` where it does not see both sides).",
        example: "let gaas = material(\"GaAs\", #{ electron_lifetime: 20.ns, hole_lifetime: 20.ns });\nlet wide = material(\"AlGaAs\", #{ x: 0.3, electron_lifetime: 1.ns, hole_lifetime: 1.ns });\nlet cell = stack(\"diode\", [layer(\"emitter\", gaas, 100.nm, donors(2e18.per_cm3)), layer(\"base\", gaas, 2.um, acceptors(1e17.per_cm3)), interface(#{ transport: \"thermionic\" }), layer(\"barrier\", wide, 50.nm, acceptors(1e18.per_cm3))]);\nlet between = cell.at(0.9.V, dark()).interfaces[1];\nprint(`${between.front} / ${between.rear}: ${between.seen_from_front}`);",
        register: |engine, session| {
            getter::<StateValue>(engine, session, "interfaces", |_, arguments| {
                let state: StateValue = take(arguments[0], "the bias point", "a bias point")?;
                let Some(result) = &state.0.result else { return Ok(Dynamic::from(Unknown)) };
                let pairs = state.0.stack.layers.windows(2).zip(&result.interfaces);
                Ok(pairs.map(|(pair, found)| interface_map(&pair[0].name, &pair[1].name, found)).collect::<Array>().into())
            });
        },
    }
    Property "points" of "spectral response" {
        forms: ["response.points"],
        doc: "Its points, maps with `wavelength`, `eqe` (with its error), `iqe` and `reflectance`.",
        example: "let gaas = material(\"GaAs\", #{ electron_lifetime: 20.ns, hole_lifetime: 20.ns });\nlet cell = stack(\"diode\", [layer(\"emitter\", gaas, 100.nm, donors(2e18.per_cm3)), layer(\"base\", gaas, 2.um, acceptors(1e17.per_cm3))]);\nfor p in cell.eqe([500.nm, 700.nm]).points { print(`${p.wavelength} ${p.eqe} ${p.iqe}`); }",
        register: |engine, session| {
            getter::<ResponseValue>(engine, session, "points", |_, arguments| {
                let response: ResponseValue = take(arguments[0], "the response", "a spectral response")?;
                Ok(response.0.result.as_ref().map_or(Dynamic::from(Unknown), |r| response_points(r).into()))
            });
            index_getter::<ResponseValue>(engine, session, |_, arguments| {
                Err(unknown_property("spectral response", &text(arguments[1], "a property")?).into())
            });
        },
    }
    Function "store" {
        forms: ["store(\"name\", result)"],
        doc: "Stores a result in the archive, with all it stands on: a curve, a bias point, a spectral response, a map of figures \
              (`#{ efficiency: jv.efficiency }`) or a table (an array of such maps). Each name once.",
        example: "let gaas = material(\"GaAs\", #{ electron_lifetime: 20.ns, hole_lifetime: 20.ns });\nlet cell = stack(\"diode\", [layer(\"emitter\", gaas, 100.nm, donors(2e18.per_cm3)), layer(\"base\", gaas, 2.um, acceptors(1e17.per_cm3))]);\nstore(\"dark J-V\", cell.jv(dark(), 0.V, 0.8.V, 0.2.V));",
        register: |engine, session| {
            function(engine, session, "store", 2..=2, store);
        },
    }
}

/// An interface at a bias point.
fn interface_map(front: &str, rear: &str, found: &analysis::InterfaceState) -> Dynamic {
    let mut map = Map::new();
    map.insert("front".into(), front.into());
    map.insert("rear".into(), rear.into());
    for (key, velocity) in ["seen_from_front", "seen_from_rear"].into_iter().zip(found.seen_from) {
        let velocity = velocity.map_or(Dynamic::UNIT, |v| give(Quantity::si(v, Dimension::VELOCITY)));
        map.insert(key.into(), velocity);
    }
    map.insert("electron_jump".into(), give(Quantity::si(found.electron_jump, Dimension::ENERGY)));
    map.insert("hole_jump".into(), give(Quantity::si(found.hole_jump, Dimension::ENERGY)));
    map.insert("charge".into(), give(Quantity::si(found.charge, Dimension::CHARGE_DENSITY)));
    let occupancy = found.occupancy.map_or(Dynamic::UNIT, |f| give(Quantity::number(f)));
    map.insert("occupancy".into(), occupancy);
    map.into()
}

/// A figure of merit of a curve by its word.
fn named(value: &Dynamic, name: &str) -> Result<Dynamic, Fault> {
    let curve: CurveValue = take(value, "the curve", "a J-V curve")?;
    let Some((_, dimension, unit, of)) = FIGURES.iter().find(|row| row.0 == name) else {
        return Ok(Dynamic::UNIT);
    };
    Ok(outcome(curve.0.result.as_ref().map(of), *dimension, unit))
}

fn of_state(value: &Dynamic, dimension: Dimension, f: fn(&BiasPoint) -> Quantity) -> Answer {
    let state: StateValue = take(value, "the bias point", "a bias point")?;
    Ok(give(state.0.result.as_ref().map_or_else(|| Quantity::unsolved(dimension), f)))
}

fn point_map(point: &analysis::JvPoint) -> Dynamic {
    let mut map = Map::new();
    let current = |v: f64| Quantity::si(v, Dimension::CURRENT_DENSITY);
    map.insert("voltage".into(), give(Quantity::si(point.voltage, Dimension::VOLTAGE)));
    map.insert("junction_voltage".into(), give(Quantity::si(point.junction_voltage, Dimension::VOLTAGE)));
    map.insert("current_density".into(), give(current(point.current_density)));
    map.insert(
        "extrapolated".into(),
        give(figure(&point.extrapolated, Dimension::CURRENT_DENSITY, "mA_per_cm2")),
    );
    let slope = Quantity::si(point.conductance, Dimension::AREA_CONDUCTANCE);
    map.insert("conductance".into(), give(slope.with_error(point.conductance_error)));
    Dynamic::from(map)
}

fn capacitance_point(point: &analysis::CapacitancePoint) -> Dynamic {
    let mut map = Map::new();
    map.insert("voltage".into(), give(Quantity::si(point.voltage, Dimension::VOLTAGE)));
    let dimension = Dimension::CAPACITANCE_DENSITY;
    map.insert("capacitance".into(), give(figure(&point.capacitance, dimension, "nF_per_cm2")));
    map.insert("stored".into(), give(figure(&point.stored, dimension, "nF_per_cm2")));
    map.insert("conductance".into(), give(Quantity::si(point.conductance, Dimension::AREA_CONDUCTANCE)));
    map.into()
}

fn response_points(response: &SpectralResponse) -> Array {
    (0..response.wavelength.len())
        .map(|i| {
            let mut map = Map::new();
            map.insert("wavelength".into(), give(Quantity::si(response.wavelength[i], Dimension::LENGTH)));
            map.insert(
                "eqe".into(),
                give(Quantity::number(response.external[i]).with_error(response.error[i])),
            );
            map.insert("iqe".into(), give(Quantity::number(response.internal[i])));
            map.insert("reflectance".into(), give(Quantity::number(response.reflectance[i])));
            Dynamic::from(map)
        })
        .collect()
}

fn profiles(solved: &Solved<BiasPoint>, state: &BiasPoint) -> Map {
    let mut map = Map::new();
    for (name, values, dimension, _) in snapshot::profile_columns(&state.profiles) {
        let column: Array = values.iter().map(|v| give(Quantity::si(*v, dimension))).collect();
        map.insert(name.into(), column.into());
    }
    let names = state
        .profiles
        .layer
        .iter()
        .map(|i| solved.stack.layers.get(*i).map_or(Dynamic::UNIT, |l| l.name.clone().into()));
    map.insert("layer".into(), names.collect::<Array>().into());
    map
}

/// The word for an account of the ledger.
pub fn account(part: LedgerPart) -> &'static str {
    match part {
        LedgerPart::Photons => "photons",
        LedgerPart::Carriers => "carriers",
        LedgerPart::FreeEnergy => "free energy",
        LedgerPart::PhotonEnergy => "photon energy",
    }
}

/// The dimension of the values of an account.
pub fn account_dimension(part: LedgerPart) -> Dimension {
    match part {
        LedgerPart::Photons | LedgerPart::Carriers => Dimension::CURRENT_DENSITY,
        LedgerPart::FreeEnergy | LedgerPart::PhotonEnergy => Dimension::POWER_DENSITY,
    }
}

/// What came in, by account: the sum that shares are of.
pub fn income(state: &BiasPoint, part: LedgerPart) -> f64 {
    state.ledger.lines.iter().filter(|l| l.part == part && l.source).map(|l| l.value).sum()
}

fn ledger(state: &BiasPoint) -> Array {
    // The carriers' lines have figures beside them, extrapolated over the meshes.
    let mut figures = state.carrier_figures.iter();
    state
        .ledger
        .lines
        .iter()
        .map(|line| {
            let mut map = Map::new();
            map.insert("account".into(), account(line.part).into());
            map.insert("place".into(), line.place.clone().into());
            map.insert("channel".into(), line.channel.clone().into());
            map.insert("value".into(), give(Quantity::si(line.value, account_dimension(line.part))));
            let figure = if line.part == LedgerPart::Carriers { figures.next() } else { None };
            let extrapolated = figure.map_or(Dynamic::UNIT, |f| {
                give(Quantity::si(f.value, account_dimension(line.part)).with_error(f.error))
            });
            map.insert("extrapolated".into(), extrapolated);
            let income = income(state, line.part);
            let share = if income == 0.0 {
                Dynamic::UNIT
            } else {
                give(Quantity::number(line.value / income).shown_in("percent"))
            };
            map.insert("share".into(), share);
            map.insert("source".into(), line.source.into());
            Dynamic::from(map)
        })
        .collect()
}

fn total(_: &Call, arguments: &mut [&mut Dynamic]) -> Answer {
    let state: StateValue = take(arguments[0], "the bias point", "a bias point")?;
    let wanted = text(arguments[1], "the account").map_err(|f| f.at(Place::Argument(0)))?;
    let channel = text(arguments[2], "the channel").map_err(|f| f.at(Place::Argument(1)))?;
    let parts = [LedgerPart::Photons, LedgerPart::Carriers, LedgerPart::FreeEnergy, LedgerPart::PhotonEnergy];
    let Some(part) = parts.into_iter().find(|part| account(*part) == wanted) else {
        return Err(Fault::new(codes::WRONG_CHOICE, format!("the ledger has no account \"{wanted}\""))
            .candidates(&wanted, parts.map(account))
            .at(Place::Argument(0))
            .into());
    };
    let Some(result) = &state.0.result else {
        return Ok(give(Quantity::unsolved(account_dimension(part))));
    };
    let mut known: Vec<&str> =
        result.ledger.lines.iter().filter(|l| l.part == part).map(|l| l.channel.as_str()).collect();
    known.dedup();
    if !known.contains(&channel.as_str()) {
        return Err(Fault::new(
            codes::WRONG_CHOICE,
            format!("the account of {wanted} has no channel \"{channel}\""),
        )
        .candidates(&channel, known.iter().copied())
        .at(Place::Argument(1))
        .into());
    }
    let place = arguments
        .get(3)
        .map(|given| text(given, "the place"))
        .transpose()
        .map_err(|f| f.at(Place::Argument(2)))?;
    let places = || result.ledger.lines.iter().filter(|l| l.part == part && l.channel == channel);
    if let Some(place) = &place
        && !places().any(|l| l.place == *place)
    {
        let message = format!("{channel} of {wanted} has no line at \"{place}\"");
        return Err(Fault::new(codes::WRONG_CHOICE, message)
            .candidates(place, places().map(|l| l.place.as_str()).filter(|name| !name.is_empty()))
            .at(Place::Argument(2))
            .into());
    }
    let counts =
        |l: &LedgerLine| l.channel == channel && place.as_ref().is_none_or(|place| l.place == *place);
    let sum: f64 = places().filter(|l| counts(l)).map(|l| l.value).sum();
    let figures: Vec<_> = result
        .ledger
        .lines
        .iter()
        .filter(|l| l.part == LedgerPart::Carriers)
        .zip(&result.carrier_figures)
        .filter(|(l, _)| part == LedgerPart::Carriers && counts(l))
        .map(|(_, f)| f)
        .collect();
    if figures.is_empty() {
        return Ok(give(Quantity::si(sum, account_dimension(part))));
    }
    // carriers are extrapolated line by line, so their sum has an error
    let value = figures.iter().map(|f| f.value).sum();
    let error = figures.iter().map(|f| f.error).sum();
    Ok(give(Quantity::si(value, account_dimension(part)).with_error(error)))
}

fn store(call: &Call, arguments: &mut [&mut Dynamic]) -> Answer {
    let name = text(arguments[0], "the name of a snapshot").map_err(|f| f.at(Place::Argument(0)))?;
    let session = call.session;
    if name.trim().is_empty() {
        return Err(Fault::new(codes::WRONG_CHOICE, "a snapshot needs a name").at(Place::Argument(0)).into());
    }
    let twice = || {
        Fault::new(codes::SNAPSHOT_TWICE, format!("two snapshots are called `{name}`"))
            .help("put what changes into the name: store(`window ${t}`, ..)")
            .at(Place::Argument(0))
    };
    // in a point of a sweep the name is the point's own, and stands behind the sweep's and the point's
    let inside = point::with(|p| (p.names.insert(name.clone()), p.step, p.index, p.prefix.clone()));
    let (new, step, index, prefix) = match inside {
        Some(inside) => inside,
        None => {
            let mut state = session.state();
            let new = state.snapshots.insert(name.clone(), call.position).is_none();
            state.step += u64::from(new);
            (new, state.step.saturating_sub(1), 0, String::new())
        }
    };
    if !new {
        return Err(twice().into());
    }
    let name = format!("{prefix}{name}");
    let built = snapshot_of(&name, step, arguments[1]).map_err(|f| f.at(Place::Argument(1)))?;
    let built = built.filter(|_| !session.checking());
    let Some(mut built) = built else { return Ok(Dynamic::UNIT) };
    built.label.order.point = index;
    let mut built = Some(built);
    if point::with(|p| p.snapshots.extend(built.take())).is_some() {
        return Ok(Dynamic::UNIT);
    }
    // a part holds its share of the plans; what the script stores itself comes when the parts are gathered
    if session.options.part.is_none()
        && let Some(built) = built
    {
        session.store(built)?;
    }
    Ok(Dynamic::UNIT)
}

/// What a script hands over to be stored or drawn, as a snapshot; none where it is not solved yet.
///
/// # Errors
/// What is no result, and what is wrong with a table.
pub fn snapshot_of(name: &str, step: u64, value: &Dynamic) -> Result<Option<Snapshot>, Fault> {
    if let Some(curve) = value.read_lock::<CurveValue>() {
        return Ok(curve.0.result.as_ref().map(|result| snapshot::curve(name, step, &curve.0, result)));
    }
    if let Some(state) = value.read_lock::<StateValue>() {
        return Ok(state.0.result.as_ref().map(|result| snapshot::state(name, step, &state.0, result)));
    }
    if let Some(response) = value.read_lock::<ResponseValue>() {
        return Ok(response
            .0
            .result
            .as_ref()
            .map(|result| snapshot::response(name, step, &response.0, result)));
    }
    if let Some(table) = value.read_lock::<TableValue>() {
        return Ok((table.0.extent == Extent::Whole).then(|| table.0.snapshot(name, "table", step)));
    }
    if let Some(curve) = value.read_lock::<CapacitanceValue>() {
        return Ok(curve.0.result.as_ref().map(|result| snapshot::capacitance(name, step, &curve.0, result)));
    }
    if value.is_array() || value.is_map() {
        return snapshot::figures(name, step, value).map(Some);
    }
    let wanted = "a result (`cell.jv(..)`, `cell.at(..)`, `cell.eqe(..)`, `cell.capacitance(..)`), a map of figures or an array of such maps";
    take::<CurveValue>(value, "what is stored or drawn", wanted).map(|_| None)
}

/// Whether a value is a result of an analysis or a table: something that a picture shows as a whole.
pub fn is_result(value: &Dynamic) -> bool {
    value.is::<CurveValue>()
        || value.is::<StateValue>()
        || value.is::<ResponseValue>()
        || value.is::<CapacitanceValue>()
        || value.is::<TableValue>()
}

/// The name of the stack that was solved.
pub fn stack_name(value: &Dynamic) -> Option<String> {
    if let Some(curve) = value.read_lock::<CurveValue>() {
        return Some(curve.0.stack.name.clone());
    }
    if let Some(state) = value.read_lock::<StateValue>() {
        return Some(state.0.stack.name.clone());
    }
    if let Some(response) = value.read_lock::<ResponseValue>() {
        return Some(response.0.stack.name.clone());
    }
    value.read_lock::<CapacitanceValue>().map(|curve| curve.0.stack.name.clone())
}
