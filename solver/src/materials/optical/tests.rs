//! Tests of absorption edges, tables and their derivatives.

use super::super::library::ALL;
use super::models::{ALLOYS, FILES};
use super::*;
use crate::math::Dual;

const NM: f64 = 1e-9;
/// m^-1 of 1 cm^-1.
const PER_CM: f64 = 100.0;

fn absorber(name: &str, x: Option<f64>, temperature: f64) -> Absorber<f64> {
    Material::library(name, x).absorber(None, temperature).expect(name)
}

/// Absorption in cm^-1 at a wavelength in nm.
fn at(a: &Absorber<f64>, nm: f64) -> f64 {
    a.at(nm * NM).coefficient / PER_CM
}

/// Wavelength, nm, at which the absorption passes a level, cm^-1, from strong to weak.
fn onset(a: &Absorber<f64>, level: f64) -> f64 {
    let mut nm = 300.0;
    while at(a, nm) > level {
        nm += 0.25;
    }
    nm
}

/// Source: the files themselves: every line that is neither a comment nor the column names is a row of three numbers.
#[test]
fn every_row_of_every_file_is_read() {
    let all = FILES.iter().map(|f| (f.0.to_string(), f.1));
    let alloys = ALLOYS.iter().map(|f| (f.0.to_string(), f.1));
    for (name, text) in all.chain(alloys) {
        let rows = text.lines().filter(|l| !l.starts_with('#')).count() - 1;
        let constants = OpticalConstants::parse(&name, text);
        assert!(rows >= 5, "{name}");
        assert_eq!(constants.wavelength.len(), rows, "{name}");
        assert!(constants.wavelength.windows(2).all(|w| w[0] < w[1]), "{name}");
        assert!(constants.n.iter().chain(&constants.k).all(|v| v.is_finite() && *v >= 0.0), "{name}");
        assert!(text.contains("# cite: ") && !constants.source.is_empty(), "{name}");
    }
}

/// Source: room-temperature gaps GaAs 1.42 eV (872 nm), InP 1.34 to 1.35 eV (918 to 925 nm), GaInAs 0.737 eV (1680 nm), by the
/// onset of strong absorption (4000 cm^-1); tolerance 1 % of the wavelength, the width of the edge.
#[test]
fn direct_edges_lie_at_their_gaps() {
    for (name, nm) in [("GaAs", 872.0), ("InP", 921.0), ("GaInAs", 1681.0)] {
        let found = onset(&absorber(name, None, 300.0), 4000.0);
        assert!((found / nm - 1.0).abs() < 0.01, "{name}: {found} nm");
    }
}

/// Source: silicon's published table: 64 cm^-1 at 1000 nm, about 3 cm^-1 at 1100 nm, 1.4e-8 of that well below the edge. It is far
/// weaker than GaAs in the visible, and within a factor 3 of it between 3.5 and 4.6 eV; bounds from the two tables.
#[test]
fn silicon_against_gallium_arsenide() {
    let (si, gaas) = (absorber("Si", None, 300.0), absorber("GaAs", None, 300.0));
    assert!((at(&si, 1000.0) / 64.0 - 1.0).abs() < 1e-3);
    assert!((1.0..6.0).contains(&at(&si, 1100.0)));
    assert!(at(&si, 1400.0) < 1e-6);
    for nm in [550.0, 650.0, 750.0, 850.0] {
        assert!(at(&gaas, nm) > 8.0 * at(&si, nm), "{nm} nm");
    }
    for ev in [3.5, 4.0, 4.5] {
        let ratio = at(&si, 1239.842 / ev) / at(&gaas, 1239.842 / ev);
        assert!((0.6..3.0).contains(&ratio), "{ev} eV: {ratio}");
    }
}

/// Source: what a direct gap means: nothing is absorbed 0.25 eV below it, whatever floor the tables leave there, and that is known.
#[test]
fn direct_materials_are_transparent_below_the_gap() {
    for record in ALL {
        if matches!(record.optics, OpticalModel::Si | OpticalModel::Ge | OpticalModel::None) {
            continue;
        }
        let compositions: Vec<Option<f64>> = match record.composition {
            Some(_) => [0.0, 0.05, 0.3, 0.45, 0.6, 0.8, 0.9, 1.0].into_iter().map(Some).collect(),
            None => vec![None],
        };
        for x in compositions {
            let material = Material::library(record.name, x);
            let gap = material.values(None, 300.0, 0.0).expect("valid").gap / ELEMENTARY_CHARGE;
            let a = material.absorber(None, 300.0).expect("valid");
            for below in [0.25, 0.4].into_iter().filter(|below| gap - below > 0.05) {
                let found = a.at(ENERGY_TIMES_WAVELENGTH / (gap - below));
                assert_eq!(found, Absorption { coefficient: 0.0, covered: true }, "{} {x:?}", record.name);
            }
            let above = a.at(ENERGY_TIMES_WAVELENGTH / (gap + 1.0));
            // Where the direct gap lies more than 1 eV above the indirect one, the tail alone reaches 1e6 m^-1 there.
            assert!(above.covered && above.coefficient > 0.99e6, "{} {x:?}: {above:?}", record.name);
        }
    }
}

