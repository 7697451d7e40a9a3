//! What became of a device: its own bias point, and everything about it that can be derived again from what it shows.

use std::panic::{AssertUnwindSafe, catch_unwind};

use epiloom_solver::analysis::{AnalysisError, BiasPoint, Figure, LedgerPart, bias_point};
use epiloom_solver::device::{Device, Stack};
use epiloom_solver::math::elementary;
use epiloom_solver::optics::Light;
use epiloom_solver::quantity::constants::{BOLTZMANN, ELEMENTARY_CHARGE};

use super::specimen::specimen;

/// How it ended.
#[derive(Clone, Debug, PartialEq)]
pub enum Ending {
    /// Solved, and all that was derived again agrees.
    Sound,
    /// Solved, with an account beyond its bound that the program itself warns of.
    Warned(Vec<String>),
    /// Solved, and something disagrees that no warning tells.
    Wrong(Vec<String>),
    /// Not solved, with a diagnosis: equation, layer, depth, voltage.
    Unsolved(String),
    /// Refused or not solved without one.
    Undiagnosed(String),
    /// Panicked.
    Panicked,
}

/// What became of a specimen.
#[derive(Clone, Debug)]
pub struct Verdict {
    /// Its seed.
    pub seed: u64,
    /// How it ended.
    pub ending: Ending,
    /// Newton iterations on all meshes.
    pub newton: usize,
    /// The meshes' own values against each other: how far they differ over the error stated, where both are known.
    pub disagreement: Option<f64>,
}

/// More Newton iterations than this on all meshes: hung.
pub const HUNG: usize = 400_000;

/// One carrier per square metre and second, A/m2: what is less is nothing.
const NOTHING: f64 = ELEMENTARY_CHARGE;

/// Solves a specimen and looks at the result.
pub fn examine(seed: u64) -> Verdict {
    let (mut stack, light, voltage) = specimen(seed);
    // Three meshes serve: what is looked at are the accounts, not the last digits.
    stack.accuracy = 1e-3;
    catch_unwind(AssertUnwindSafe(|| examined(seed, stack, &light, voltage))).unwrap_or(Verdict {
        seed,
        ending: Ending::Panicked,
        newton: 0,
        disagreement: None,
    })
}

fn examined(seed: u64, stack: Stack, light: &Light, voltage: f64) -> Verdict {
    let without = |ending| Verdict { seed, ending, newton: 0, disagreement: None };
    let device = match Device::new(stack) {
        Ok(device) => device,
        Err(faults) => return without(Ending::Undiagnosed(format!("refused: {faults:?}"))),
    };
    match bias_point(&device, light, voltage) {
        Ok(point) => {
            let mut wrong = accounts(&device, light, voltage, &point);
            let disagreement = disagreement(&point);
            if let Some(factor) = disagreement.filter(|factor| *factor > 10.0) {
                wrong.push(format!("meshes differ by {factor:.1} times the error stated"));
            }
            let warned = point.warnings.iter().any(|w| w.code == "W312");
            let ending = match (wrong.is_empty(), warned) {
                (true, false) => Ending::Sound,
                (_, true) => Ending::Warned(wrong),
                (false, false) => Ending::Wrong(wrong),
            };
            Verdict { seed, ending, newton: point.counts.newton_iterations, disagreement }
        }
        Err(error) => match &error {
            AnalysisError::NotConverged { layer, depth_nm, equation, voltage, .. }
                if !layer.is_empty()
                    && depth_nm.is_finite()
                    && !equation.is_empty()
                    && voltage.is_finite() =>
            {
                without(Ending::Unsolved(error.to_string()))
            }
            other => without(Ending::Undiagnosed(other.to_string())),
        },
    }
}

/// How far the value stated without the finest mesh is off the value stated with it, over the two errors stated; none where
/// the current is nothing beside the turnover.
fn disagreement(point: &BiasPoint) -> Option<f64> {
    let fine = &point.current_density;
    let coarse = Figure::from_levels(fine.levels[..fine.levels.len() - 1].to_vec());
    let rounding = 1e-12 * turnover(point) + NOTHING;
    let stated = coarse.error + fine.error + rounding;
    Some((coarse.value - fine.value).abs() / stated).filter(|factor| factor.is_finite())
}

/// Sum of what is generated and of what recombines, A/m2.
fn turnover(point: &BiasPoint) -> f64 {
    point.ledger.part(LedgerPart::Carriers).map(|line| line.value.abs()).sum()
}

