//! Plans: sets of points that are computed one by one, from their index alone, and never stand in memory.

use std::sync::Arc;

use rhai::{Dynamic, FnPtr, ImmutableString, Map};

use crate::diagnostics::codes;

use super::captured::Captured;
use super::dimension::Dimension;
use super::fault::{Fault, Outcome};
use super::quantity::Quantity;
use super::units::Unit;
use super::value::{any_quantity, described};

pub mod samples;
pub mod spread;

use samples::{Filling, MOST_COORDINATES, unit_value};
use spread::Spread;

/// A plan as scripts hold it.
#[derive(Clone, Debug)]
pub struct PlanValue(pub Arc<Plan>);

/// A spread as scripts hold it.
#[derive(Clone, Debug)]
pub struct SpreadValue(pub Spread);

/// The largest number of points: indices are exact as numbers of scripts.
const MOST_POINTS: u64 = 1 << 53;

/// A set of points.
#[derive(Debug)]
pub struct Plan {
    /// What the points differ in, in order.
    pub coordinates: Vec<Coordinate>,
    /// How many indices there are; a filter leaves some of them without a point.
    pub size: u64,
    form: Form,
}

/// One thing that points differ in.
#[derive(Clone, Debug)]
pub struct Coordinate {
    /// Its name.
    pub name: ImmutableString,
    /// What its values are.
    pub kind: Kind,
}

/// What the values of a coordinate are.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Kind {
    /// Numbers of this dimension, shown in this unit.
    Number(Dimension, Option<&'static Unit>),
    /// Yes and no.
    Flag,
    /// Texts, and what stands in tables by its name: stacks, materials, lights.
    Words,
}

#[derive(Debug)]
enum Form {
    /// Every combination; the last coordinate changes fastest.
    Grid(Vec<Vec<Dynamic>>),
    /// Values side by side, by coordinate.
    Rows(Vec<Vec<Dynamic>>),
    /// Samples of spreads; a coordinate without a spread keeps its value.
    Samples { filling: Filling, seed: u64, axes: Vec<Axis> },
    /// Every combination of the points of two plans; the second changes fastest.
    Product(Arc<Plan>, Arc<Plan>),
    /// One plan after the other.
    Chain(Vec<Arc<Plan>>),
    /// The points for which a closure holds.
    Filtered(Arc<Plan>, Captured),
}

#[derive(Debug)]
enum Axis {
    Fixed(Dynamic),
    Spread { spread: Spread, stream: u64, dimension: usize },
}

/// What a coordinate of samples is given as.
#[derive(Clone, Debug)]
pub enum Given {
    /// A value that every point has.
    Value(Dynamic),
    /// A spread.
    Spread(Spread),
}

/// Names with their values, in order.
pub type Columns = Vec<(ImmutableString, Vec<Dynamic>)>;

impl Plan {
    /// Every combination of the values; the last coordinate changes fastest.
    ///
    /// # Errors
    /// No coordinates, a coordinate without values, values of different kinds, too many points.
    pub fn grid(columns: Columns) -> Result<Plan, Fault> {
        let coordinates = coordinates(&columns)?;
        let size = columns.iter().try_fold(1_u64, |size, (_, values)| size.checked_mul(values.len() as u64));
        let values = columns.into_iter().map(|(_, values)| values).collect();
        Plan { coordinates, size: 0, form: Form::Grid(values) }.of_size(size)
    }

    /// The first values of all coordinates, then the second, and so on; one value stands for every point.
    ///
    /// # Errors
    /// As for [`Plan::grid`]; coordinates with different numbers of values.
    pub fn rows(mut columns: Columns) -> Result<Plan, Fault> {
        let coordinates = coordinates(&columns)?;
        let most = columns.iter().map(|(_, values)| values.len()).max().unwrap_or(0);
        for (name, values) in &mut columns {
            if values.len() == 1 {
                *values = vec![values[0].clone(); most];
            } else if values.len() != most {
                return Err(Fault::new(
                    codes::PLAN,
                    format!("`{name}` has {} values where another coordinate has {most}", values.len()),
                )
                .help("`zip` takes the first values together, then the second: give all the same number, or one value"));
            }
        }
        let values = columns.into_iter().map(|(_, values)| values).collect();
        Plan { coordinates, size: 0, form: Form::Rows(values) }.of_size(Some(most as u64))
    }