/// Source: continuity: no step between the table, the linear edge and the Urbach tail. The steepest slope is the tail's, so
/// that over 1e-6 eV nothing may change by more than 1e-6 / 7e-3 of the absorption, here with a factor 2.
#[test]
fn edges_are_continuous() {
    for (name, x) in [
        ("GaAs", None),
        ("InP", None),
        ("GaInP", None),
        ("GaInAs", None),
        ("AlGaAs", Some(0.25)),
        ("AlInP", None),
    ] {
        let a = absorber(name, x, 310.0);
        let at = |ev: f64| a.at(ENERGY_TIMES_WAVELENGTH / ev).coefficient;
        let steps = 20_000;
        for i in 0..steps {
            let ev = 0.9 + 2.0 * f64::from(i) / f64::from(steps);
            let (one, two) = (at(ev), at(ev + 1e-6));
            // 1 m^-1: below it the tail is cut.
            assert!((one - two).abs() <= 3e-4 * one.max(two) + 1.0, "{name} at {ev} eV: {one} {two}");
        }
    }
}

/// Source: gaps shrink with temperature, so that at a fixed wavelength near the edge absorption grows, and the onset moves by
/// the change of the gap alone: tolerance the 0.25 nm of the search.
#[test]
fn edges_move_with_temperature() {
    for (name, x, nm) in [
        ("GaAs", None, 880.0),
        ("InP", None, 930.0),
        ("Si", None, 1100.0),
        ("Ge", None, 1650.0),
        ("AlGaAs", Some(0.3), 695.0),
    ] {
        let found: Vec<f64> =
            [200.0, 250.0, 300.0, 350.0, 400.0].iter().map(|t| at(&absorber(name, x, *t), nm)).collect();
        assert!(found.windows(2).all(|w| w[0] < w[1]), "{name}: {found:?}");
    }
    let gap = |t: f64| {
        Material::<f64>::library("GaAs", None).values(None, t, 0.0).expect("valid").gap / ELEMENTARY_CHARGE
    };
    let (cold, hot) =
        (onset(&absorber("GaAs", None, 250.0), 4000.0), onset(&absorber("GaAs", None, 350.0), 4000.0));
    let moved = 1239.842 / cold - 1239.842 / hot;
    assert!((moved - (gap(250.0) - gap(350.0))).abs() < 2.0 * 0.25 / 870.0 * 1.43, "{moved}");
}

/// Source: the rule that the edge sits at the library's direct gap (tolerance 10 meV, an edge's width), and the published tables
/// where the composition is a table's own.
#[test]
fn algaas_between_its_tables() {
    for x in [0.2, 0.25, 0.3] {
        let a = absorber("AlGaAs", Some(x), 300.0);
        let gap = 1.42248 + 1.247 * x;
        let found = 1239.842 / onset(&a, 4000.0);
        assert!((found - gap).abs() < 0.01, "x = {x}: {found} against {gap} eV");
    }
    let (zero, gaas) = (absorber("AlGaAs", Some(0.0), 320.0), absorber("GaAs", None, 320.0));
    for nm in [400.0, 700.0, 860.0, 880.0] {
        assert_eq!(at(&zero, nm).to_bits(), at(&gaas, nm).to_bits());
    }
    // The table at x = 0.804 has 27400 cm^-1 at 2.600 eV and 3294 at 2.500 eV; the library's direct gap lies 9 meV above the
    // sample's, which is 17 % there.
    let window = at(&absorber("AlGaAs", Some(0.804), 300.0), 476.9);
    assert!((window / 27400.0 - 1.0).abs() < 0.2, "{window}");
    let basis = |x: f64| Material::library("AlGaAs", Some(x)).absorption_basis(None).0;
    assert_eq!(basis(0.3), AbsorptionBasis::BetweenTables { compositions: vec![0.198, 0.315] });
    assert_eq!(basis(0.9), AbsorptionBasis::BetweenTables { compositions: vec![0.804] });
    assert_eq!(basis(0.198), AbsorptionBasis::Table);
}

