//! Light: spectra, concentration, single wavelengths; coatings.

use std::sync::Arc;

use epiloom_solver::materials::{film_constants, film_names};
use epiloom_solver::optics::{Film, OpticalConstants, Reflectance, Spectrum, SpectrumError};
use rhai::Dynamic;

use crate::diagnostics::codes;
use crate::language::device_value::{CoatingValue, ConstantsValue, FilmValue};
use crate::language::dimension::Dimension;
use crate::language::fault::{Fault, Faults, Place};
use crate::language::light_value::LightValue;
use crate::language::quantity::Quantity;
use crate::language::value::{Options, array, give, quantity, take, text};
use crate::language::vocabulary::{
    Answer, OptionRow, function, getter, index_getter, setter, topic, unknown_property,
};

use super::files::read_text;

topic! {
    "Light",
    "A spectrum shines at its tabulated irradiance times its concentration in suns.";

    Function "spectrum" {
        forms: ["spectrum(\"AM1.5G\")", "spectrum(\"AM1.5D\", suns)"],
        doc: "A standard spectrum, AM1.5G or AM1.5D (ASTM G173), or AM0 (ASTM E490), at a concentration, by default one sun.",
        example: "let sun = spectrum(\"AM1.5G\");\nlet concentrated = spectrum(\"AM1.5D\", 500.suns);",
        register: |engine, session| {
            engine.register_type_with_name::<LightValue>("light");
            function(engine, session, "spectrum", 1..=2, |_, arguments| {
                let name = text(arguments[0], "the name of a spectrum").map_err(|f| f.at(Place::Argument(0)))?;
                let spectrum = Spectrum::standard(&name).map_err(|error| spectrum_fault(&error).at(Place::Argument(0)))?;
                shine(spectrum, arguments.get(1).map(|a| &**a), 1)
            });
        },
    }
    Function "spectrum_file" {
        forms: ["spectrum_file(\"file.csv\")", "spectrum_file(\"file.csv\", \"column\")"],
        doc: "A spectrum from a file beside the script: a header, a column `wavelength_nm` (vacuum, increasing) and one of spectral \
              irradiance in W/m2/nm, named if there are several. Lines that begin with `#` are remarks.",
        example: "if false { let lamp = spectrum_file(\"lamp.csv\"); }",
        register: |engine, session| {
            function(engine, session, "spectrum_file", 1..=2, |call, arguments| {
                let (name, content) = read_text(call, arguments[0])?;
                let column = match arguments.get(1) {
                    Some(column) => Some(text(column, "the name of a column").map_err(|f| f.at(Place::Argument(1)))?),
                    None => None,
                };
                let spectrum = Spectrum::from_csv(&name, &content, column.as_deref())
                    .map_err(|error| spectrum_fault(&error).at(Place::Argument(0)))?;
                shine(Arc::new(spectrum), None, 1)
            });
        },
    }
    Function "black_body" {
        forms: ["black_body(temperature, irradiance)"],
        doc: "The spectrum of a black body of a temperature, scaled to a total irradiance.",
        example: "let lamp = black_body(3200.K, 100.mW_per_cm2);",
        register: |engine, session| {
            function(engine, session, "black_body", 2..=2, |_, arguments| {
                let at = |index: usize| move |fault: Fault| fault.at(Place::Argument(index));
                let temperature = quantity(arguments[0], "the temperature of a black body", Dimension::TEMPERATURE).map_err(at(0))?;
                let irradiance = quantity(arguments[1], "the irradiance", Dimension::POWER_DENSITY).map_err(at(1))?;
                if temperature.unknown || irradiance.unknown {
                    return Err(Fault::of_unknown().into());
                }
                let spectrum = Spectrum::black_body(temperature.value, std::f64::consts::PI, Some(irradiance.value))
                    .map_err(|error| spectrum_fault(&error))?;
                shine(Arc::new(spectrum), None, 2)
            });
        },
    }
    Function "monochromatic" {
        forms: ["monochromatic(#{ options })"],
        doc: "Photons of one kind, counted as they enter the stack. With a wavelength each layer absorbs them by its table \
              there; without one, by its scalar `absorption` (0 is transparent), and the light has no energy, so no efficiency.",
        options: &[
            OptionRow { key: "photon_flux", takes: "a flux", doc: "Photons that enter the stack." },
            OptionRow { key: "wavelength", takes: "a length", doc: "Their vacuum wavelength." },
        ],
        example: "let probe = monochromatic(#{ photon_flux: 2e17.per_cm2_s });\nlet laser = monochromatic(#{ photon_flux: 1e17.per_cm2_s, wavelength: 808.nm });",
        register: |engine, session| {
            function(engine, session, "monochromatic", 1..=1, |_, arguments| {
                let options = Options::new(arguments[0], "`monochromatic`", ["photon_flux", "wavelength"]).map_err(Faults)?;
                let Some(photon_flux) = options.quantity("photon_flux", "`photon_flux`", Dimension::FLUX)? else {
                    return Err(Fault::new(codes::MISSING_OPTION, format!("`monochromatic` needs `photon_flux`, {}", Dimension::FLUX.family()))
                        .help("monochromatic(#{ photon_flux: 2e17.per_cm2_s })")
                        .into());
                };
                let wavelength = options.quantity("wavelength", "`wavelength`", Dimension::LENGTH)?;
                for (key, value) in [("photon_flux", Some(&photon_flux)), ("wavelength", wavelength.as_ref())] {
                    if let Some(value) = value
                        && value.value <= 0.0
                        && !value.unknown
                    {
                        return Err(Fault::new(codes::LIGHT, format!("`{key}` must be positive"))
                            .label(format!("this is {value}"))
                            .help("light without any photons is `dark()`")
                            .at(Place::Option(key.to_string()))
                            .into());
                    }
                }
                Ok(Dynamic::from(LightValue::Monochromatic { photon_flux, wavelength }))
            });
        },
    }
    Function "dark" {
        forms: ["dark()"],
        doc: "No light.",
        example: "let night = dark();",
        register: |engine, session| {
            function(engine, session, "dark", 0..=0, |_, _| Ok(Dynamic::from(LightValue::Dark)));
        },
    }
    Property "suns" of "light" {
        forms: ["light.suns", "light.suns = number"],
        doc: "Concentration of a spectrum.",
        example: "let sun = spectrum(\"AM1.5D\");\nsun.suns = 200;\nprint(sun.suns);",
        register: |engine, session| {
            getter::<LightValue>(engine, session, "suns", |_, arguments| {
                Ok(match of(arguments[0])? {
                    LightValue::Spectrum { suns, .. } => give(suns),
                    _ => Dynamic::UNIT,
                })
            });
            setter::<LightValue>(engine, session, "suns", |_, arguments| {
                let given = concentration(arguments[1]).map_err(|f| f.at(Place::Argument(0)))?;
                match arguments[0].write_lock::<LightValue>().as_deref_mut() {
                    Some(LightValue::Spectrum { suns, .. }) => *suns = given,
                    _ => {
                        return Err(Fault::new(codes::LIGHT, "only a spectrum has a concentration in suns")
                            .help("a monochromatic light has its `photon_flux`")
                            .into());
                    }
                }
                Ok(Dynamic::UNIT)
            });
            index_getter::<LightValue>(engine, session, |_, arguments| Err(unknown_property("light", &text(arguments[1], "a property")?).into()));
        },
    }
    Property "irradiance" of "light" {
        forms: ["light.irradiance"],
        doc: "Its irradiance: the tabulated integral times suns, which an efficiency divides by; `()` for photons without energy.",
        example: "print(spectrum(\"AM1.5G\").irradiance);",
        register: |engine, session| {
            getter::<LightValue>(engine, session, "irradiance", |_, arguments| {
                Ok(match of(arguments[0])? {
                    LightValue::Dark => give(Quantity::si(0.0, Dimension::POWER_DENSITY)),
                    LightValue::Spectrum { spectrum, suns } => {
                        give(Quantity::si(spectrum.integral(), Dimension::POWER_DENSITY).multiply(&suns)?)
                    }
                    LightValue::Monochromatic { photon_flux, wavelength: Some(wavelength) } => {
                        use epiloom_solver::quantity::constants::{LIGHT_SPEED, PLANCK};
                        let length_energy = Dimension::ENERGY.times(Dimension::LENGTH).unwrap_or_default();
                        let energy = Quantity::si(PLANCK * LIGHT_SPEED, length_energy).divide(&wavelength)?;
                        give(photon_flux.multiply(&energy)?)
                    }
                    LightValue::Monochromatic { wavelength: None, .. } => Dynamic::UNIT,
                })
            });
        },
    }
    Function "optical_constants" {
        forms: ["optical_constants(\"file.csv\")"],
        doc: "Refractive index and extinction coefficient of a substance, for `film`, from a file beside the script with the columns \
              `wavelength_nm` (or `wavelength_um`), `n` and `k`.",
        example: "if false { let zinc_sulphide = optical_constants(\"zns.csv\"); }",
        register: |engine, session| {
            engine.register_type_with_name::<ConstantsValue>("optical constants");
            function(engine, session, "optical_constants", 1..=1, |call, arguments| {
                let (name, content) = read_text(call, arguments[0])?;
                let columns = super::files::Columns::read(&name, &content).map_err(|f| f.at(Place::Argument(0)))?;
                Ok(Dynamic::from(ConstantsValue(Arc::new(constants(&name, &columns).map_err(|f| f.at(Place::Argument(0)))?))))
            });
        },
    }
    Function "film" {
        forms: ["film(\"MgF2\", thickness)", "film(optical_constants(..), thickness)", "film(index, thickness)"],
        doc: "A film of a coating: a substance, and its thickness. Al2O3, MgF2, Si3N4, SiO2, TiO2 and ZnS are built in, with the \
              citation of their tables; any other comes from a file, or is one refractive index without absorption.",
        example: "let outer = film(\"MgF2\", 100.nm);\nlet inner = film(2.3, 55.nm);",
        register: |engine, session| {
            engine.register_type_with_name::<FilmValue>("film");
            function(engine, session, "film", 2..=2, |_, arguments| {
                let constants = if let Some(constants) = arguments[0].read_lock::<ConstantsValue>() {
                    Arc::clone(&constants.0)
                } else if arguments[0].is_string() {
                    let name = text(arguments[0], "the substance of a film")?;
                    let known: Vec<&str> = film_names().collect();
                    Arc::new(film_constants(&name).ok_or_else(|| {
                        Fault::new(codes::WRONG_CHOICE, format!("no optical constants of `{name}` are built in"))
                            .candidates(&name, known.iter().copied())
                            .note("optical_constants(\"file.csv\") reads a table of your own")
                            .at(Place::Argument(0))
                    })?)
                } else if crate::language::value::any_quantity(arguments[0]).is_some() {
                    let index = quantity(arguments[0], "the refractive index of a film", Dimension::NONE).map_err(|f| f.at(Place::Argument(0)))?;
                    if index.value < 1.0 {
                        return Err(Fault::new(codes::LIGHT, "the refractive index of a film must be at least 1")
                            .label(format!("this is {index}"))
                            .at(Place::Argument(0))
                            .into());
                    }
                    Arc::new(OpticalConstants {
                        name: format!("index {}", index.value),
                        source: "set by the script".to_string(),
                        wavelength: vec![1e-7, 1e-5],
                        n: vec![index.value; 2],
                        k: vec![0.0; 2],
                    })
                } else {
                    take::<ConstantsValue>(arguments[0], "the substance of a film", "optical constants or a refractive index").map_err(|f| f.at(Place::Argument(0)))?.0
                };
                let thickness = quantity(arguments[1], "the thickness of a film", Dimension::LENGTH).map_err(|f| f.at(Place::Argument(1)))?;
                if thickness.value <= 0.0 && !thickness.unknown {
                    return Err(Fault::new(codes::THICKNESS_NOT_POSITIVE, "the thickness of a film must be positive")
                        .label(format!("this is {thickness}"))
                        .at(Place::Argument(1))
                        .into());
                }
                Ok(Dynamic::from(FilmValue(Film { constants, thickness })))
            });
        },
    }
    Function "coating" {
        forms: ["coating([film(..), ..])"],
        doc: "Coherent films on the first semiconductor, outermost first, at normal incidence: a value for `cell.front_reflectance`.",
        example: "let two = coating([film(\"MgF2\", 100.nm), film(\"ZnS\", 55.nm)]);",
        register: |engine, session| {
            engine.register_type_with_name::<CoatingValue>("coating");
            function(engine, session, "coating", 1..=1, |_, arguments| {
                let list = array(arguments[0], "the films of a coating").map_err(|f| f.at(Place::Argument(0)))?;
                let mut films = Vec::new();
                for entry in list.iter().filter(|e| !e.is_unit()) {
                    films.push(take::<FilmValue>(entry, "an entry of a coating", "a film").map_err(|f| f.at(Place::Argument(0)))?.0);
                }
                Ok(Dynamic::from(CoatingValue(Reflectance::Coating(films))))
            });
        },
    }
}