/// What the accounts, derived again from the profiles, have to say against the point.
fn accounts(device: &Device, light: &Light, voltage: f64, point: &BiasPoint) -> Vec<String> {
    let mut wrong = Vec::new();
    let mut require = |holds: bool, what: &dyn Fn() -> String| {
        if !holds {
            wrong.push(what());
        }
    };
    let stack = device.stack();
    let p = &point.profiles;
    let entries = p.depth.len();
    let all = [&p.potential, &p.electron_level, &p.hole_level, &p.electrons, &p.holes, &p.electron_current];
    require(
        all.iter().all(|list| list.iter().all(|x| x.is_finite())) && point.own_current_density.is_finite(),
        &|| "something is not finite".to_string(),
    );
    require(p.electrons.iter().chain(&p.holes).all(|n| *n >= 0.0), &|| "a density is negative".to_string());
    let turnover = turnover(point);

    // The voltage asked for: the levels at the two contacts are it, inside the series resistance.
    let series = stack.circuit.series_resistance;
    let terminal = point.junction_voltage + series * point.own_current_density;
    let fine = 1e-9 + 1e-9 * (series * point.own_current_density).abs();
    require((terminal - voltage).abs() <= fine, &|| format!("asked for {voltage} V, got {terminal} V"));

    // No power from the dark.
    let own = point.own_current_density;
    let dark = matches!(light, Light::Dark);
    require(!dark || own * voltage >= 0.0 || own.abs() <= 1e-12 * turnover + NOTHING, &|| {
        format!("power from the dark: {own:e} A/m2 at {voltage} V")
    });

    // The same current at every depth: the sum of both carriers' at every entry.
    let shunt = stack.circuit.shunt_resistance.map_or(0.0, |r| point.junction_voltage / r);
    let kt = BOLTZMANN * stack.temperature;
    let diode = stack.circuit.second_diode.map_or(0.0, |diode| {
        let exponent = point.junction_voltage * ELEMENTARY_CHARGE / (diode.ideality * kt);
        diode.saturation_current_density * elementary::exp_m1(exponent)
    });
    let through = own - shunt - diode;
    let mut worst = (0.0, 0, 0.0);
    for e in 0..entries {
        let (n, h) = (p.electron_current[e], p.hole_current[e]);
        let energies = p.conduction_band[e].abs()
            + p.valence_band[e].abs()
            + p.electron_level[e].abs()
            + p.hole_level[e].abs();
        let rounding = 64.0 * f64::EPSILON * (energies / kt) * (n.abs() + h.abs());
        // What the circuit takes is subtracted from the terminal current.
        let beside = 1e-12 * own.abs();
        let allowed = 1e-7 * through.abs() + rounding + beside + 1e-12 * turnover + NOTHING;
        let over = (n + h - through).abs() / allowed;
        if over > worst.0 {
            worst = (over, e, n + h);
        }
    }
    require(worst.0 <= 1.0, &|| {
        let (over, e, here) = worst;
        format!(
            "{here:e} A/m2 at entry {e} of {entries} for {through:e}: {over:.1e} times what rounding allows"
        )
    });

    // Generation and recombination, integrated again over the control volumes, against the ledger's lines.
    let volumes = volumes(point);
    let mut sums = vec![[0.0; 4]; stack.layers.len()];
    for (e, volume) in volumes.iter().enumerate() {
        let rates = [p.generation[e], p.shockley_read_hall[e], p.radiative[e], p.auger[e]];
        for (sum, rate) in sums[p.layer[e]].iter_mut().zip(rates) {
            *sum += rate * volume * ELEMENTARY_CHARGE;
        }
    }
    let lines: Vec<_> = point.ledger.part(LedgerPart::Carriers).collect();
    for (layer, sums) in stack.layers.iter().zip(&sums) {
        for (channel, sum) in ["generation", "Shockley-Read-Hall", "radiative", "Auger"].iter().zip(sums) {
            let line = lines.iter().find(|line| line.place == layer.name && line.channel == *channel);
            let value = line.map_or(f64::NAN, |line| line.value);
            let close = (value - sum).abs() <= 1e-9 * sum.abs() + 1e-13 * turnover + NOTHING;
            require(close, &|| {
                format!("{} of {}: ledger {value:e}, integrated {sum:e}", channel, layer.name)
            });
        }
    }

    // Pairs: what is generated recombines or is extracted. Free energy: what is generated is lost or delivered.
    for (part, scale) in [(LedgerPart::Carriers, 1.0), (LedgerPart::FreeEnergy, voltage.abs().max(3.0))] {
        let (mut rest, mut size) = (0.0, 0.0);
        for line in point.ledger.part(part) {
            rest += if line.source { line.value } else { -line.value };
            size += line.value.abs();
        }
        let allowed = 1e-7 * size + scale * (1e-12 * turnover + NOTHING);
        require(f64::abs(rest) <= allowed, &|| format!("{part:?} miss {rest:e}, allowed {allowed:e}"));
    }

    // Photons.
    let mut rest = 0.0;
    let mut incident = 0.0;
    for line in point.ledger.part(LedgerPart::Photons) {
        rest += if line.source { line.value } else { -line.value };
        incident += if line.source { line.value } else { 0.0 };
    }
    require(f64::abs(rest) <= 1e-11 * incident, &|| format!("photons miss {rest:e} of {incident:e}"));
    wrong
}

/// The control volume of every entry, m: half of each cell of its layer that touches it.
fn volumes(point: &BiasPoint) -> Vec<f64> {
    let p = &point.profiles;
    (0..p.depth.len())
        .map(|e| {
            let same = |other: usize| p.layer.get(other) == Some(&p.layer[e]);
            let before = if e > 0 && same(e - 1) { p.depth[e] - p.depth[e - 1] } else { 0.0 };
            let behind = if same(e + 1) { p.depth[e + 1] - p.depth[e] } else { 0.0 };
            0.5 * (before + behind)
        })
        .collect()
}