    /// Samples of the spreads.
    ///
    /// # Errors
    /// No coordinates, no points, more coordinates than a low-discrepancy sequence has.
    pub fn samples(
        filling: Filling,
        columns: Vec<(ImmutableString, Given)>,
        count: u64,
        seed: u64,
    ) -> Result<Plan, Fault> {
        if columns.is_empty() {
            return Err(no_coordinates());
        }
        let mut coordinates = Vec::new();
        let mut axes = Vec::new();
        let mut dimension = 0;
        for (name, given) in columns {
            let (kind, axis) = match given {
                Given::Value(value) => (kind_of(&name, &value)?, Axis::Fixed(value)),
                Given::Spread(spread) => {
                    let kind = Kind::Number(spread.kind().dimension, spread.kind().unit());
                    let axis = Axis::Spread { spread, stream: samples::stream(&name), dimension };
                    dimension += 1;
                    (kind, axis)
                }
            };
            coordinates.push(Coordinate { name, kind });
            axes.push(axis);
        }
        if filling == Filling::LowDiscrepancy && dimension > MOST_COORDINATES {
            return Err(Fault::new(
                codes::PLAN,
                format!("a low-discrepancy sample has at most {MOST_COORDINATES} spreads, not {dimension}"),
            )
            .help("`latin_hypercube` takes any number"));
        }
        Plan { coordinates, size: 0, form: Form::Samples { filling, seed, axes } }.of_size(Some(count))
    }

    /// Every combination of the points of two plans; the second changes fastest.
    ///
    /// # Errors
    /// A coordinate that both have; too many points.
    pub fn product(first: &Arc<Plan>, second: &Arc<Plan>) -> Result<Plan, Fault> {
        if let Some(twice) = second.coordinates.iter().find(|c| first.position(&c.name).is_some()) {
            return Err(Fault::new(codes::PLAN, format!("both plans have a coordinate `{}`", twice.name))
                .help("plans that are multiplied vary different things; `first + second` is one plan after the other"));
        }
        let coordinates = first.coordinates.iter().chain(&second.coordinates).cloned().collect();
        let size = first.size.checked_mul(second.size);
        Plan { coordinates, size: 0, form: Form::Product(Arc::clone(first), Arc::clone(second)) }
            .of_size(size)
    }

    /// The points of one plan, then those of the other.
    ///
    /// # Errors
    /// Different coordinates; too many points.
    pub fn chain(first: &Arc<Plan>, second: &Arc<Plan>) -> Result<Plan, Fault> {
        for coordinate in &second.coordinates {
            let other = first.position(&coordinate.name).map(|i| &first.coordinates[i]);
            let alike = other.is_some_and(|other| match (other.kind, coordinate.kind) {
                (Kind::Number(a, _), Kind::Number(b, _)) => a == b,
                (a, b) => a == b,
            });
            if !alike || first.coordinates.len() != second.coordinates.len() {
                return Err(Fault::new(codes::PLAN, "the two plans vary different things")
                    .label(format!("{} and {}", first.names(), second.names()))
                    .help("plans that follow each other have the same coordinates; `first * second` combines different ones"));
            }
        }
        if first.coordinates.len() != second.coordinates.len() {
            return Err(Fault::new(codes::PLAN, "the two plans vary different things").label(format!(
                "{} and {}",
                first.names(),
                second.names()
            )));
        }
        let size = first.size.checked_add(second.size);
        let coordinates = first.coordinates.clone();
        Plan { coordinates, size: 0, form: Form::Chain(vec![Arc::clone(first), Arc::clone(second)]) }
            .of_size(size)
    }

    /// The points for which the closure holds; indices stay those of the whole.
    ///
    /// # Errors
    /// What the closure captures cannot be copied.
    pub fn filtered(whole: &Arc<Plan>, closure: &FnPtr) -> Result<Plan, Fault> {
        Ok(Plan {
            coordinates: whole.coordinates.clone(),
            size: whole.size,
            form: Form::Filtered(Arc::clone(whole), Captured::new(closure)?),
        })
    }

    fn of_size(mut self, size: Option<u64>) -> Result<Plan, Fault> {
        match size {
            Some(size) if (1..=MOST_POINTS).contains(&size) => {
                self.size = size;
                Ok(self)
            }
            Some(0) => Err(Fault::new(codes::PLAN, "the plan has no points")),
            _ => Err(Fault::new(codes::TOO_LARGE, "the plan has more points than can be counted")),
        }
    }