/// Source: tables end: silicon's at 250 nm, GaAs's at 234 nm. Before, a coefficient is 0 and not covered. Silicon's other end, at
/// 1450 nm, lies deep in transparency (1e-8 cm^-1): beyond it is transparent, and known to be.
#[test]
fn outside_its_table_nothing_is_extrapolated() {
    let si = absorber("Si", None, 298.15);
    assert_eq!(si.at(240.0 * NM), Absorption { coefficient: 0.0, covered: false });
    for a in [&si, &absorber("Ge", None, 298.15)] {
        for nm in [2485.0, 4000.0] {
            assert_eq!(a.at(nm * NM), Absorption { coefficient: 0.0, covered: true });
        }
    }
    assert!(si.at(250.5 * NM).covered && si.at(1449.0 * NM).covered);
    assert!(!absorber("GaAs", None, 298.15).at(230.0 * NM).covered);
    let gaas = absorber("GaAs", None, 298.15);
    let red = gaas.refraction(1100.0 * NM).expect("a table");
    assert!(red.covered && red.k == 0.0 && (3.45..3.48).contains(&red.n), "{red:?}");
    // Jellison's row at 600 nm; the gap moves by 0.8 meV from 300 K.
    let orange = Material::<f64>::library("GaAs", None).refraction(None, 300.0, 600.0 * NM);
    let orange = orange.expect("valid").expect("a table");
    assert!(
        (3.8..4.0).contains(&orange.n) && (0.19..0.23).contains(&orange.k) && orange.covered,
        "{orange:?}"
    );
}

/// Source: published refractive indices that the library does not hold: AlGaAs of x = 0.219, 0.342, 0.452 at 1000, 1500 and 1878
/// nm, K. Papatryfonos et al., AIP Adv. 11, 025327 (2021), to 2.5 % (0.03 in a reflectance of a coated cell is less than
/// 0.5 % of it, and all of that light lies below the gaps of the usual cells); germanium's 4.02 to 4.03 at 4 um, from memory.
/// Everywhere an index goes on without a step, and falls with wavelength below the gap.
#[test]
fn indices_go_on_beyond_their_tables() {
    let n = |name: &str, x: Option<f64>, nm: f64| {
        let found =
            Material::<f64>::library(name, x).refraction(None, 300.0, nm * NM).expect(name).expect(name);
        assert!(found.covered, "{name} at {nm} nm");
        found.n
    };
    for (x, published) in [
        (0.219, [3.3724, 3.293, 3.2758]),
        (0.342, [3.3137, 3.2223, 3.1969]),
        (0.452, [3.2405, 3.1543, 3.1292]),
    ] {
        for (nm, expected) in [1000.0, 1500.0, 1878.0].into_iter().zip(published) {
            let found = n("AlGaAs", Some(x), nm);
            assert!((found / expected - 1.0).abs() < 0.025, "x = {x} at {nm} nm: {found} against {expected}");
        }
    }
    assert!((n("Ge", None, 4000.0) - 4.025).abs() < 0.01);
    let all =
        [("GaAs", None, 900.0), ("InP", None, 940.0), ("GaInP", None, 700.0), ("AlGaAs", Some(0.3), 720.0)];
    for (name, x, gap) in
        all.into_iter().chain([("GaInAs", None, 1750.0), ("Si", None, 1200.0), ("AlInP", None, 600.0)])
    {
        let mut before = n(name, x, 700.0);
        for nm in 701..4100 {
            let here = n(name, x, f64::from(nm));
            // Measured rows scatter by 0.01; the steepest true slope is that of the gap, 0.002 a nanometre.
            assert!((here - before).abs() < 0.02, "{name} at {nm} nm: {before} {here}");
            assert!(
                f64::from(nm) < gap + 20.0 || here < before + 0.004,
                "{name} at {nm} nm: {before} {here}"
            );
            before = here;
        }
    }
}

