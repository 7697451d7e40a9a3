//! Physical dimensions: exponents of the base units, and the words for the families of quantities that scripts meet.

/// Exponents of metre, kilogram, second, ampere and kelvin.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub struct Dimension {
    /// Exponent of the metre.
    pub metre: i8,
    /// Exponent of the kilogram.
    pub kilogram: i8,
    /// Exponent of the second.
    pub second: i8,
    /// Exponent of the ampere.
    pub ampere: i8,
    /// Exponent of the kelvin.
    pub kelvin: i8,
}

/// Shorthand for a dimension: exponents of m, kg, s, A, K.
const fn dim(metre: i8, kilogram: i8, second: i8, ampere: i8, kelvin: i8) -> Dimension {
    Dimension { metre, kilogram, second, ampere, kelvin }
}

impl Dimension {
    /// A plain number.
    pub const NONE: Dimension = dim(0, 0, 0, 0, 0);
    /// Length.
    pub const LENGTH: Dimension = dim(1, 0, 0, 0, 0);
    /// Area.
    pub const AREA: Dimension = dim(2, 0, 0, 0, 0);
    /// One over length: an absorption coefficient.
    pub const INVERSE_LENGTH: Dimension = dim(-1, 0, 0, 0, 0);
    /// Number per area.
    pub const AREAL_DENSITY: Dimension = dim(-2, 0, 0, 0, 0);
    /// Number per volume.
    pub const DENSITY: Dimension = dim(-3, 0, 0, 0, 0);
    /// Number per area and time.
    pub const FLUX: Dimension = dim(-2, 0, -1, 0, 0);
    /// Number per volume and time.
    pub const RATE: Dimension = dim(-3, 0, -1, 0, 0);
    /// Time.
    pub const TIME: Dimension = dim(0, 0, 1, 0, 0);
    /// One over time.
    pub const FREQUENCY: Dimension = dim(0, 0, -1, 0, 0);
    /// Velocity.
    pub const VELOCITY: Dimension = dim(1, 0, -1, 0, 0);
    /// Energy.
    pub const ENERGY: Dimension = dim(2, 1, -2, 0, 0);
    /// Voltage.
    pub const VOLTAGE: Dimension = dim(2, 1, -3, -1, 0);
    /// Temperature.
    pub const TEMPERATURE: Dimension = dim(0, 0, 0, 0, 1);
    /// Energy over temperature: how a gap moves.
    pub const ENERGY_PER_TEMPERATURE: Dimension = dim(2, 1, -2, 0, -1);
    /// Electric field.
    pub const FIELD: Dimension = dim(1, 1, -3, -1, 0);
    /// Mobility of carriers.
    pub const MOBILITY: Dimension = dim(0, -1, 2, 1, 0);
    /// Diffusion coefficient.
    pub const DIFFUSION: Dimension = dim(2, 0, -1, 0, 0);
    /// Radiative coefficient.
    pub const RADIATIVE: Dimension = dim(3, 0, -1, 0, 0);
    /// Auger coefficient.
    pub const AUGER: Dimension = dim(6, 0, -1, 0, 0);
    /// Current density.
    pub const CURRENT_DENSITY: Dimension = dim(-2, 0, 0, 1, 0);
    /// Power per area.
    pub const POWER_DENSITY: Dimension = dim(0, 1, -3, 0, 0);
    /// Resistance times area.
    pub const AREA_RESISTANCE: Dimension = dim(4, 1, -3, -2, 0);
    /// Conductance per area.
    pub const AREA_CONDUCTANCE: Dimension = dim(-4, -1, 3, 2, 0);
    /// Resistance (also of a sheet, per square).
    pub const RESISTANCE: Dimension = dim(2, 1, -3, -2, 0);
    /// Resistivity.
    pub const RESISTIVITY: Dimension = dim(3, 1, -3, -2, 0);
    /// Charge per area.
    pub const CHARGE_DENSITY: Dimension = dim(-2, 0, 1, 1, 0);
    /// Capacitance per area.
    pub const CAPACITANCE_DENSITY: Dimension = dim(-4, -1, 4, 2, 0);

    /// Whether it is a plain number.
    pub fn is_none(self) -> bool {
        self == Dimension::NONE
    }

    /// The dimension of a product; `None` past the range of the exponents.
    pub fn times(self, other: Dimension) -> Option<Dimension> {
        self.combine(other, i8::checked_add)
    }