    /// Where the coordinate of this name stands.
    pub fn position(&self, name: &str) -> Option<usize> {
        self.coordinates.iter().position(|c| c.name == name)
    }

    /// Names of the coordinates, for a message.
    fn names(&self) -> String {
        let names: Vec<String> = self.coordinates.iter().map(|c| format!("`{}`", c.name)).collect();
        names.join(", ")
    }

    /// The coordinates of point `k`, in their order, whether or not a filter leaves it out.
    pub fn values(&self, k: u64) -> Vec<Dynamic> {
        let mut values = Vec::with_capacity(self.coordinates.len());
        self.push_values(k, &mut values);
        values
    }

    fn push_values(&self, k: u64, out: &mut Vec<Dynamic>) {
        match &self.form {
            Form::Grid(axes) => {
                let mut rest = self.size;
                let mut k = k;
                for axis in axes {
                    rest /= axis.len() as u64;
                    out.push(axis[(k / rest) as usize].clone());
                    k %= rest;
                }
            }
            Form::Rows(columns) => out.extend(columns.iter().map(|values| values[k as usize].clone())),
            Form::Samples { filling, seed, axes } => out.extend(axes.iter().map(|axis| match axis {
                Axis::Fixed(value) => value.clone(),
                Axis::Spread { spread, stream, dimension } => {
                    let u = unit_value(*filling, *seed, *dimension, *stream, k, self.size);
                    let kind = spread.kind();
                    let mut value = Quantity::si(spread.value(u), kind.dimension);
                    value.shown_in = kind.shown_in;
                    Dynamic::from(value)
                }
            })),
            Form::Product(first, second) => {
                first.push_values(k / second.size, out);
                second.push_values(k % second.size, out);
            }
            Form::Chain(plans) => {
                let mut k = k;
                for plan in plans {
                    if k < plan.size {
                        // the names of all are the same, their order may differ
                        let values = plan.values(k);
                        out.extend(
                            self.coordinates
                                .iter()
                                .map(|c| plan.position(&c.name).map_or(Dynamic::UNIT, |i| values[i].clone())),
                        );
                        return;
                    }
                    k -= plan.size;
                }
            }
            Form::Filtered(whole, _) => whole.push_values(k, out),
        }
    }

    /// Point `k` as a map.
    pub fn point(&self, k: u64) -> Map {
        let names = self.coordinates.iter().map(|c| c.name.as_str().into());
        names.zip(self.values(k)).collect()
    }

    /// Whether every filter lets point `k` pass; `ask` calls a closure with a point.
    ///
    /// # Errors
    /// What a closure throws, and whatever it gives that is neither yes nor no.
    pub fn admits(&self, k: u64, ask: &dyn Fn(&FnPtr, Map) -> Outcome<Dynamic>) -> Outcome<bool> {
        match &self.form {
            Form::Grid(_) | Form::Rows(_) | Form::Samples { .. } => Ok(true),
            Form::Product(first, second) => {
                Ok(first.admits(k / second.size, ask)? && second.admits(k % second.size, ask)?)
            }
            Form::Chain(plans) => {
                let mut k = k;
                for plan in plans {
                    if k < plan.size {
                        return plan.admits(k, ask);
                    }
                    k -= plan.size;
                }
                Ok(false)
            }
            Form::Filtered(whole, closure) => {
                if !whole.admits(k, ask)? {
                    return Ok(false);
                }
                let answer = ask(&closure.copy()?, whole.point(k))?;
                if answer.is::<super::value::Unknown>() {
                    return Ok(true);
                }
                Ok(answer.as_bool().map_err(|_| {
                    Fault::new(codes::WRONG_KIND, "the closure of a filter must give yes or no")
                        .label(format!("it gave {}", described(&answer)))
                })?)
            }
        }
    }

