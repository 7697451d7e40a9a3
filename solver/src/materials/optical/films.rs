//! Optical constants of substances that coatings are made of, as tables, by name.

use super::OpticalConstants;

/// Name and table, in the order of listings. A table ends where its source does; films use its end values beyond.
const FILMS: [(&str, &str); 6] = [
    ("Al2O3", include_str!("../data/al2o3_malitson.csv")),
    ("MgF2", include_str!("../data/mgf2_dodge.csv")),
    ("Si3N4", include_str!("../data/si3n4_vogt.csv")),
    ("SiO2", include_str!("../data/sio2_malitson.csv")),
    ("TiO2", include_str!("../data/tio2_siefke.csv")),
    ("ZnS", include_str!("../data/zns_querry.csv")),
];

/// Names of the substances whose tables are built in.
pub fn film_names() -> impl Iterator<Item = &'static str> + Clone {
    FILMS.iter().map(|(name, _)| *name)
}

/// The built-in optical constants of a substance for coatings; `None` for a name that is not among [`film_names`].
pub fn film_constants(name: &str) -> Option<OpticalConstants> {
    FILMS.iter().find(|(known, _)| *known == name).map(|(known, text)| OpticalConstants::parse(known, text))
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Source of truth: the files themselves: no row is lost, wavelengths increase, each file names its source.
    #[test]
    fn film_tables_are_whole_and_cited() {
        for (name, text) in FILMS {
            let constants = film_constants(name).expect("a name of the table");
            let rows = text.lines().filter(|line| !line.starts_with('#')).count() - 1;
            assert_eq!(constants.wavelength.len(), rows, "{name}");
            assert!(constants.wavelength.windows(2).all(|w| w[0] < w[1]), "{name}");
            assert!(constants.n.iter().all(|n| (1.0..4.0).contains(n)), "{name}");
            assert!(constants.k.iter().all(|k| *k >= 0.0), "{name}");
            assert!(!constants.source.is_empty(), "{name}");
        }
    }

    /// Source of truth: refractive indices in the visible that any optics handbook gives, to the second digit, from memory.
    #[test]
    fn indices_in_the_visible_are_the_familiar_ones() {
        for (name, index, within) in [
            ("MgF2", 1.38, 0.01),
            ("SiO2", 1.46, 0.01),
            ("Al2O3", 1.77, 0.01),
            ("ZnS", 2.36, 0.05),
            ("TiO2", 2.4, 0.15),
            ("Si3N4", 2.1, 0.1),
        ] {
            let constants = film_constants(name).expect("a name of the table");
            let at = constants.wavelength.iter().position(|w| *w >= 589e-9).expect("589 nm is covered");
            assert!((constants.n[at] - index).abs() < within, "{name}: {}", constants.n[at]);
        }
    }
}