    /// The dimension of a quotient; `None` past the range of the exponents.
    pub fn over(self, other: Dimension) -> Option<Dimension> {
        self.combine(other, i8::checked_sub)
    }

    /// The dimension of a power; `None` where an exponent would not be whole or past its range.
    pub fn power(self, exponent: f64) -> Option<Dimension> {
        let raise = |e: i8| {
            let raised = f64::from(e) * exponent;
            (raised.fract() == 0.0 && raised.abs() <= 127.0).then_some(raised as i8)
        };
        Some(Dimension {
            metre: raise(self.metre)?,
            kilogram: raise(self.kilogram)?,
            second: raise(self.second)?,
            ampere: raise(self.ampere)?,
            kelvin: raise(self.kelvin)?,
        })
    }

    fn combine(self, other: Dimension, with: fn(i8, i8) -> Option<i8>) -> Option<Dimension> {
        Some(Dimension {
            metre: with(self.metre, other.metre)?,
            kilogram: with(self.kilogram, other.kilogram)?,
            second: with(self.second, other.second)?,
            ampere: with(self.ampere, other.ampere)?,
            kelvin: with(self.kelvin, other.kelvin)?,
        })
    }

    /// The dimension of base units written as [`Dimension::base_units`] writes them.
    pub fn of_base_units(text: &str) -> Option<Dimension> {
        let mut found = Dimension::NONE;
        for word in text.split(' ').filter(|word| *word != "1") {
            let (unit, exponent) = word.split_once('^').unwrap_or((word, "1"));
            let slot = match unit {
                "kg" => &mut found.kilogram,
                "m" => &mut found.metre,
                "s" => &mut found.second,
                "A" => &mut found.ampere,
                "K" => &mut found.kelvin,
                _ => return None,
            };
            *slot = exponent.parse().ok()?;
        }
        Some(found)
    }

    /// Its family's words: "a length, such as 30.nm"; base units where scripts know no family of it.
    pub fn family(self) -> String {
        match FAMILIES.iter().find(|f| f.dimension == self) {
            Some(f) if f.example.is_empty() => f.name.to_string(),
            Some(f) => format!("{}, such as {}", f.name, f.example),
            None => format!("a quantity in {}", self.base_units()),
        }
    }

    /// Its family's name alone: "a length".
    pub fn family_name(self) -> String {
        match FAMILIES.iter().find(|f| f.dimension == self) {
            Some(f) => f.name.to_string(),
            None => format!("a quantity in {}", self.base_units()),
        }
    }

    /// A unit of its family as an example: "nm".
    pub fn example_unit(self) -> Option<&'static str> {
        let family = FAMILIES.iter().find(|f| f.dimension == self)?;
        family.example.rsplit('.').next().filter(|unit| !unit.is_empty())
    }

    /// The dimension in base units: "m^-2 s^-1"; "1" for a plain number.
    pub fn base_units(self) -> String {
        let parts = [
            ("kg", self.kilogram),
            ("m", self.metre),
            ("s", self.second),
            ("A", self.ampere),
            ("K", self.kelvin),
        ];
        let words: Vec<String> = parts
            .iter()
            .filter(|(_, e)| *e != 0)
            .map(|(unit, e)| if *e == 1 { unit.to_string() } else { format!("{unit}^{e}") })
            .collect();
        if words.is_empty() { "1".to_string() } else { words.join(" ") }
    }
}

/// A family of quantities: what a person calls it and how one is written.
struct Family {
    dimension: Dimension,
    name: &'static str,
    example: &'static str,
}

const fn family(dimension: Dimension, name: &'static str, example: &'static str) -> Family {
    Family { dimension, name, example }
}

