//! The one table of units: it drives the properties on numbers, the constants, `--set`, suggestions, display and the reference page.

use epiloom_solver::quantity::constants::ELEMENTARY_CHARGE;

use super::dimension::Dimension;

/// How a number in a unit becomes a number in SI.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Scale {
    /// Multiply.
    Times(f64),
    /// Divide: exact for sub-SI units, where multiplying by 1e-9 would not be.
    Over(f64),
}

/// A unit as scripts spell it.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Unit {
    /// Its spelling in scripts, in `--set` and in column names.
    pub name: &'static str,
    /// How it is printed.
    pub symbol: &'static str,
    /// From a number in this unit to SI.
    pub scale: Scale,
    /// Its dimension.
    pub dimension: Dimension,
    /// What it is called.
    pub words: &'static str,
}

impl Unit {
    /// SI value of `number` in this unit.
    pub fn to_si(&self, number: f64) -> f64 {
        match self.scale {
            Scale::Times(factor) => number * factor,
            Scale::Over(divisor) => number / divisor,
        }
    }

    /// Number in this unit of an SI value.
    pub fn from_si(&self, value: f64) -> f64 {
        match self.scale {
            Scale::Times(factor) => value / factor,
            Scale::Over(divisor) => value * divisor,
        }
    }

    /// The number in this unit that a person types for an SI value: of those that give the value again to the bit, the
    /// one with the fewest digits; [`from_si`](Unit::from_si) where none does.
    ///
    /// Conversion to SI and back may end a step or two beside the number that was typed.
    pub fn typed(&self, value: f64) -> f64 {
        let near = self.from_si(value);
        let same = |number: &f64| self.to_si(*number).to_bits() == value.to_bits();
        let length = |number: &f64| format!("{number:e}").len();
        if same(&near) && length(&near) <= FEW_DIGITS {
            return near;
        }
        let (up, down) = (near.next_up(), near.next_down());
        let around = [near, up, down, up.next_up(), down.next_down()];
        around.into_iter().filter(same).min_by_key(length).unwrap_or(near)
    }
}

/// Letters of a number as `1.25e17` up to which no shorter one is looked for.
const FEW_DIGITS: usize = 12;

macro_rules! units {
    ($($name:literal $symbol:literal $scale:expr, $dimension:ident, $words:literal;)*) => {
        /// Every unit, in the order of the reference page.
        pub const UNITS: &[Unit] = &[$(Unit {
            name: $name, symbol: $symbol, scale: $scale, dimension: Dimension::$dimension, words: $words,
        },)*];
    };
}

use Scale::{Over, Times};

