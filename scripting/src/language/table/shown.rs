//! A table as text.

use super::super::plan::plain_words;
use super::{Data, Extent, Table};

/// Rows that a text shows.
const SHOWN: usize = 20;

impl Table {
    /// Its name, size and first rows, in aligned columns.
    pub fn words(&self) -> String {
        let mut text = format!("table `{}`: {}", self.name, counted(self.rows, "row"));
        if !self.failures.is_empty() {
            text.push_str(&format!(", {} failed", counted(self.failures.len(), "point")));
        }
        if self.extent == Extent::Checked {
            return text;
        }
        let shown = self.rows.min(SHOWN);
        let columns: Vec<Vec<String>> = self
            .columns
            .iter()
            .enumerate()
            .map(|(c, column)| {
                let unit = match &column.data {
                    Data::Numbers(numbers) => {
                        numbers.unit.map_or_else(String::new, |unit| unit.symbol.to_string())
                    }
                    _ => String::new(),
                };
                let head = if unit.is_empty() {
                    column.name.to_string()
                } else {
                    format!("{} ({unit})", column.name)
                };
                let cells = (0..shown).map(|row| self.cell_words(c, row));
                std::iter::once(head).chain(cells).collect()
            })
            .collect();
        for line in 0..=shown {
            text.push('\n');
            for cells in &columns {
                let width = cells.iter().map(|cell| cell.chars().count()).max().unwrap_or(0);
                let blank = width - cells[line].chars().count();
                text.push_str("  ");
                text.extend(std::iter::repeat_n(' ', blank));
                text.push_str(&cells[line]);
            }
        }
        if self.rows > shown {
            text.push_str(&format!("\n  .. and {} more", self.rows - shown));
        }
        text
    }

    fn cell_words(&self, column: usize, row: usize) -> String {
        match &self.columns[column].data {
            Data::Numbers(numbers) => match numbers.get(row) {
                Some(q) => {
                    let unit = numbers.unit.map_or("", |unit| unit.name);
                    let convert = |v: f64| numbers.unit.map_or(v, |unit| unit.from_si(v));
                    let error = q.error.map(convert);
                    let text = crate::figure_text::figure_text(convert(q.value), error, unit);
                    // the unit stands in the head, the error in what is printed of one value
                    text.split(' ').next().unwrap_or_default().to_string()
                }
                None => "-".to_string(),
            },
            Data::Texts { .. } | Data::Mixed(_) => {
                let value = self.columns[column].get(row);
                if value.is_unit() { "-".to_string() } else { plain_words(&value) }
            }
        }
    }
}

/// "1 row", "3 rows".
pub fn counted(count: usize, what: &str) -> String {
    if count == 1 { format!("1 {what}") } else { format!("{count} {what}s") }
}
