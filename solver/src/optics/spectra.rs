//! The spectra a person can ask for: the standard tables, a black body, a file of their own.

use std::sync::{Arc, OnceLock};

use crate::math::elementary;
use crate::quantity::constants::{BOLTZMANN, LIGHT_SPEED, PLANCK};

use super::light::Spectrum;

/// What is wrong with a spectrum.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum SpectrumError {
    /// No standard spectrum of this name.
    #[error("no spectrum `{name}`: there are AM1.5G, AM1.5D and AM0")]
    Unknown {
        /// The name asked for.
        name: String,
    },
    /// The file has no header line.
    #[error("spectrum `{name}`: no header line naming the columns")]
    NoHeader {
        /// The spectrum.
        name: String,
    },
    /// A column is missing from the header.
    #[error("spectrum `{name}`, line {line}: no column `{column}` among: {found}")]
    NoColumn {
        /// The spectrum.
        name: String,
        /// Line of the header, from 1.
        line: usize,
        /// The column looked for.
        column: String,
        /// The columns that are there.
        found: String,
    },
    /// Several columns could be the irradiance.
    #[error("spectrum `{name}`, line {line}: say which column is the irradiance, one of: {found}")]
    WhichColumn {
        /// The spectrum.
        name: String,
        /// Line of the header, from 1.
        line: usize,
        /// The candidates.
        found: String,
    },
    /// A field is missing or is not a finite number.
    #[error("spectrum `{name}`, line {line}, column `{column}`: expected a number, found `{text}`")]
    NotANumber {
        /// The spectrum.
        name: String,
        /// Line, from 1.
        line: usize,
        /// Column.
        column: String,
        /// What stands there.
        text: String,
    },
    /// Wavelengths do not increase.
    #[error(
        "spectrum `{name}`, line {line}, column `{column}`: wavelengths must be positive and increase, found {value} nm after {before} nm"
    )]
    NotIncreasing {
        /// The spectrum.
        name: String,
        /// Line, from 1.
        line: usize,
        /// Column.
        column: String,
        /// The wavelength, nm.
        value: f64,
        /// The one before, nm; 0 at the first.
        before: f64,
    },
    /// A negative irradiance.
    #[error(
        "spectrum `{name}`, line {line}, column `{column}`: irradiance must not be negative, found {value}"
    )]
    Negative {
        /// The spectrum.
        name: String,
        /// Line, from 1.
        line: usize,
        /// Column.
        column: String,
        /// The value.
        value: f64,
    },
    /// Fewer than two points.
    #[error("spectrum `{name}`: at least two wavelengths are needed, found {points}")]
    TooShort {
        /// The spectrum.
        name: String,
        /// Points found.
        points: usize,
    },
    /// A number that makes no light.
    #[error("{what} must be positive and finite, found {value}")]
    NotPositive {
        /// What it is, with its unit.
        what: &'static str,
        /// The value.
        value: f64,
    },
}

impl Spectrum {
    /// Trapezoid weights of the wavelengths, m: every integral over a spectrum is the sum of values times these.
    pub fn weights(&self) -> Vec<f64> {
        let grid = &self.wavelength;
        (0..grid.len())
            .map(|i| {
                let below = if i > 0 { grid[i] - grid[i - 1] } else { 0.0 };
                let above = if i + 1 < grid.len() { grid[i + 1] - grid[i] } else { 0.0 };
                0.5 * (below + above)
            })
            .collect()
    }

    /// Irradiance over all its wavelengths, W/m2, by the trapezoid rule on its own grid.
    ///
    /// Efficiency divides by this times the suns.
    pub fn integral(&self) -> f64 {
        self.weights().iter().zip(&self.irradiance).map(|(w, e)| w * e).sum()
    }

    /// Photon flux of each wavelength with its trapezoid weight, m^-2 s^-1: `[wavelengths]`.
    ///
    /// The sum over a set of wavelengths is the photon flux of that set, by definition, everywhere in the solver.
    pub fn photon_flux(&self) -> Vec<f64> {
        self.weights()
            .iter()
            .zip(&self.irradiance)
            .zip(&self.wavelength)
            .map(|((w, e), l)| w * e * l / (PLANCK * LIGHT_SPEED))
            .collect()
    }

