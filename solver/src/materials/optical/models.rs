//! Which table serves which material, and where its edge lies.

use std::sync::{Arc, OnceLock};

use crate::math::{Num, Scalar};

use super::super::law::ROOM;
use super::super::library;
use super::super::record::{OpticalModel, Record};
use super::table::{Edge, Table};
use super::{IndirectTail, OpticalConstants, Shifted};

/// Slope of the Urbach tail of a direct edge, eV. From memory: about 7 meV in GaAs at room temperature.
const URBACH: f64 = 7e-3;
/// Absorption at a direct gap of a GaAs-like material, m^-1. From memory: about 8000 cm^-1 in GaAs.
const AT_GAP: f64 = 8e5;

/// The direct gap of AlGaAs rises faster than linearly above x = 0.45, by this times (x - 0.45)^2, eV.
/// H. C. Casey and M. B. Panish, Heterostructure Lasers (1978), from memory; it agrees with the onsets of the tables.
const STEEPER: (f64, f64) = (1.147, 0.45);

/// Strength of AlInP's indirect absorption, m^-1 eV^-2: illustrative, 1000 cm^-1 at 0.32 eV above the edge.
const INDIRECT: f64 = 1e6;

/// A table and the gap of its sample at the table's temperature, eV.
type Sample = (f64, Arc<Table>);

struct Tables {
    gaas: Sample,
    /// Composition and table.
    algaas: Vec<(f64, Sample)>,
    gainp: Sample,
    inp: Sample,
    gainas: Sample,
    si: Sample,
    ge: Sample,
}

/// Gap of the GaInP sample, eV: where its table passes 8000 cm^-1 (an ordered sample).
const GAINP_GAP: f64 = 1.8699;
/// Gap of the GaInAs model at x = 0.48, eV: the library's alloy law there.
const GAINAS_GAP: f64 = 0.748;

macro_rules! data {
    ($file:literal) => {
        include_str!(concat!("../data/", $file))
    };
}

const ALGAAS: [(f64, &str); 8] = [
    (0.099, data!("algaas_0099_aspnes.csv")),
    (0.198, data!("algaas_0198_aspnes.csv")),
    (0.315, data!("algaas_0315_aspnes.csv")),
    (0.419, data!("algaas_0419_aspnes.csv")),
    (0.491, data!("algaas_0491_aspnes.csv")),
    (0.590, data!("algaas_0590_aspnes.csv")),
    (0.700, data!("algaas_0700_aspnes.csv")),
    (0.804, data!("algaas_0804_aspnes.csv")),
];

/// Every data file but those of AlGaAs.
#[cfg(test)]
pub(super) const FILES: [(&str, &str); 11] = [
    ("GaAs", data!("gaas_jellison.csv")),
    ("InP", data!("inp_aspnes.csv")),
    ("GaInP", data!("gainp_schubert.csv")),
    ("InGaAs", data!("ingaas_adachi.csv")),
    ("Si", data!("si_green.csv")),
    ("Ge", data!("ge_nunley.csv")),
    ("GaAs", data!("gaas_index_ozaki.csv")),
    ("GaAs", data!("gaas_index_skauli.csv")),
    ("InP", data!("inp_index_adachi.csv")),
    ("InP", data!("inp_index_pettit.csv")),
    ("Si", data!("si_index_franta.csv")),
];
#[cfg(test)]
pub(super) const ALLOYS: [(f64, &str); 8] = ALGAAS;

/// Direct gap of the samples of the AlGaAs tables, eV: the law given with them, D. E. Aspnes et al., J. Appl. Phys. 60, 754
/// (1986), from memory; it agrees with the onsets of the tables.
fn sample_gap(x: f64) -> f64 {
    1.424 + 1.594 * x + x * (1.0 - x) * (0.127 - 1.310 * x)
}