    /// In words: "grid of bsf (3) by x (15)".
    pub fn words(&self) -> String {
        match &self.form {
            Form::Grid(axes) => {
                let named = self.coordinates.iter().zip(axes);
                let words: Vec<String> =
                    named.map(|(c, axis)| format!("{} ({})", c.name, axis.len())).collect();
                format!("grid of {}", words.join(" by "))
            }
            Form::Rows(_) => format!("list of {} points in {}", self.size, self.plain_names()),
            Form::Samples { filling, seed, axes } => {
                let how = match filling {
                    Filling::Random => "random",
                    Filling::LatinHypercube => "Latin hypercube",
                    Filling::LowDiscrepancy => "low-discrepancy",
                };
                let words: Vec<String> = self
                    .coordinates
                    .iter()
                    .zip(axes)
                    .map(|(c, axis)| match axis {
                        Axis::Fixed(value) => format!("{} {}", c.name, plain_words(value)),
                        Axis::Spread { spread, .. } => format!("{} {}", c.name, spread.words()),
                    })
                    .collect();
                format!("{} samples, {how}, seed {seed}: {}", self.size, words.join("; "))
            }
            Form::Product(first, second) => format!("({}) times ({})", first.words(), second.words()),
            Form::Chain(plans) => {
                let words: Vec<String> = plans.iter().map(|plan| format!("({})", plan.words())).collect();
                words.join(" then ")
            }
            Form::Filtered(whole, _) => format!("{}, filtered", whole.words()),
        }
    }

    fn plain_names(&self) -> String {
        let names: Vec<&str> = self.coordinates.iter().map(|c| c.name.as_str()).collect();
        names.join(", ")
    }
}

/// The coordinates of these columns: each with values of one kind.
fn coordinates(columns: &Columns) -> Result<Vec<Coordinate>, Fault> {
    if columns.is_empty() {
        return Err(no_coordinates());
    }
    columns
        .iter()
        .map(|(name, values)| {
            let Some(first) = values.first() else {
                return Err(Fault::new(codes::PLAN, format!("`{name}` has no values")));
            };
            let kind = kind_of(name, first)?;
            for value in &values[1..] {
                let other = kind_of(name, value)?;
                let alike = match (kind, other) {
                    (Kind::Number(a, _), Kind::Number(b, _)) => a == b,
                    (a, b) => a == b,
                };
                if !alike {
                    return Err(Fault::new(
                        codes::PLAN,
                        format!("the values of `{name}` are of different kinds"),
                    )
                    .label(format!("{} and {}", described(first), described(value))));
                }
            }
            Ok(Coordinate { name: name.clone(), kind })
        })
        .collect()
}

fn kind_of(name: &str, value: &Dynamic) -> Result<Kind, Fault> {
    if let Some(q) = any_quantity(value) {
        return Ok(Kind::Number(q.dimension, q.unit()));
    }
    if value.is::<super::value::Unknown>() {
        return Err(Fault::of_unknown());
    }
    if value.is_bool() {
        return Ok(Kind::Flag);
    }
    let refused = value.is_array() || value.is_map() || value.is_fnptr() || value.is_unit();
    if refused || value.is::<PlanValue>() {
        return Err(Fault::new(codes::PLAN, format!("a value of `{name}` cannot be a coordinate"))
            .label(format!("this is {}", described(value)))
            .help("coordinates are quantities, numbers, texts, yes or no, stacks, materials and lights"));
    }
    if value.is::<SpreadValue>() {
        return Err(Fault::new(codes::PLAN, format!("`{name}` is a spread, which only samples can take"))
            .help("random(#{ .. }, 100), latin_hypercube(#{ .. }, 100) or low_discrepancy(#{ .. }, 128)"));
    }
    Ok(Kind::Words)
}

/// A value that is no number, in words: the name of a stack, a material, a text.
pub fn plain_words(value: &Dynamic) -> String {
    use super::device_value::{LayerValue, MaterialValue, StackValue};
    use super::light_value::LightValue;
    if let Some(text) = value.read_lock::<ImmutableString>() {
        return text.to_string();
    }
    if let Some(stack) = value.read_lock::<StackValue>() {
        return stack.stack.name.clone();
    }
    if let Some(material) = value.read_lock::<MaterialValue>() {
        return material.material.name().to_string();
    }
    if let Some(layer) = value.read_lock::<LayerValue>() {
        return layer.layer.name.clone();
    }
    if let Some(light) = value.read_lock::<LightValue>() {
        return light.words();
    }
    if let Some(q) = any_quantity(value) {
        return q.to_string();
    }
    value.as_bool().map_or_else(|_| described(value), |flag| flag.to_string())
}

fn no_coordinates() -> Fault {
    Fault::new(codes::PLAN, "the plan has no coordinates")
        .help("name what varies: grid(#{ thickness: [20.nm, 50.nm] })")
}

#[cfg(test)]
mod tests;