const FAMILIES: &[Family] = &[
    family(Dimension::NONE, "a plain number", ""),
    family(Dimension::LENGTH, "a length", "30.nm"),
    family(Dimension::AREA, "an area", "1.cm2"),
    family(Dimension::INVERSE_LENGTH, "an absorption coefficient", "1e4.per_cm"),
    family(Dimension::AREAL_DENSITY, "a density per area", "1e12.per_cm2"),
    family(Dimension::DENSITY, "a density", "2e17.per_cm3"),
    family(Dimension::FLUX, "a flux", "2e17.per_cm2_s"),
    family(Dimension::RATE, "a rate", "1e21.per_cm3_s"),
    family(Dimension::TIME, "a time", "20.ns"),
    family(Dimension::FREQUENCY, "a frequency", "1e6.per_s"),
    family(Dimension::VELOCITY, "a velocity", "1e4.cm_per_s"),
    family(Dimension::ENERGY, "an energy", "1.42.eV"),
    family(Dimension::VOLTAGE, "a voltage", "0.9.V"),
    family(Dimension::TEMPERATURE, "a temperature", "300.K"),
    family(Dimension::ENERGY_PER_TEMPERATURE, "an energy per kelvin", "0.5.meV_per_K"),
    family(Dimension::FIELD, "an electric field", "10.kV_per_cm"),
    family(Dimension::MOBILITY, "a mobility", "3000.cm2_per_Vs"),
    family(Dimension::DIFFUSION, "a diffusion coefficient", "10.cm2_per_s"),
    family(Dimension::RADIATIVE, "a radiative coefficient", "2e-10.cm3_per_s"),
    family(Dimension::AUGER, "an Auger coefficient", "1e-30.cm6_per_s"),
    family(Dimension::CURRENT_DENSITY, "a current density", "28.mA_per_cm2"),
    family(Dimension::POWER_DENSITY, "a power per area", "100.mW_per_cm2"),
    family(Dimension::AREA_RESISTANCE, "a resistance times area", "2.ohm_cm2"),
    family(Dimension::AREA_CONDUCTANCE, "a conductance per area", "25.mS_per_cm2"),
    family(Dimension::RESISTANCE, "a resistance", "100.ohm"),
    family(Dimension::RESISTIVITY, "a resistivity", "0.1.ohm_cm"),
    family(Dimension::CHARGE_DENSITY, "a charge per area", "1e-7.C_per_cm2"),
    family(Dimension::CAPACITANCE_DENSITY, "a capacitance per area", "50.nF_per_cm2"),
];

#[cfg(test)]
mod tests {
    use super::*;

    /// Source of truth: volt = watt per ampere, ohm = volt per ampere, siemens = one over ohm (SI brochure); exact.
    #[test]
    fn derived_units_are_consistent() {
        let ampere = dim(0, 0, 0, 1, 0);
        let watt = Dimension::ENERGY.over(Dimension::TIME).unwrap();
        assert_eq!(watt.over(ampere), Some(Dimension::VOLTAGE));
        assert_eq!(Dimension::VOLTAGE.over(ampere), Some(Dimension::RESISTANCE));
        assert_eq!(Dimension::RESISTANCE.times(Dimension::AREA), Some(Dimension::AREA_RESISTANCE));
        assert_eq!(Dimension::NONE.over(Dimension::AREA_RESISTANCE), Some(Dimension::AREA_CONDUCTANCE));
        assert_eq!(watt.over(Dimension::AREA), Some(Dimension::POWER_DENSITY));
        let field = Dimension::VOLTAGE.over(Dimension::LENGTH).unwrap();
        assert_eq!(field, Dimension::FIELD);
        assert_eq!(Dimension::VELOCITY.over(field), Some(Dimension::MOBILITY));
        assert_eq!(Dimension::ENERGY.over(Dimension::TEMPERATURE), Some(Dimension::ENERGY_PER_TEMPERATURE));
        let charge = ampere.times(Dimension::TIME).unwrap();
        assert_eq!(charge.over(Dimension::AREA), Some(Dimension::CHARGE_DENSITY));
        assert_eq!(Dimension::CHARGE_DENSITY.over(Dimension::VOLTAGE), Some(Dimension::CAPACITANCE_DENSITY));
        assert_eq!(Dimension::DENSITY.times(Dimension::RADIATIVE), Some(Dimension::FREQUENCY));
        assert_eq!(Dimension::RATE.over(Dimension::DENSITY.power(3.0).unwrap()), Some(Dimension::AUGER));
    }

    /// Source of truth: exponents are whole numbers; a square root of a length has none.
    #[test]
    fn a_power_needs_whole_exponents() {
        assert_eq!(Dimension::AREA.power(0.5), Some(Dimension::LENGTH));
        assert_eq!(Dimension::LENGTH.power(0.5), None);
        assert_eq!(Dimension::DENSITY.power(100.0), None);
    }

    /// Source of truth: reading back what was written.
    #[test]
    fn base_units_are_read_back() {
        for dimension in
            [Dimension::NONE, Dimension::RADIATIVE, Dimension::AREA_RESISTANCE, Dimension::TEMPERATURE]
        {
            assert_eq!(Dimension::of_base_units(&dimension.base_units()), Some(dimension));
        }
        assert_eq!(Dimension::of_base_units("furlong"), None);
    }
}