    /// A standard spectrum: `AM1.5G` or `AM1.5D` (ASTM G173-03), `AM0` (ASTM E490-00a).
    ///
    /// As integrated: 1000.371, 900.139 and 1366.091 W/m2.
    pub fn standard(name: &str) -> Result<Arc<Spectrum>, SpectrumError> {
        const G173: &str = include_str!("data/astm_g173_03.csv");
        const E490: &str = include_str!("data/astm_e490_00a_am0.csv");
        static GLOBAL: OnceLock<Result<Arc<Spectrum>, SpectrumError>> = OnceLock::new();
        static DIRECT: OnceLock<Result<Arc<Spectrum>, SpectrumError>> = OnceLock::new();
        static SPACE: OnceLock<Result<Arc<Spectrum>, SpectrumError>> = OnceLock::new();
        let parse = |text: &str, column: &str| Spectrum::from_csv(name, text, Some(column)).map(Arc::new);
        match name {
            "AM1.5G" => GLOBAL.get_or_init(|| parse(G173, "am15g")).clone(),
            "AM1.5D" => DIRECT.get_or_init(|| parse(G173, "am15d")).clone(),
            "AM0" => SPACE.get_or_init(|| parse(E490, "am0_e490")).clone(),
            _ => Err(SpectrumError::Unknown { name: name.to_string() }),
        }
    }

