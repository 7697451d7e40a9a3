//! Tables of optical constants, the project's or a user's.

/// Refractive index and extinction coefficient against vacuum wavelength.
#[derive(Clone, Debug, PartialEq)]
pub struct OpticalConstants {
    /// Name of the substance.
    pub name: String,
    /// Where the table is from.
    pub source: String,
    /// Vacuum wavelengths, m, increasing: `[wavelengths]`.
    pub wavelength: Vec<f64>,
    /// Refractive index: `[wavelengths]`.
    pub n: Vec<f64>,
    /// Extinction coefficient: `[wavelengths]`.
    pub k: Vec<f64>,
}

impl OpticalConstants {
    /// Reads lines of `wavelength in nm, n, k`; lines that start with `#` and the line of column names are passed over.
    ///
    /// Rows that are not three numbers are left out, so that no data file can stop the program; tests count the rows.
    pub(crate) fn parse(name: &str, text: &str) -> Self {
        let mut constants = OpticalConstants {
            name: name.to_string(),
            source: text
                .lines()
                .filter_map(|line| line.strip_prefix("# cite: "))
                .collect::<Vec<_>>()
                .join("; "),
            wavelength: Vec::new(),
            n: Vec::new(),
            k: Vec::new(),
        };
        for line in text.lines().filter(|line| !line.starts_with('#')) {
            let mut numbers = line.split(',').map(|field| field.trim().parse::<f64>());
            if let (Some(Ok(nm)), Some(Ok(n)), Some(Ok(k)), None) =
                (numbers.next(), numbers.next(), numbers.next(), numbers.next())
            {
                constants.wavelength.push(nm / 1e9);
                constants.n.push(n);
                constants.k.push(k);
            }
        }
        constants
    }
}
