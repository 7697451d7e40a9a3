//! From what the solver refuses or cannot do to faults in the words, units and places of scripts.

use epiloom_solver::analysis::AnalysisError;
use epiloom_solver::device::{Fault as DeviceFault, Place as DevicePlace};
use epiloom_solver::optics::OpticsError;

use crate::diagnostics::{Code, codes};

use super::device_value::StackValue;
use super::dimension::Dimension;
use super::fault::{Fault, Place};
use super::quantity::Quantity;
use super::topics::{material_fault, range};

/// What stops an analysis, in the words of scripts.
pub fn analysis_fault(error: &AnalysisError) -> Fault {
    match error {
        AnalysisError::NotConverged { voltage, last_good_voltage, stage, update, .. } => {
            let code = if update.is_nan() {
                codes::SINGULAR
            } else if stage.contains("equilibrium") {
                codes::NO_EQUILIBRIUM
            } else {
                codes::NOT_CONVERGED
            };
            let fault = Fault::new(code, error.to_string());
            match last_good_voltage {
                Some(good) => fault.note(format!("solved up to {good:.4} V; {voltage:.4} V was aimed at")),
                None => fault.help("check lifetimes, mobilities and dopings for a slip in a power of ten"),
            }
        }
        AnalysisError::Stopped => {
            Fault::new(codes::INTERRUPTED, "the run was interrupted").label("stopped here, while solving")
        }
        AnalysisError::Optics(OpticsError::NoOpticalData { .. }) => {
            Fault::new(codes::NO_OPTICAL_DATA, error.to_string())
                .help("give the layer `absorption` or `optical_constants`, or take it out of the optics: optics: \"inert\"")
        }
        AnalysisError::BadRequest { .. } => Fault::new(codes::VOLTAGES, error.to_string()),
        other => Fault::new(codes::STACK, other.to_string()),
    }
}

/// A fault of the whole device, at the layer it is about, in the words and units of scripts.
pub fn device_fault(fault: &DeviceFault, stack: &StackValue) -> Fault {
    let layer_at = |name: &str, inner: Place| match stack.places.get(name) {
        Some((line, column)) => Place::Elsewhere(*line, *column, Box::new(inner)),
        None => Place::Call,
    };
    match fault {
        DeviceFault::NoLayers => {
            Fault::new(codes::NO_LAYERS, format!("stack `{}` has no layers", stack.stack.name))
        }
        DeviceFault::DuplicateLayer { layer } => {
            Fault::new(codes::LAYER_NAME_TWICE, format!("two layers are called `{layer}`"))
                .at(layer_at(layer, Place::Argument(0)))
        }
        DeviceFault::ZeroThickness { layer } => Fault::new(
            codes::THICKNESS_NOT_POSITIVE,
            format!("thickness of layer `{layer}` must be positive"),
        )
        .label("this is 0 nm")
        .help("leave the layer out of the stack when it is not there")
        .at(layer_at(layer, Place::Argument(2))),
        DeviceFault::OutOfRange { place, quantity, value, low, high, .. } => {
            let (code, dimension) = limits_of(quantity);
            let shown = |v: f64| Quantity::si(v, dimension).to_string();
            let words = quantity.replace('_', " ");
            let at = match place {
                DevicePlace::Layer(name) => {
                    let inner = match *quantity {
                        "thickness" => Place::Argument(2),
                        "donors" | "acceptors" => Place::Argument(3),
                        key => Place::Option(key.to_string()),
                    };
                    layer_at(name, inner)
                }
                DevicePlace::Defect(name, _) => layer_at(name, Place::Option("defects".to_string())),
                DevicePlace::Interface(front, _) => layer_at(front, Place::Argument(0)),
                _ => Place::Call,
            };
            Fault::new(
                code,
                format!("{words} of {place} must be {}", range(&shown(*low), *low, &shown(*high), *high)),
            )
            .label(format!("this is {}", shown(*value)))
            .at(at)
        }
        DeviceFault::Material { layer, error } => {
            let fault = material_fault(error);
            let inner = match &fault.place {
                Place::Option(key) => Place::Option(key.clone()),
                _ => Place::Argument(1),
            };
            let mut fault = fault.at(layer_at(layer, inner));
            fault.message = format!("layer `{layer}`: {}", fault.message);
            fault
        }
        DeviceFault::DuplicateDefect { layer, .. } => Fault::new(codes::DEFECT, fault.to_string())
            .at(layer_at(layer, Place::Option("defects".to_string()))),
        DeviceFault::GradedCompound { layer, material } => Fault::new(
            codes::COMPOSITION,
            format!("layer `{layer}` grades the composition of `{material}`, which is no alloy"),
        )
        .at(layer_at(layer, Place::Option("x".to_string()))),
        DeviceFault::Table { place, .. } => {
            let at = match place {
                DevicePlace::Layer(name) => layer_at(name, Place::Argument(3)),
                _ => Place::Call,
            };
            Fault::new(codes::PROFILE, fault.to_string()).at(at)
        }
        DeviceFault::BlockingContact { place } => {
            Fault::new(codes::BARRIER, format!("{place} passes neither electrons nor holes"))
                .label("both its velocities are zero")
                .help("give one carrier a velocity above zero, or leave it out: then it passes without limit")
        }
        DeviceFault::IdleStates { place: DevicePlace::Interface(front, _) } => {
            Fault::new(codes::MISSING_OPTION, fault.to_string())
                .help("give recombination_velocity beside states: capture cross-section times thermal velocity times states")
                .at(layer_at(front, Place::Argument(0)))
        }
        other => Fault::new(codes::STACK, other.to_string()),
    }
}