fn of(value: &Dynamic) -> Result<LightValue, Fault> {
    take(value, "the light", "a light")
}

/// A light, wherever one is an argument.
pub fn light(value: &Dynamic, index: usize) -> Result<LightValue, Fault> {
    take(value, "the light", "a light, such as spectrum(\"AM1.5G\") or dark()")
        .map_err(|f| f.at(Place::Argument(index)))
}

fn concentration(value: &Dynamic) -> Result<Quantity, Fault> {
    let suns = quantity(value, "the concentration in suns", Dimension::NONE)?;
    if suns.value > 0.0 || suns.unknown {
        return Ok(suns);
    }
    Err(Fault::new(codes::LIGHT, "the concentration in suns must be positive")
        .label(format!("this is {suns}"))
        .help("light without any photons is `dark()`"))
}

fn shine(spectrum: Arc<Spectrum>, suns: Option<&Dynamic>, index: usize) -> Answer {
    let suns = match suns {
        Some(value) => concentration(value).map_err(|f| f.at(Place::Argument(index)))?,
        None => Quantity::number(1.0),
    };
    Ok(Dynamic::from(LightValue::Spectrum { spectrum, suns }))
}

/// A fault of a spectrum in the words of scripts.
fn spectrum_fault(error: &SpectrumError) -> Fault {
    match error {
        SpectrumError::Unknown { name } => {
            Fault::new(codes::UNKNOWN_SPECTRUM, format!("no spectrum is called `{name}`"))
                .candidates(name, ["AM1.5G", "AM1.5D", "AM0"])
        }
        SpectrumError::NotPositive { .. } => Fault::new(codes::LIGHT, error.to_string()),
        other => Fault::new(codes::DATA_FILE, other.to_string()),
    }
}

/// Optical constants from the columns of a file.
fn constants(name: &str, columns: &super::files::Columns) -> Result<OpticalConstants, Fault> {
    let missing = |column: &str| Fault::new(codes::DATA_FILE, format!("`{name}` has no column `{column}`"));
    let wavelength =
        columns.quantity("wavelength", Dimension::LENGTH).ok_or_else(|| missing("wavelength_nm"))?;
    let n = columns.quantity("n", Dimension::NONE).ok_or_else(|| missing("n"))?;
    let k = columns.quantity("k", Dimension::NONE).unwrap_or_else(|| vec![0.0; n.len()]);
    if wavelength.len() < 2 || wavelength.windows(2).any(|w| w[1] <= w[0]) {
        return Err(Fault::new(
            codes::DATA_FILE,
            format!("`{name}` needs two wavelengths or more, increasing"),
        ));
    }
    Ok(OpticalConstants { name: name.to_string(), source: format!("file `{name}`"), wavelength, n, k })
}