units! {
    "nm" "nm" Over(1e9), LENGTH, "nanometre";
    "um" "um" Over(1e6), LENGTH, "micrometre";
    "mm" "mm" Over(1e3), LENGTH, "millimetre";
    "cm" "cm" Over(1e2), LENGTH, "centimetre";
    "m" "m" Times(1.0), LENGTH, "metre";
    "mm2" "mm2" Over(1e6), AREA, "square millimetre";
    "cm2" "cm2" Over(1e4), AREA, "square centimetre";
    "m2" "m2" Times(1.0), AREA, "square metre";
    "per_cm" "cm^-1" Times(1e2), INVERSE_LENGTH, "per centimetre";
    "per_um" "um^-1" Times(1e6), INVERSE_LENGTH, "per micrometre";
    "per_m" "m^-1" Times(1.0), INVERSE_LENGTH, "per metre";
    "per_cm2" "cm^-2" Times(1e4), AREAL_DENSITY, "per square centimetre";
    "per_m2" "m^-2" Times(1.0), AREAL_DENSITY, "per square metre";
    "per_cm3" "cm^-3" Times(1e6), DENSITY, "per cubic centimetre";
    "per_m3" "m^-3" Times(1.0), DENSITY, "per cubic metre";
    "per_cm2_s" "cm^-2 s^-1" Times(1e4), FLUX, "per square centimetre and second";
    "per_m2_s" "m^-2 s^-1" Times(1.0), FLUX, "per square metre and second";
    "per_cm3_s" "cm^-3 s^-1" Times(1e6), RATE, "per cubic centimetre and second";
    "per_m3_s" "m^-3 s^-1" Times(1.0), RATE, "per cubic metre and second";
    "ps" "ps" Over(1e12), TIME, "picosecond";
    "ns" "ns" Over(1e9), TIME, "nanosecond";
    "us" "us" Over(1e6), TIME, "microsecond";
    "ms" "ms" Over(1e3), TIME, "millisecond";
    "s" "s" Times(1.0), TIME, "second";
    "per_s" "s^-1" Times(1.0), FREQUENCY, "per second";
    "cm_per_s" "cm/s" Over(1e2), VELOCITY, "centimetre per second";
    "m_per_s" "m/s" Times(1.0), VELOCITY, "metre per second";
    "meV" "meV" Times(ELEMENTARY_CHARGE / 1e3), ENERGY, "millielectronvolt";
    "eV" "eV" Times(ELEMENTARY_CHARGE), ENERGY, "electronvolt";
    "J" "J" Times(1.0), ENERGY, "joule";
    "mV" "mV" Over(1e3), VOLTAGE, "millivolt";
    "V" "V" Times(1.0), VOLTAGE, "volt";
    "K" "K" Times(1.0), TEMPERATURE, "kelvin";
    "meV_per_K" "meV/K" Times(ELEMENTARY_CHARGE / 1e3), ENERGY_PER_TEMPERATURE, "millielectronvolt per kelvin";
    "eV_per_K" "eV/K" Times(ELEMENTARY_CHARGE), ENERGY_PER_TEMPERATURE, "electronvolt per kelvin";
    "V_per_cm" "V/cm" Times(1e2), FIELD, "volt per centimetre";
    "kV_per_cm" "kV/cm" Times(1e5), FIELD, "kilovolt per centimetre";
    "V_per_m" "V/m" Times(1.0), FIELD, "volt per metre";
    "cm2_per_Vs" "cm2/Vs" Over(1e4), MOBILITY, "square centimetre per volt and second";
    "m2_per_Vs" "m2/Vs" Times(1.0), MOBILITY, "square metre per volt and second";
    "cm2_per_s" "cm2/s" Over(1e4), DIFFUSION, "square centimetre per second";
    "m2_per_s" "m2/s" Times(1.0), DIFFUSION, "square metre per second";
    "cm3_per_s" "cm3/s" Over(1e6), RADIATIVE, "cubic centimetre per second";
    "m3_per_s" "m3/s" Times(1.0), RADIATIVE, "cubic metre per second";
    "cm6_per_s" "cm6/s" Over(1e12), AUGER, "centimetre to the sixth per second";
    "m6_per_s" "m6/s" Times(1.0), AUGER, "metre to the sixth per second";
    "nA_per_cm2" "nA/cm2" Over(1e5), CURRENT_DENSITY, "nanoampere per square centimetre";
    "uA_per_cm2" "uA/cm2" Over(1e2), CURRENT_DENSITY, "microampere per square centimetre";
    "mA_per_cm2" "mA/cm2" Times(1e1), CURRENT_DENSITY, "milliampere per square centimetre";
    "A_per_cm2" "A/cm2" Times(1e4), CURRENT_DENSITY, "ampere per square centimetre";
    "A_per_m2" "A/m2" Times(1.0), CURRENT_DENSITY, "ampere per square metre";
    "mW_per_cm2" "mW/cm2" Times(1e1), POWER_DENSITY, "milliwatt per square centimetre";
    "W_per_cm2" "W/cm2" Times(1e4), POWER_DENSITY, "watt per square centimetre";
    "W_per_m2" "W/m2" Times(1.0), POWER_DENSITY, "watt per square metre";
    "ohm_cm2" "ohm cm2" Over(1e4), AREA_RESISTANCE, "ohm times square centimetre";
    "ohm_m2" "ohm m2" Times(1.0), AREA_RESISTANCE, "ohm times square metre";
    "mS_per_cm2" "mS/cm2" Times(1e1), AREA_CONDUCTANCE, "millisiemens per square centimetre";
    "S_per_cm2" "S/cm2" Times(1e4), AREA_CONDUCTANCE, "siemens per square centimetre";
    "S_per_m2" "S/m2" Times(1.0), AREA_CONDUCTANCE, "siemens per square metre";
    "ohm" "ohm" Times(1.0), RESISTANCE, "ohm; of a sheet, per square";
    "ohm_cm" "ohm cm" Over(1e2), RESISTIVITY, "ohm times centimetre";
    "C_per_cm2" "C/cm2" Times(1e4), CHARGE_DENSITY, "coulomb per square centimetre";
    "nF_per_cm2" "nF/cm2" Over(1e5), CAPACITANCE_DENSITY, "nanofarad per square centimetre";
    "percent" "%" Over(1e2), NONE, "one hundredth";
    "suns" "suns" Times(1.0), NONE, "concentration, times one sun";
}