    /// Names of the standard spectra.
    pub const STANDARD: &'static [&'static str] = &["AM1.5G", "AM1.5D", "AM0"];

    /// Column of a file that holds vacuum wavelengths in nm.
    pub const WAVELENGTH_COLUMN: &'static str = "wavelength_nm";

    /// Reads a spectrum from the text of a CSV file.
    ///
    /// Lines that start with `#` are remarks; the first one becomes the source. The header names the columns:
    /// `wavelength_nm` (vacuum, increasing) and the spectral irradiance in W/m2/nm, which is the column called
    /// `column`, or, without one, the only other column. Faults name the line and the column.
    pub fn from_csv(name: &str, text: &str, column: Option<&str>) -> Result<Spectrum, SpectrumError> {
        let mut source = String::new();
        let mut rows = text
            .trim_start_matches('\u{feff}')
            .lines()
            .enumerate()
            .map(|(i, line)| (i + 1, line.trim()))
            .filter(|(_, line)| {
                if let Some(remark) = line.strip_prefix('#') {
                    if source.is_empty() {
                        source = remark.trim().to_string();
                    }
                    return false;
                }
                !line.is_empty()
            });
        let name = name.to_string();
        let Some((header_line, header)) = rows.next() else {
            return Err(SpectrumError::NoHeader { name });
        };
        let columns: Vec<&str> = header.split(',').map(str::trim).collect();
        let find = |wanted: &str| {
            columns.iter().position(|c| *c == wanted).ok_or_else(|| SpectrumError::NoColumn {
                name: name.clone(),
                line: header_line,
                column: wanted.to_string(),
                found: columns.join(", "),
            })
        };
        let at_wavelength = find(Self::WAVELENGTH_COLUMN)?;
        let at_irradiance = match column {
            Some(wanted) => find(wanted)?,
            None => {
                let others: Vec<usize> = (0..columns.len()).filter(|&c| c != at_wavelength).collect();
                match others[..] {
                    [one] => one,
                    [] => find("irradiance_W_per_m2_nm")?,
                    _ => {
                        return Err(SpectrumError::WhichColumn {
                            found: others.iter().map(|&c| columns[c]).collect::<Vec<_>>().join(", "),
                            name,
                            line: header_line,
                        });
                    }
                }
            }
        };
        let (mut wavelength, mut irradiance) = (Vec::new(), Vec::new());
        let mut before = 0.0;
        for (line, row) in rows {
            let fields: Vec<&str> = row.split(',').map(str::trim).collect();
            let read = |column: usize| -> Result<f64, SpectrumError> {
                let text = fields.get(column).copied().unwrap_or("");
                text.parse::<f64>().ok().filter(|v| v.is_finite()).ok_or_else(|| SpectrumError::NotANumber {
                    name: name.clone(),
                    line,
                    column: columns[column].to_string(),
                    text: text.to_string(),
                })
            };
            let (nm, value) = (read(at_wavelength)?, read(at_irradiance)?);
            if nm <= before {
                return Err(SpectrumError::NotIncreasing {
                    name,
                    line,
                    column: columns[at_wavelength].to_string(),
                    value: nm,
                    before,
                });
            }
            if value < 0.0 {
                return Err(SpectrumError::Negative {
                    name,
                    line,
                    column: columns[at_irradiance].to_string(),
                    value,
                });
            }
            before = nm;
            wavelength.push(nm / 1e9);
            irradiance.push(value * 1e9);
        }
        if wavelength.len() < 2 {
            return Err(SpectrumError::TooShort { name, points: wavelength.len() });
        }
        Ok(Spectrum { name, source, wavelength, irradiance })
    }

    /// Etendue of a hemisphere per receiving area, sr.
    pub const HEMISPHERE: f64 = std::f64::consts::PI;

    /// Light of a black body.
    ///
    /// `etendue` is the etendue per receiving area, sr: [`Spectrum::HEMISPHERE`], pi, for black surroundings (a surface at
    /// the body's own temperature would receive sigma T^4), 6.8e-5 for a disc the size of the sun, seen
    /// head-on from the Earth. `irradiance`, W/m2, scales the whole to that integral instead. Spectral
    /// irradiance `2 h c^2 / wavelength^5 / (exp(h c / (wavelength k T)) - 1)` times the etendue, M. Planck, Ann.
    /// Phys. 309, 553 (1901); 4200 wavelengths, two thousandths apart in the logarithm, hold all but 1e-7 of the
    /// power and the trapezoid rule keeps it to 1e-6.
    pub fn black_body(
        temperature: f64,
        etendue: f64,
        irradiance: Option<f64>,
    ) -> Result<Spectrum, SpectrumError> {
        let positive = |what, value: f64| {
            if value > 0.0 && value.is_finite() {
                Ok(value)
            } else {
                Err(SpectrumError::NotPositive { what, value })
            }
        };
        positive("temperature of a black body, K,", temperature)?;
        positive("etendue, sr,", etendue)?;
        // h nu / kT at the short end, and the ratio of neighbouring wavelengths.
        const SHORTEST: f64 = 40.0;
        const STEP: f64 = 0.002;
        const POINTS: usize = 4200;
        let scale = PLANCK * LIGHT_SPEED / (BOLTZMANN * temperature);
        let (mut wavelength, mut values) = (Vec::with_capacity(POINTS), Vec::with_capacity(POINTS));
        for i in 0..POINTS {
            let x = SHORTEST * elementary::exp(-(i as f64) * STEP);
            let l = scale / x;
            let (l2, photon) = (l * l, elementary::exp_m1(x));
            wavelength.push(l);
            values.push(2.0 * PLANCK * LIGHT_SPEED * LIGHT_SPEED * etendue / (l2 * l2 * l) / photon);
        }
        let mut body = Spectrum {
            name: format!("black body {temperature} K"),
            source: format!("Planck's law, etendue {etendue} sr"),
            wavelength,
            irradiance: values,
        };
        if let Some(wanted) = irradiance {
            let factor = positive("irradiance, W/m2,", wanted)? / body.integral();
            body.irradiance.iter_mut().for_each(|e| *e *= factor);
            body.source = format!("Planck's law, scaled to {wanted} W/m2");
        }
        Ok(body)
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::quantity::constants::ELEMENTARY_CHARGE;
    use std::f64::consts::PI;

    /// Truth: the integrals printed with the tables of ASTM G173-03 and E490-00a, to the digits printed.
    #[test]
    fn standard_spectra_have_their_printed_integrals() {
        for (name, printed) in [("AM1.5G", 1000.371), ("AM1.5D", 900.139), ("AM0", 1366.091)] {
            let spectrum = Spectrum::standard(name).expect("a name of the list");
            assert!((spectrum.integral() - printed).abs() <= 5.001e-4, "{name}: {}", spectrum.integral());
            assert!(spectrum.source.contains("ASTM"), "{name}: {}", spectrum.source);
        }
        assert!(matches!(Spectrum::standard("AM1.5"), Err(SpectrumError::Unknown { .. })));
    }

    /// Truth: the same trapezoid written per interval, here; 1e-14 is the rounding of 2000 additions.
    #[test]
    fn photon_flux_is_the_trapezoid_of_irradiance_over_photon_energy() {
        let sun = Spectrum::standard("AM1.5G").expect("a name of the list");
        let density = |i: usize| sun.irradiance[i] * sun.wavelength[i] / (PLANCK * LIGHT_SPEED);
        let mut expected = 0.0;
        for i in 1..sun.wavelength.len() {
            expected += 0.5 * (density(i - 1) + density(i)) * (sun.wavelength[i] - sun.wavelength[i - 1]);
        }
        let sum: f64 = sun.photon_flux().iter().sum();
        assert!((sum / expected - 1.0).abs() < 1e-14);
        // All photons of AM1.5G to 4000 nm carry about 69 mA/cm2, from memory of many textbooks; 1 % for the memory.
        assert!((sum * ELEMENTARY_CHARGE / 690.0 - 1.0).abs() < 0.01, "{}", sum * ELEMENTARY_CHARGE);
    }

    /// Truth: the law of Stefan and Boltzmann with its constant in closed form; 1e-6 as the docs say.
    #[test]
    fn black_body_obeys_stefan_and_boltzmann() {
        let k = BOLTZMANN;
        let sigma = 2.0 * PI.powi(5) * k.powi(4) / (15.0 * PLANCK.powi(3) * LIGHT_SPEED.powi(2));
        for t in [80.0, 300.0, 5772.0] {
            let body = Spectrum::black_body(t, PI, None).expect("positive numbers");
            assert!((body.integral() / (sigma * t.powi(4)) - 1.0).abs() < 1e-6, "{t} K: {}", body.integral());
        }
        let scaled = Spectrum::black_body(5772.0, PI, Some(1000.0)).expect("positive numbers");
        assert!((scaled.integral() - 1000.0).abs() < 1e-9);
        for bad in [0.0, -1.0, f64::NAN, f64::INFINITY] {
            assert!(Spectrum::black_body(bad, PI, None).is_err());
            assert!(Spectrum::black_body(300.0, bad, None).is_err());
            assert!(Spectrum::black_body(300.0, PI, Some(bad)).is_err());
        }
    }

    /// Truth: Wien's displacement law, 2897.771955 um K (CODATA 2018); the grid's own spacing is 0.2 %.
    #[test]
    fn black_body_peaks_where_wien_says() {
        let body = Spectrum::black_body(5772.0, PI, None).expect("positive numbers");
        let top = (0..body.irradiance.len())
            .max_by(|&a, &b| body.irradiance[a].total_cmp(&body.irradiance[b]))
            .expect("points");
        assert!((body.wavelength[top] * 5772.0 / 2.897771955e-3 - 1.0).abs() < 2e-3);
    }

    /// Truth: the file's own lines; exact, for 400 nm / 1e9 is the nearest number to 4e-7 m.
    #[test]
    fn a_users_file_is_read_by_its_header() {
        let text = "# lamp of bay 3\n\nlot,wavelength_nm,power\n1, 400 ,0.5\n2,500,1\n# pause\n3,600,0.25\n";
        let lamp = Spectrum::from_csv("lamp", text, Some("power")).expect("a sound file");
        assert_eq!(lamp.wavelength, [4e-7, 5e-7, 6e-7]);
        assert_eq!(lamp.irradiance, [0.5e9, 1e9, 0.25e9]);
        assert_eq!(lamp.source, "lamp of bay 3");
        assert!((lamp.integral() - (75.0 + 62.5)).abs() < 1e-9);
        assert!(Spectrum::from_csv("lamp", "wavelength_nm,x\n400,1\n410,1", None).is_ok());
    }

    /// Truth: the fault planted in each text; the message must name its line and column.
    #[test]
    fn faults_of_a_file_name_line_and_column() {
        let fault = |text: &str| Spectrum::from_csv("lamp", text, None).expect_err(text).to_string();
        let cases: [(&str, &[&str]); 9] = [
            ("", &["header"]),
            ("# only remarks\n", &["header"]),
            ("nm,power\n400,1\n", &["line 1", "`wavelength_nm`", "nm, power"]),
            ("wavelength_nm\n400\n", &["line 1", "irradiance"]),
            ("wavelength_nm,a,b\n400,1,1\n", &["line 1", "a, b"]),
            ("wavelength_nm,a\n400,1\n410,nan\n", &["line 3", "`a`", "`nan`"]),
            ("wavelength_nm,a\n400,1\n410\n", &["line 3", "`a`", "``"]),
            ("wavelength_nm,a\n400,1\n400,1\n", &["line 3", "`wavelength_nm`", "400 nm after 400 nm"]),
            ("wavelength_nm,a\n400,1\n410,-2\n", &["line 3", "`a`", "-2"]),
        ];
        for (text, words) in cases {
            let message = fault(text);
            for word in words {
                assert!(message.contains(word), "{text:?}: `{message}` lacks `{word}`");
            }
        }
        assert!(fault("wavelength_nm,a\n400,1\n").contains("two wavelengths"));
    }
}
