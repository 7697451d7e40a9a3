//! Comparing two snapshots to the last bit, for `epiloom replay`.

use super::sweep::{Cell, Point};

use super::model::{Condition, Figure, Ledger, MaterialValue, Snapshot, Stack, Table, Value};

/// One place where two snapshots differ.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Difference {
    /// Where, in words: `figure voc, value` or `table points, column voltage_V, row 3`.
    pub place: String,
    /// What the first snapshot has there; numbers with all their digits, and their bits where the digits agree.
    pub first: String,
    /// What the second one has there.
    pub second: String,
}

/// Every place where `b` differs from `a`, numbers compared by their bits; empty when they are identical.
pub fn compare_bits(a: &Snapshot, b: &Snapshot) -> Vec<Difference> {
    let mut out = Differences(Vec::new());
    out.text("name", &a.label.name, &b.label.name);
    out.text("kind", &a.label.kind, &b.label.kind);
    out.text("order", &format!("{:?}", a.label.order), &format!("{:?}", b.label.order));
    out.text("status", &format!("{:?}", a.label.status), &format!("{:?}", b.label.status));
    out.conditions("condition", &a.conditions, &b.conditions);
    out.list("figures", &a.figures, &b.figures, Differences::figure);
    out.list("tables", &a.tables, &b.tables, Differences::table);
    out.list("ledgers", &a.ledgers, &b.ledgers, Differences::ledger);
    out.stack(&a.stack, &b.stack);
    out.list("material values", &a.materials, &b.materials, Differences::material);
    out.list("warnings", &a.warnings, &b.warnings, |out, a, b| out.text("warning", a, b));
    out.0
}

/// Every place where the point `b` differs from `a`, numbers compared by their bits; not what they stored.
pub fn compare_point(a: &Point, b: &Point) -> Vec<Difference> {
    let mut out = Differences(Vec::new());
    out.text("status", &format!("{:?}", a.status), &format!("{:?}", b.status));
    let mut place = 0;
    out.list("coordinates", &a.coordinates, &b.coordinates, |out, a, b| {
        out.cell(&format!("coordinate {place}"), a, b);
        place += 1;
    });
    out.list("outputs", &a.outputs, &b.outputs, |out, a, b| {
        let place = format!("output {}", a.column.name);
        out.text(&format!("{place}, name"), &a.column.name, &b.column.name);
        out.text(&format!("{place}, unit"), &a.column.unit, &b.column.unit);
        out.cell(&place, &a.cell, &b.cell);
    });
    out.list("printed lines", &a.printed, &b.printed, |out, a, b| out.text("printed line", a, b));
    out.list("warnings", &a.warnings, &b.warnings, |out, a, b| out.text("warning", a, b));
    out.0
}

struct Differences(Vec<Difference>);

impl Differences {
    fn push(&mut self, place: impl Into<String>, first: impl Into<String>, second: impl Into<String>) {
        self.0.push(Difference { place: place.into(), first: first.into(), second: second.into() });
    }

    fn text(&mut self, place: &str, a: &str, b: &str) {
        if a != b {
            self.push(place, a, b);
        }
    }

    fn number(&mut self, place: &str, a: f64, b: f64) {
        if a.to_bits() == b.to_bits() {
            return;
        }
        let (first, second) = (format!("{a:?}"), format!("{b:?}"));
        if first == second {
            // Two kinds of NaN print alike.
            self.push(
                place,
                format!("{first} ({:#x})", a.to_bits()),
                format!("{second} ({:#x})", b.to_bits()),
            );
        } else {
            self.push(place, first, second);
        }
    }

    fn optional(&mut self, place: &str, a: Option<f64>, b: Option<f64>) {
        let show = |value: Option<f64>| value.map_or("absent".to_owned(), |number| format!("{number:?}"));
        match (a, b) {
            (Some(a), Some(b)) => self.number(place, a, b),
            (None, None) => {}
            _ => self.push(place, show(a), show(b)),
        }
    }

    fn cell(&mut self, place: &str, a: &Cell, b: &Cell) {
        match (a, b) {
            (Cell::Number { value: x, error: e }, Cell::Number { value: y, error: f }) => {
                self.number(place, *x, *y);
                self.optional(&format!("{place}, error"), *e, *f);
            }
            _ if a == b => {}
            _ => self.push(place, format!("{a:?}"), format!("{b:?}")),
        }
    }

    fn value(&mut self, place: &str, a: &Value, b: &Value) {
        match (a, b) {
            (Value::Number { value: x, unit: u }, Value::Number { value: y, unit: v }) => {
                self.number(place, *x, *y);
                self.text(&format!("{place}, unit"), u, v);
            }
            _ if a == b => {}
            _ => self.push(place, a.to_string(), b.to_string()),
        }
    }