/// The unit of this spelling.
pub fn unit(name: &str) -> Option<&'static Unit> {
    UNITS.iter().find(|u| u.name == name)
}

/// The unit that a value without a unit of its own is printed in, if its dimension has a family.
pub fn default_unit(dimension: Dimension, value: f64) -> Option<&'static Unit> {
    let size = value.abs();
    let name = match dimension {
        Dimension::LENGTH if size < 1e-6 => "nm",
        Dimension::LENGTH if size < 1e-3 => "um",
        Dimension::LENGTH => "mm",
        Dimension::AREA => "cm2",
        Dimension::TIME if size < 1e-9 => "ps",
        Dimension::TIME if size < 1e-6 => "ns",
        Dimension::TIME if size < 1e-3 => "us",
        Dimension::TIME if size < 1.0 => "ms",
        Dimension::TIME => "s",
        Dimension::ENERGY => "eV",
        Dimension::VOLTAGE => "V",
        Dimension::CURRENT_DENSITY => "mA_per_cm2",
        Dimension::FIELD => "kV_per_cm",
        Dimension::NONE => return None,
        _ => return UNITS.iter().find(|u| u.dimension == dimension),
    };
    unit(name)
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Source of truth: the definition of each unit; decimal literals in SI must come out to the bit.
    #[test]
    fn sub_si_units_divide_and_keep_every_bit() {
        assert_eq!(unit("nm").unwrap().to_si(500.0), 5e-7);
        assert_eq!(unit("ps").unwrap().to_si(7.0), 7e-12);
        assert_eq!(unit("cm6_per_s").unwrap().to_si(7e-30), 7e-42);
        assert_eq!(unit("per_cm3").unwrap().to_si(2e17), 2e23);
        assert_eq!(unit("mA_per_cm2").unwrap().to_si(28.0), 280.0);
        assert_eq!(unit("mS_per_cm2").unwrap().to_si(25.0), 250.0);
        assert_eq!(unit("nF_per_cm2").unwrap().to_si(50.0), 5e-4);
        assert_eq!(unit("percent").unwrap().to_si(5.0), 0.05);
    }

    /// Source of truth: the number that was typed, to the bit, for decades and for numbers of three digits in every unit; 1e23,
    /// which is no number of the machine, is the SI value of 1e17 per cubic centimetre.
    #[test]
    fn what_was_typed_comes_back_from_si() {
        for u in UNITS {
            let numbers = (-8..=20).flat_map(|power| {
                ["1", "2.5", "3", "7.77"].map(|digits| format!("{digits}e{power}").parse::<f64>().unwrap())
            });
            for number in numbers {
                assert_eq!(u.typed(u.to_si(number)).to_bits(), number.to_bits(), "{number} {}", u.name);
            }
        }
        let density = unit("per_cm3").unwrap();
        assert_ne!(density.from_si(density.to_si(1e17)), 1e17, "the plain way back loses it");
        // a value that no number gives: the plain way back
        let between = density.to_si(1e17).next_up();
        assert!(
            density.to_si(density.typed(between)) == between
                || density.typed(between) == density.from_si(between)
        );
    }

    /// Source of truth: a table needs unique names, and every family its default unit.
    #[test]
    fn names_are_unique_and_every_dimension_has_a_default() {
        for (index, u) in UNITS.iter().enumerate() {
            assert!(UNITS[..index].iter().all(|other| other.name != u.name), "{} twice", u.name);
            if !u.dimension.is_none() {
                let shown = default_unit(u.dimension, u.to_si(1.0)).expect(u.name);
                assert_eq!(shown.dimension, u.dimension, "{}", u.name);
            }
        }
        assert_eq!(default_unit(Dimension::VOLTAGE, 1.0).unwrap().name, "V");
        assert_eq!(default_unit(Dimension::DENSITY, 1.0).unwrap().name, "per_cm3");
        assert_eq!(default_unit(Dimension::CURRENT_DENSITY, 1.0).unwrap().name, "mA_per_cm2");
        assert_eq!(default_unit(Dimension::MOBILITY, 1.0).unwrap().name, "cm2_per_Vs");
        assert_eq!(default_unit(Dimension::LENGTH, 30e-9).unwrap().name, "nm");
    }
}
