//! A table as a snapshot of an archive.

use std::collections::BTreeMap;

use crate::archive::{self, Condition, Label, OrderKey, Snapshot, Status, Value};

use super::super::plan::plain_words;
use super::super::value::any_quantity;
use super::{Column, Data, Table};

impl Table {
    /// A snapshot of this table; texts stand in it as numbers, with what they mean among the conditions.
    pub fn snapshot(&self, name: &str, kind: &str, step: u64) -> Snapshot {
        let mut snapshot = Snapshot {
            label: Label {
                name: name.to_string(),
                kind: kind.to_string(),
                order: OrderKey { step, point: 0 },
                status: Status::Solved,
            },
            ..Snapshot::default()
        };
        if let Some(plan) = &self.plan {
            snapshot.conditions.push(Condition::new("plan", Value::text(plan.words())));
        }
        if !self.failures.is_empty() {
            snapshot
                .conditions
                .push(Condition::new("points that failed", Value::number(self.failures.len() as f64, "")));
            for failure in self.failures.iter().take(100) {
                let reason = Value::text(failure.reason.to_string());
                snapshot.conditions.push(Condition::new(format!("point {} failed", failure.point), reason));
            }
        }
        let mut columns = Vec::new();
        if !self.points.is_empty() {
            columns.push(archive::Column::new("point", "", self.points.iter().map(|p| *p as f64).collect()));
        }
        for column in &self.columns {
            self.stored_column(column, &mut columns, &mut snapshot.conditions);
        }
        snapshot.tables.push(archive::Table::new("table", columns));
        snapshot
    }

    fn stored_column(
        &self,
        column: &Column,
        into: &mut Vec<archive::Column>,
        conditions: &mut Vec<Condition>,
    ) {
        let name = column.name.as_str();
        if let Data::Numbers(numbers) = &column.data {
            let (unit, convert): (String, &dyn Fn(f64) -> f64) = match numbers.unit {
                Some(unit) if unit.name == "percent" || unit.name == "suns" => (String::new(), &|v| v),
                Some(unit) => (unit.name.to_string(), &move |v| unit.from_si(v)),
                None if numbers.dimension.is_none() => (String::new(), &|v| v),
                None => (numbers.dimension.base_units(), &|v| v),
            };
            let named = |of: &str| if unit.is_empty() { of.to_string() } else { format!("{of}_{unit}") };
            let plain = |v: f64| if v.is_nan() { f64::NAN } else { convert(v) };
            into.push(archive::Column::new(
                named(name),
                unit.clone(),
                numbers.values.iter().map(|v| plain(*v)).collect(),
            ));
            if !numbers.errors.is_empty() {
                let errors = numbers.errors.iter().map(|v| plain(*v)).collect();
                into.push(archive::Column::new(named(&format!("{name}_error")), unit.clone(), errors));
            }
            return;
        }
        let mut words: BTreeMap<String, f64> = BTreeMap::new();
        let values: Vec<_> = (0..self.rows).map(|row| column.get(row)).collect();
        for value in values.iter().filter(|v| any_quantity(v).is_none() && !v.is_bool() && !v.is_unit()) {
            let next = words.len() as f64;
            words.entry(plain_words(value)).or_insert(next);
        }
        let numbers = values.iter().map(|value| match (any_quantity(value), value.as_bool()) {
            (Some(q), _) => q.value,
            (None, Ok(flag)) => f64::from(u8::from(flag)),
            (None, Err(_)) if value.is_unit() => f64::NAN,
            (None, Err(_)) => words.get(&plain_words(value)).copied().unwrap_or(f64::NAN),
        });
        into.push(archive::Column::new(name, "", numbers.collect()));
        if !words.is_empty() {
            let mut list: Vec<(&String, &f64)> = words.iter().collect();
            list.sort_by(|a, b| a.1.total_cmp(b.1));
            let text: Vec<String> = list.iter().map(|(word, code)| format!("{code}: {word}")).collect();
            conditions.push(Condition::new(format!("meaning of `{name}`"), Value::text(text.join(", "))));
        }
    }
}