    /// Compares pairwise; a different count is one difference, and the common part is still compared.
    fn list<T>(&mut self, what: &str, a: &[T], b: &[T], mut each: impl FnMut(&mut Self, &T, &T)) {
        if a.len() != b.len() {
            self.push(format!("number of {what}"), a.len().to_string(), b.len().to_string());
        }
        for (a, b) in a.iter().zip(b) {
            each(self, a, b);
        }
    }

    fn conditions(&mut self, place: &str, a: &[Condition], b: &[Condition]) {
        self.list(&format!("entries of {place}"), a, b, |out, a, b| {
            out.text(&format!("{place}, name"), &a.name, &b.name);
            out.value(&format!("{place} {}", a.name), &a.value, &b.value);
        });
    }

    fn figure(&mut self, a: &Figure, b: &Figure) {
        let place = format!("figure {}", a.name);
        self.text(&format!("{place}, name"), &a.name, &b.name);
        self.optional(&format!("{place}, value"), a.value, b.value);
        self.optional(&format!("{place}, error"), a.error, b.error);
        self.text(&format!("{place}, unit"), &a.unit, &b.unit);
        self.text(
            &format!("{place}, reason"),
            a.reason.as_deref().unwrap_or("none"),
            b.reason.as_deref().unwrap_or("none"),
        );
        self.list(&format!("meshes of {place}"), &a.meshes, &b.meshes, |out, a, b| {
            let mesh = format!("{place}, on {} nodes", a.nodes);
            out.text(&format!("{mesh}, nodes"), &a.nodes.to_string(), &b.nodes.to_string());
            out.number(&mesh, a.value, b.value);
        });
    }

    fn table(&mut self, a: &Table, b: &Table) {
        let place = format!("table {}", a.name);
        self.text(&format!("{place}, name"), &a.name, &b.name);
        self.text(&format!("{place}, rows"), &a.rows.to_string(), &b.rows.to_string());
        self.list(&format!("columns of {place}"), &a.columns, &b.columns, |out, a, b| {
            let column = format!("{place}, column {}", a.name);
            out.text(&format!("{column}, name"), &a.name, &b.name);
            out.text(&format!("{column}, unit"), &a.unit, &b.unit);
            if a.values.len() != b.values.len() {
                out.push(format!("{column}, length"), a.values.len().to_string(), b.values.len().to_string());
            }
            for (row, (a, b)) in a.values.iter().zip(&b.values).enumerate() {
                if a.to_bits() != b.to_bits() {
                    out.number(&format!("{column}, row {row}"), *a, *b);
                }
            }
        });
    }

    fn ledger(&mut self, a: &Ledger, b: &Ledger) {
        self.text("ledger, title", &a.title, &b.title);
        self.list(&format!("lines of ledger {}", a.title), &a.lines, &b.lines, |out, x, y| {
            let place = format!("ledger {}, {}, {}", a.title, x.group, x.label);
            out.text(&format!("{place}, group"), &x.group, &y.group);
            out.text(&format!("{place}, label"), &x.label, &y.label);
            out.optional(&place, x.value, y.value);
            out.text(&format!("{place}, unit"), &x.unit, &y.unit);
            out.optional(&format!("{place}, share"), x.share, y.share);
            out.text(&format!("{place}, note"), &x.note, &y.note);
        });
    }

    fn stack(&mut self, a: &Stack, b: &Stack) {
        self.text("stack, name", &a.name, &b.name);
        self.conditions("stack setting", &a.settings, &b.settings);
        self.list("layers", &a.layers, &b.layers, |out, a, b| {
            let place = format!("layer {}", a.name);
            out.text(&format!("{place}, name"), &a.name, &b.name);
            out.text(&format!("{place}, material"), &a.material, &b.material);
            out.value(&format!("{place}, thickness"), &a.thickness, &b.thickness);
            out.text(&format!("{place}, doping"), &a.doping, &b.doping);
            out.conditions(&format!("{place}, setting"), &a.settings, &b.settings);
        });
    }

    fn material(&mut self, a: &MaterialValue, b: &MaterialValue) {
        let place = format!("material value {} of {} in layer {}", a.parameter, a.material, a.layer);
        self.text(&format!("{place}, layer"), &a.layer, &b.layer);
        self.text(&format!("{place}, material"), &a.material, &b.material);
        self.text(&format!("{place}, parameter"), &a.parameter, &b.parameter);
        self.value(&place, &a.value, &b.value);
        self.text(&format!("{place}, source"), &a.source, &b.source);
        self.text(&format!("{place}, note"), &a.note, &b.note);
    }
}