/// The code and dimension of a quantity that a device refuses.
fn limits_of(quantity: &str) -> (Code, Dimension) {
    match quantity {
        "thickness" => (codes::THICKNESS_NOT_POSITIVE, Dimension::LENGTH),
        "donors" | "acceptors" => (codes::DOPING_NEGATIVE, Dimension::DENSITY),
        "temperature" => (codes::TEMPERATURE, Dimension::TEMPERATURE),
        "series_resistance" | "shunt_resistance" => (codes::RESISTANCE, Dimension::AREA_RESISTANCE),
        "saturation_current_density" => (codes::DIODE, Dimension::CURRENT_DENSITY),
        "ideality" => (codes::DIODE, Dimension::NONE),
        "energy" | "width" => (codes::DEFECT, Dimension::ENERGY),
        "density" => (codes::DEFECT, Dimension::DENSITY),
        q if q.ends_with("cross_section") => (codes::DEFECT, Dimension::AREA),
        "accuracy" => (codes::ACCURACY, Dimension::NONE),
        "x" | "composition" => (codes::COMPOSITION, Dimension::NONE),
        "electron_barrier" | "hole_barrier" | "work_function" => (codes::BARRIER, Dimension::ENERGY),
        "sheet_charge" | "states" => (codes::STACK, Dimension::AREAL_DENSITY),
        "conduction_offset" | "valence_offset" => (codes::STACK, Dimension::ENERGY),
        q if q.ends_with("velocity") => (codes::VELOCITY, Dimension::VELOCITY),
        q if q.ends_with("reflectance") || q.ends_with("shading") => (codes::SHARE, Dimension::NONE),
        _ => (codes::STACK, Dimension::NONE),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Source of truth: the catalogue's three ways of not getting a solution.
    #[test]
    fn a_failed_solution_names_its_kind() {
        let failed = |stage: &'static str, update: f64, last_good_voltage: Option<f64>| {
            analysis_fault(&AnalysisError::NotConverged {
                equation: "electron continuity",
                layer: "base".to_string(),
                depth_nm: 12.0,
                stage,
                voltage: 1.2,
                update,
                last_good_voltage,
            })
        };
        let fault = failed("at bias", 3.0, Some(1.1)); // ~ E300
        assert_eq!(fault.code, codes::NOT_CONVERGED);
        assert!(fault.message.contains("`base`") && fault.notes[0].contains("1.1000 V"), "{fault:?}");
        assert_eq!(failed("at dark equilibrium", 3.0, None).code, codes::NO_EQUILIBRIUM); // ~ E301
        assert_eq!(failed("at bias", f64::NAN, None).code, codes::SINGULAR); // ~ E303
    }
}