/// Source: the rules for a number, a user's table and a gap set by the script.
#[test]
fn what_a_script_sets_goes_before_the_library() {
    let mut material = Material::<f64>::library("GaAs", None);
    material.overrides.insert(Parameter::Gap, 1.5 * ELEMENTARY_CHARGE);
    let moved = onset(&material.absorber(None, 300.0).expect("valid"), 4000.0);
    assert!((1239.842 / moved - 1.5).abs() < 0.01);
    material.optical = Some(Arc::new(OpticalConstants {
        name: "own".into(),
        source: "own".into(),
        wavelength: vec![400.0 * NM, 500.0 * NM],
        n: vec![3.0, 3.2],
        k: vec![0.1, 0.05],
    }));
    let own = material.absorber(None, 250.0).expect("valid");
    let expected = 4.0 * std::f64::consts::PI * 0.05 / (500.0 * NM);
    assert!((own.at(500.0 * NM).coefficient / expected - 1.0).abs() < 1e-14);
    assert!(!own.at(501.0 * NM).covered);
    material.overrides.insert(Parameter::Absorption, 1e6);
    let number = material.absorber(None, 250.0).expect("valid");
    assert_eq!(number.at(820.0 * NM).coefficient, 1e6);
    assert_eq!(number.at(830.0 * NM), Absorption { coefficient: 0.0, covered: true });
}

/// Source: central differences in composition and temperature; tolerance their h^2 error and rounding at h = 1e-6.
#[test]
fn derivatives_agree_with_differences() {
    let h = 1e-6;
    for nm in [450.0, 600.0, 680.0, 690.0, 695.0, 700.0] {
        let material = Material::library("AlGaAs", Some(Dual::<f64, 2>::variable(0.3, 0)));
        let dual = material.absorption(None, Dual::variable(300.0, 1), nm * NM).expect("valid").coefficient;
        let value = |x: f64, t: f64| absorber("AlGaAs", Some(x), t).at(nm * NM).coefficient;
        let (in_x, in_t) = (
            (value(0.3 + h, 300.0) - value(0.3 - h, 300.0)) / (2.0 * h),
            (value(0.3, 300.0 + 1e-3) - value(0.3, 300.0 - 1e-3)) / 2e-3,
        );
        assert_eq!(dual.re.to_bits(), value(0.3, 300.0).to_bits());
        for (found, difference, scale) in [(dual.d[0], in_x, dual.re), (dual.d[1], in_t, 1e-3 * dual.re)] {
            assert!(
                (found - difference).abs() < 1e-5 * (difference.abs() + scale),
                "{nm}: {found} {difference}"
            );
        }
    }
}

/// Source: two ways to the same bits: many wavelengths at once and one by one, in either order.
#[test]
fn spectra_equal_single_wavelengths() {
    let a = absorber("AlGaAs", Some(0.3), 298.15);
    let up: Vec<f64> = (0..2000).map(|i| (280.0 + 0.4 * f64::from(i)) * NM).collect();
    let down: Vec<f64> = up.iter().rev().copied().collect();
    for wavelengths in [&up, &down] {
        for (w, found) in wavelengths.iter().zip(a.spectrum(wavelengths)) {
            assert_eq!(found, a.at(*w));
        }
    }
}

/// Source: two ways to one substance: alloys of variable composition at their matched points absorb as the matched ones do,
/// within the indirect tails that they add (below 3 % of the table above the direct gap), and an alloy's edge sits at its gap.
#[test]
fn alloys_absorb_as_their_matched_points() {
    let at = |name: &str, x: Option<f64>, ev: f64| {
        let found =
            Material::library(name, x).absorption(None, 300.0, ENERGY_TIMES_WAVELENGTH / ev).expect(name);
        found.coefficient
    };
    for (name, x, from) in [("GaInP", 0.51, 1.95), ("GaInAs", 0.47, 0.8)] {
        for step in 0..10 {
            let ev = from + 0.1 * f64::from(step);
            let (matched, alloy) = (at(name, None, ev), at(name, Some(x), ev));
            assert!((alloy / matched - 1.0).abs() < 0.03, "{name} {ev} eV: {matched:e} {alloy:e}");
        }
    }
    // AlGaInP at 0.3: the direct gap lies 0.17 eV above GaInP's; a tenth of an eV below its edge there is nothing.
    let gap = Material::library("AlGaInP", Some(0.3)).values(None, 300.0, 0.0).expect("valid").gap
        / ELEMENTARY_CHARGE;
    assert!((2.02..2.12).contains(&gap), "{gap}");
    assert!(at("AlGaInP", Some(0.3), gap - 0.25) < 1e-3 * at("AlGaInP", Some(0.3), gap + 0.05));
    assert!((at("AlGaInP", Some(0.3), gap + 0.05) / at("GaInP", None, 1.9168 + 0.05) - 1.0).abs() < 0.05);
}
