//! The ledger as a waterfall: photons, electrons and power, each from what comes in to what is left.

use crate::archive::{Ledger, LedgerLine, Snapshot};
use crate::picture::chart::{Axis, Bar, BarRole, Scale, Stage, Waterfall};

/// The remark on a line of a ledger that comes in.
pub const COMES_IN: &str = "comes in";

/// Lines of a ledger that tell how well it closes: no part of it.
pub const CLOSURES: [&str; 3] = ["unaccounted share", "terminal current minus edge current", "unaccounted"];

/// Losses shown by name in one stage; smaller ones are summed up.
const MOST_LOSSES: usize = 9;

/// Losses below this share of what came in are summed up.
const LEAST_SHARE: f64 = 0.002;

/// Whether a snapshot holds an account.
pub(super) fn gives(snapshot: &Snapshot) -> bool {
    snapshot.ledgers.iter().any(|ledger| ledger.title == "carriers")
}

/// The stages; none without an account.
pub(super) fn body(snapshot: &Snapshot, notes: &mut Vec<String>) -> Option<Waterfall> {
    let account = |title: &str| snapshot.ledgers.iter().find(|ledger| ledger.title == title);
    let mut stages = Vec::new();
    if let Some(photons) = account("photons").filter(|ledger| income(ledger) > 0.0) {
        let lines = losses(photons, |line| line.label != "absorbed");
        let left = total(photons, |line| line.label == "absorbed");
        stages.push(stage(
            "Photons",
            "mA_per_cm2",
            "incident",
            income(photons),
            lines,
            "absorbed in the layers",
            left,
            notes,
        ));
    }
    let carriers = account("carriers")?;
    let extracted = total(carriers, |line| line.label == "extracted");
    let lines = losses(carriers, |line| line.label != "extracted");
    let generated = income(carriers);
    stages.push(if extracted >= 0.0 && generated > 0.0 {
        stage("Electrons", "mA_per_cm2", "generated", generated, lines, "extracted", extracted, notes)
    } else {
        // forward bias beyond open circuit or in the dark: the contacts bring the pairs in
        let sum = generated - extracted;
        stage("Electrons", "mA_per_cm2", "injected and generated", sum, lines, "left", 0.0, notes)
    });
    let free = account("free energy");
    let delivered = free.map_or(0.0, |ledger| total(ledger, |line| line.label.starts_with("delivered")));
    if let (Some(energy), Some(free)) = (account("photon energy"), free)
        && income(energy) > 0.0
    {
        let heat =
            |line: &LedgerLine| line.label != "absorbed" && !line.label.ends_with("free energy generated");
        let mut lines = losses(energy, heat);
        for (name, _) in &mut lines {
            if let Some(rest) = name.strip_prefix("of it ") {
                *name = rest.to_string();
            }
        }
        lines.extend(losses(free, |line| !line.label.starts_with("delivered")));
        stages.push(stage(
            "Power",
            "mW_per_cm2",
            "incident",
            income(energy),
            lines,
            "delivered",
            delivered,
            notes,
        ));
    } else if let Some(free) = free.filter(|ledger| income(ledger) > 0.0) {
        let lines = losses(free, |line| !line.label.starts_with("delivered"));
        let title = "free energy generated";
        stages.push(stage("Power", "mW_per_cm2", title, income(free), lines, "delivered", delivered, notes));
    }
    Some(Waterfall { stages })
}

fn counts(line: &LedgerLine) -> bool {
    !CLOSURES.contains(&line.label.as_str())
}

fn income(ledger: &Ledger) -> f64 {
    ledger.lines.iter().filter(|line| line.note == COMES_IN).filter_map(|line| line.value).sum()
}

fn total(ledger: &Ledger, which: impl Fn(&LedgerLine) -> bool) -> f64 {
    let lines = ledger.lines.iter().filter(|line| counts(line) && line.note != COMES_IN && which(line));
    lines.filter_map(|line| line.value).sum()
}

/// What is lost, by name, in the order of the ledger.
fn losses(ledger: &Ledger, which: impl Fn(&LedgerLine) -> bool) -> Vec<(String, f64)> {
    let lines = ledger.lines.iter().filter(|line| counts(line) && line.note != COMES_IN && which(line));
    let name = |line: &LedgerLine| {
        if line.group.is_empty() { line.label.clone() } else { format!("{}: {}", line.group, line.label) }
    };
    lines.filter_map(|line| Some((name(line), line.value?))).filter(|(_, value)| *value != 0.0).collect()
}

fn stage(
    title: &str,
    unit: &str,
    first: &str,
    income: f64,
    losses: Vec<(String, f64)>,
    last: &str,
    left: f64,
    notes: &mut Vec<String>,
) -> Stage {
    let mut sizes: Vec<f64> = losses.iter().map(|(_, value)| value.abs()).collect();
    sizes.sort_by(|a, b| b.total_cmp(a));
    let least = sizes.get(MOST_LOSSES).map_or(0.0, |next| *next).max(LEAST_SHARE * income);
    let share = |value: f64| (income > 0.0).then(|| value / income);
    let mut bars = vec![Bar {
        name: first.to_string(),
        role: BarRole::Income,
        value: income,
        share: share(income),
        from: 0.0,
        to: income,
    }];
    let mut level = income;
    let mut fall = |name: String, value: f64, bars: &mut Vec<Bar>| {
        let role = if value < 0.0 { BarRole::Gain } else { BarRole::Loss };
        bars.push(Bar { name, role, value, share: share(value), from: level, to: level - value });
        level -= value;
    };
    let (shown, small): (Vec<_>, Vec<_>) = losses.into_iter().partition(|(_, value)| value.abs() > least);
    for (name, value) in shown {
        fall(name, value, &mut bars);
    }
    if let [(name, value)] = small.as_slice() {
        fall(name.clone(), *value, &mut bars);
    } else if !small.is_empty() {
        let sum: f64 = small.iter().map(|(_, value)| value).sum();
        fall(format!("{} smaller losses", small.len()), sum, &mut bars);
        let below = 100.0 * least / income.max(f64::MIN_POSITIVE);
        notes.push(format!("{}: losses of at most {below:.2} % each are summed up", title.to_lowercase()));
    }
    bars.push(Bar {
        name: last.to_string(),
        role: BarRole::Left,
        value: left,
        share: share(left),
        from: 0.0,
        to: left,
    });
    let ends = bars.iter().flat_map(|bar| [bar.from, bar.to]);
    let (least, most) = ends.fold((0.0_f64, 0.0_f64), |(a, b), v| (a.min(v), b.max(v)));
    let axis = Axis {
        label: title.to_string(),
        unit: unit.to_string(),
        scale: Scale::Linear,
        can_be_log: false,
        magnitude: false,
        range: (least, most),
    };
    Stage { title: title.to_string(), axis, bars }
}
