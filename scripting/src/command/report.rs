//! Snapshots as a person reads them; the same layout after a run and from an archive.

use std::fmt::Write;

use crate::archive::{Condition, Figure, Ledger, Snapshot, Stack, Status, Table};

use super::columns::{Align, columns, wrapped};
use crate::figure_text::{percent, significant, unit_symbol};
pub use crate::record_text::{figure_title, figure_value, value_text};

/// Letters of a line that long texts are broken at.
const LINE: usize = 110;

/// Significant digits of ledger lines.
const DIGITS: usize = 6;

/// The stack: its layers in a table, then everything else that belongs to it.
pub fn stack_text(stack: &Stack) -> String {
    let mut text = format!("stack `{}`\n", stack.name);
    let mut rows = vec![["layer", "thickness", "doping", "material"].map(str::to_string).to_vec()];
    for layer in &stack.layers {
        let mut row = vec![
            layer.name.clone(),
            value_text(&layer.thickness),
            layer.doping.clone(),
            layer.material.clone(),
        ];
        if !layer.settings.is_empty() {
            row.push(layer.settings.iter().map(condition_text).collect::<Vec<_>>().join(", "));
        }
        rows.push(row);
    }
    text.push_str(&columns(&rows, &[Align::Left, Align::Right], 2));
    text.push_str(&settings_text(&stack.settings));
    text
}

/// One snapshot: its name, conditions, figures with errors, ledgers, tables and warnings; not its stack.
pub fn snapshot_text(snapshot: &Snapshot) -> String {
    let mut text = format!("{} ({})\n", snapshot.label.name, snapshot.label.kind);
    if let Status::Failed { reason } = &snapshot.label.status {
        // writing to a text cannot fail, here and below
        let _ = writeln!(text, "  failed: {reason}\n  what follows is the last good state");
    }
    // what is said of the stack is not said again
    let news: Vec<Condition> =
        snapshot.conditions.iter().filter(|each| !snapshot.stack.settings.contains(each)).cloned().collect();
    text.push_str(&settings_text(&news));
    text.push_str(&figures_text(&snapshot.figures));
    for ledger in &snapshot.ledgers {
        text.push_str(&ledger_text(ledger));
    }
    for table in &snapshot.tables {
        text.push_str(&table_text(table));
    }
    text
}

/// The figures, one a line; where none exists, all for one reason, that is said once.
pub fn figures_text(figures: &[Figure]) -> String {
    if let [first, second, ..] = figures
        && second.reason.is_some()
        && figures.iter().all(|each| each.value.is_none() && each.reason == first.reason)
    {
        return format!("  figures of merit  {}\n", figure_value(first));
    }
    let rows: Vec<Vec<String>> =
        figures.iter().map(|figure| vec![figure_title(&figure.name), figure_value(figure)]).collect();
    columns(&rows, &[], 2)
}

/// The warnings of a snapshot.
pub fn warnings_text(warnings: &[String]) -> String {
    warnings.iter().map(|warning| format!("  warning: {warning}\n")).collect()
}

fn settings_text(settings: &[Condition]) -> String {
    let name_of = |each: &Condition| each.name.replace('_', " ");
    let width = settings.iter().map(|each| name_of(each).chars().count()).max().unwrap_or(0);
    let mut text = String::new();
    for each in settings {
        // a long value, such as a source, goes on below itself
        let value = wrapped(&value_text(&each.value), LINE, width + 4);
        // writing to a text cannot fail
        let _ = writeln!(text, "  {:width$}  {}", name_of(each), value.trim());
    }
    text
}

fn condition_text(condition: &Condition) -> String {
    format!("{} {}", condition.name.replace('_', " "), value_text(&condition.value))
}

fn ledger_text(ledger: &Ledger) -> String {
    let mut rows = Vec::with_capacity(ledger.lines.len());
    let mut group = "";
    for line in &ledger.lines {
        // a heading stands once for the lines below it
        let heading = if line.group == group { "" } else { line.group.as_str() };
        group = &line.group;
        let amount = match line.value {
            Some(value) => {
                format!("{} {}", significant(value, DIGITS), unit_symbol(&line.unit)).trim_end().to_string()
            }
            None => "-".to_string(),
        };
        let (number, unit) = amount.split_once(' ').unwrap_or((&amount, ""));
        rows.push(vec![
            heading.to_string(),
            line.label.clone(),
            line.share.map_or_else(String::new, percent),
            number.to_string(),
            unit.to_string(),
            line.note.clone(),
        ]);
    }
    let align = [Align::Left, Align::Left, Align::Right, Align::Right];
    format!("  ledger of {}\n{}", ledger.title, columns(&rows, &align, 4))
}

fn table_text(table: &Table) -> String {
    let names: Vec<&str> = table.columns.iter().map(|column| column.name.as_str()).collect();
    format!("  table `{}`: {} rows of {}\n", table.name, table.rows, names.join(", "))
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::archive::{Column, Label, Layer, LedgerLine, Value};

    /// Source of truth: the layout as it is meant, written by hand.
    #[test]
    fn a_snapshot_reads_like_a_page() {
        let figure = |name: &str, value, error, unit: &str, reason: Option<&str>| Figure {
            name: name.to_string(),
            value,
            error,
            unit: unit.to_string(),
            reason: reason.map(str::to_string),
            meshes: Vec::new(),
        };
        let line = |group: &str, label: &str, value, share| LedgerLine {
            group: group.to_string(),
            label: label.to_string(),
            value: Some(value),
            unit: "mA_per_cm2".to_string(),
            share: Some(share),
            note: String::new(),
        };
        let snapshot = Snapshot {
            label: Label { name: "light J-V".to_string(), kind: "J-V curve".to_string(), ..Label::default() },
            conditions: vec![Condition::new("light", Value::text("AM1.5G, 1 sun"))],
            figures: vec![
                figure("jsc", Some(29.71391), Some(0.0011), "mA_per_cm2", None),
                figure("ff", Some(0.84), Some(9.5e-5), "", None),
                figure("efficiency", None, None, "", Some("the light has no energy")),
            ],
            tables: vec![Table::new("points", vec![Column::new("voltage_V", "V", vec![0.0, 0.1])])],
            ledgers: vec![Ledger {
                title: "carriers".to_string(),
                lines: vec![line("base", "radiative", 0.012, 0.0004), line("base", "Auger", 1e-6, 3e-8)],
            }],
            ..Snapshot::default()
        };
        let expected = "\
light J-V (J-V curve)
  light  AM1.5G, 1 sun
  short-circuit current density (jsc)  29.714 mA/cm2 +- 0.002
  fill factor (ff)                     84.00 % +- 0.01
  efficiency                           none: the light has no energy
  ledger of carriers
    base  radiative    0.04 %  0.012  mA/cm2
          Auger      3.0e-6 %   1e-6  mA/cm2
  table `points`: 2 rows of voltage_V
";
        assert_eq!(snapshot_text(&snapshot), expected);
        let stack = Stack {
            name: "bar".to_string(),
            layers: vec![Layer {
                name: "base".to_string(),
                material: "GaAs".to_string(),
                thickness: Value::number(3.0, "um"),
                doping: "acceptors 1e17 cm^-3".to_string(),
                settings: Vec::new(),
            }],
            settings: vec![Condition::new("temperature", Value::number(298.15, "K"))],
        };
        let expected = "\
stack `bar`
  layer  thickness  doping                material
  base        3 um  acceptors 1e17 cm^-3  GaAs
  temperature  298.15 K
";
        assert_eq!(stack_text(&stack), expected);
    }
}