fn all() -> &'static Tables {
    static TABLES: OnceLock<Tables> = OnceLock::new();
    TABLES.get_or_init(|| {
        let read = |text: &str| OpticalConstants::parse("", text);
        let edged = |text: &str, gap: f64, at_gap: f64, join: f64| {
            Table::with_edge(&read(text), Edge { gap, at_gap, join, urbach: URBACH })
        };
        let gap = |record: &Record| record.bands(0.0, ROOM).gap;
        let (of_gaas, of_inp) = (gap(&library::gaas::GAAS), gap(&library::inp::INP));
        let gaas = edged(data!("gaas_jellison.csv"), of_gaas, AT_GAP, 1.484)
            .with_index_of(&read(data!("gaas_index_ozaki.csv")))
            .with_index_of(&read(data!("gaas_index_skauli.csv")))
            .continued();
        let inp = edged(data!("inp_aspnes.csv"), of_inp, AT_GAP, 1.499)
            .with_index_of(&read(data!("inp_index_adachi.csv")))
            .with_index_of(&read(data!("inp_index_pettit.csv")));
        let si = Table::from_constants(&read(data!("si_green.csv")))
            .with_index_of(&read(data!("si_index_franta.csv")));
        let gainp = edged(data!("gainp_schubert.csv"), GAINP_GAP, 8.17e5, 1.875)
            .with_index_like(&gaas, GAINP_GAP / of_gaas);
        let ge = Table::from_constants(&read(data!("ge_nunley.csv")));
        let algaas = |&(x, text): &(f64, &str)| {
            let gap = sample_gap(x);
            let table = edged(text, gap, AT_GAP, gap + 0.015).with_index_like(&gaas, gap / of_gaas);
            (x, (gap, Arc::new(table.continued())))
        };
        Tables {
            algaas: ALGAAS.iter().map(algaas).collect(),
            gainp: (GAINP_GAP, Arc::new(gainp.continued())),
            inp: (of_inp, Arc::new(inp.continued())),
            gainas: (
                GAINAS_GAP,
                Arc::new(edged(data!("ingaas_adachi.csv"), GAINAS_GAP, 4.5e5, 0.81).continued()),
            ),
            si: (gap(&library::elemental::SI), Arc::new(si.continued())),
            ge: (gap(&library::elemental::GE), Arc::new(ge.continued())),
            gaas: (of_gaas, Arc::new(gaas)),
        }
    })
}

/// The direct gap that AlGaAs's absorption edge sits at, eV.
fn optical_gap<P: Num>(record: &Record, x: P, temperature: P) -> P {
    let above = (x - STEEPER.1).max(P::constant(0.0));
    record.minima.law[0].valley.energy(x, temperature) + above * above * STEEPER.0
}

/// Compositions of the AlGaAs tables that serve a composition.
pub(super) fn compositions(x: f64) -> Vec<f64> {
    let tables = all();
    let grid: Vec<f64> = std::iter::once(0.0).chain(tables.algaas.iter().map(|t| t.0)).collect();
    let above = grid.partition_point(|g| *g < x);
    match (grid.get(above), above.checked_sub(1).and_then(|i| grid.get(i))) {
        (Some(&here), _) if here == x => vec![here],
        (Some(&upper), Some(&lower)) => vec![lower, upper],
        (_, lower) => lower.copied().into_iter().collect(),
    }
}

/// The tables of a material at a composition and temperature, and an indirect tail; `moved` is what the script moved the gap by, eV.
pub(super) fn tables<P: Scalar>(
    record: &Record,
    x: P,
    temperature: P,
    moved: P,
) -> (Vec<Shifted<P>>, Option<IndirectTail<P>>) {
    let tables = all();
    let gap = record.bands(x, temperature).gap + moved;
    let whole = P::constant(1.0);
    let one = |(own, table): &Sample, gap: P| {
        vec![Shifted { table: table.clone(), shift: gap - *own, share: whole }]
    };
    match record.optics {
        OpticalModel::GaAs => (one(&tables.gaas, gap), None),
        OpticalModel::InP => (one(&tables.inp, gap), None),
        OpticalModel::GaInP => (one(&tables.gainp, gap), None),
        OpticalModel::GaInAs => (one(&tables.gainas, gap), None),
        OpticalModel::Si => (one(&tables.si, gap), None),
        OpticalModel::Ge => (one(&tables.ge, gap), None),
        OpticalModel::AlInP => {
            let direct = record.minima.law[0].valley.energy(x, temperature) + moved;
            (one(&tables.gainp, direct), Some(IndirectTail { strength: INDIRECT, edge: gap, until: None }))
        }
        OpticalModel::Phosphide => {
            let direct = record.minima.law[0].valley.energy(x, temperature) + moved;
            let tail = IndirectTail { strength: INDIRECT, edge: gap, until: Some(direct) };
            (one(&tables.gainp, direct), Some(tail))
        }
        OpticalModel::None => (Vec::new(), None),
        OpticalModel::AlGaAs => {
            let direct = optical_gap(record, x, temperature) + moved;
            let used = compositions(x.value());
            let shares = match used.as_slice() {
                [lower, upper] => {
                    let share = (x - *lower) * (1.0 / (upper - lower));
                    vec![-share + 1.0, share]
                }
                _ => vec![whole; used.len()],
            };
            let moved_tables = used
                .iter()
                .zip(shares)
                .map(|(&composition, share)| {
                    let alloy = tables.algaas.iter().find(|t| t.0 == composition);
                    let (own, table) = alloy.map_or(&tables.gaas, |t| &t.1);
                    Shifted { table: table.clone(), shift: direct - *own, share }
                })
                .collect();
            (moved_tables, None)
        }
    }
}
