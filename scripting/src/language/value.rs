//! The kinds of value that scripts meet, what they are called, and how arguments are taken out of them.

use std::sync::Arc;

use rhai::{Array, Dynamic, Engine, FLOAT, INT, ImmutableString, Map};

use crate::diagnostics::codes;

use super::device_value::{LayerValue, MaterialValue, StackValue};
use super::dimension::Dimension;
use super::fault::{Fault, Faults, Place};
use super::light_value::LightValue;
use super::plan::{PlanValue, SpreadValue};
use super::quantity::Quantity;
use super::result_value::{CapacitanceValue, CurveValue, ResponseValue, StateValue};
use super::session::Session;
use super::table::TableValue;

/// What stands, while checking, for a value that an earlier fault left unknown.
#[derive(Clone, Copy, Debug)]
pub struct Unknown;

/// A loop over what is not known runs once, with what is not known.
impl IntoIterator for Unknown {
    type Item = Unknown;
    type IntoIter = std::iter::Once<Unknown>;
    fn into_iter(self) -> Self::IntoIter {
        std::iter::once(self)
    }
}

/// Names that Rhai uses for the kinds of value, and ours for a person.
pub const KINDS: &[(&str, &str)] = &[
    ("quantity", "quantity"),
    ("i64", "whole number"),
    ("f64", "number"),
    ("string", "text"),
    ("char", "character"),
    ("bool", "yes or no"),
    ("array", "array"),
    ("map", "map"),
    ("()", "`()`"),
    ("Fn", "function"),
    ("range", "range"),
    ("range=", "range"),
    ("unknown", "unknown value"),
    ("material", "material"),
    ("layer", "layer"),
    ("doping", "doping"),
    ("defect", "defect"),
    ("profile", "profile"),
    ("interface", "interface"),
    ("contact", "contact"),
    ("film", "film"),
    ("coating", "coating"),
    ("optical constants", "optical constants"),
    ("stack", "stack"),
    ("light", "light"),
    ("J-V curve", "J-V curve"),
    ("bias point", "bias point"),
    ("spectral response", "spectral response"),
    ("plan", "plan"),
    ("spread", "spread"),
    ("table", "table"),
    ("C-V curve", "C-V curve"),
];

/// "a layer", "an array".
pub fn with_article(kind: &str) -> String {
    match kind.chars().next() {
        Some('`') | None => kind.to_string(),
        Some('a' | 'e' | 'i' | 'o' | 'u') => format!("an {kind}"),
        _ if kind.ends_with("constants") => kind.to_string(),
        _ => format!("a {kind}"),
    }
}

/// What a value is, with its content where that is short: "the plain number 30", "a material".
pub fn described(value: &Dynamic) -> String {
    if let Some(q) = value.read_lock::<Quantity>() {
        return if q.is_number() {
            format!("the plain number {}", *q)
        } else {
            format!("{} ({})", q.dimension.family_name(), *q)
        };
    }
    if let Ok(i) = value.as_int() {
        return format!("the plain number {i}");
    }
    if let Ok(f) = value.as_float() {
        return format!("the plain number {}", super::display::plain(f));
    }
    if let Some(text) = value.read_lock::<ImmutableString>() {
        let short: String = text.chars().take(40).collect();
        return format!("the text \"{short}\"");
    }
    if let Ok(flag) = value.as_bool() {
        return format!("`{flag}`");
    }
    if value.is_unit() {
        return "nothing, `()`".to_string();
    }
    with_article(kind_name(value.type_name()))
}

/// The name for a person of a kind by Rhai's name.
pub fn kind_name(rhai: &str) -> &str {
    let short = match rhai {
        "rhai::Array" => "array",
        "rhai::Map" => "map",
        "&str | ImmutableString | String" | "String" | "&str" | "ImmutableString" => "string",
        other => other,
    };
    KINDS.iter().find(|(name, _)| *name == short).map_or("value", |(_, words)| words)
}

fn wrong_kind(value: &Dynamic, what: &str, wanted: &str) -> Fault {
    if value.is::<Unknown>() {
        return Fault::of_unknown();
    }
    if value.is_unit() {
        return Fault::new(codes::ABSENT_FIGURE, format!("{what} is missing: it is `()`"))
            .label(format!("expected {wanted}; found nothing, `()`"))
            .help("a figure of merit that does not exist is `()`, and `.reason(\"voc\")` of the result says why; compare with `()` first");
    }
    Fault::new(codes::WRONG_KIND, format!("{what} must be {wanted}"))
        .label(format!("expected {wanted}; found {}", described(value)))
}

/// A quantity of this dimension; a number where the dimension is that of a number.
///
/// `what` names it for the message: "thickness of layer `window`".
///
/// # Errors
/// A bare number, another dimension, another kind of value, a value that is not finite.
pub fn quantity(value: &Dynamic, what: &str, dimension: Dimension) -> Result<Quantity, Fault> {
    let q = quantity_or_infinite(value, what, dimension)?;
    if !q.value.is_finite() {
        return Err(Fault::new(codes::NOT_FINITE, format!("{what} is not finite"))
            .label(format!("this is {}", super::display::plain(q.value))));
    }
    Ok(q)
}

/// As [`quantity`], with infinity allowed (not a number never is).
pub fn quantity_or_infinite(value: &Dynamic, what: &str, dimension: Dimension) -> Result<Quantity, Fault> {
    let Some(q) = any_quantity(value) else {
        return Err(wrong_kind(value, what, &dimension.family()));
    };
    if q.dimension != dimension {
        let wanted = dimension.family();
        let label = format!("expected {wanted}; found {}", described(value));
        if q.is_number() {
            let number = super::display::plain(q.value);
            return Err(Fault::new(
                codes::BARE_NUMBER,
                format!("{what} must be {}, and has no unit", dimension.family_name()),
            )
            .label(label)
            .help(match dimension.example_unit() {
                Some(unit) => format!("write `{number}.{unit}`, with the unit that is meant"),
                None => "give the number its unit".to_string(),
            }));
        }
        return Err(Fault::new(
            codes::WRONG_DIMENSION,
            format!("{what} must be {}, not {}", dimension.family_name(), q.dimension.family_name()),
        )
        .label(label));
    }
    if q.value.is_nan() {
        return Err(Fault::new(codes::NOT_FINITE, format!("{what} is not a number")).label("this is NaN"));
    }
    Ok(q)
}

/// Any quantity or number.
pub fn any_quantity(value: &Dynamic) -> Option<Quantity> {
    if let Some(q) = value.read_lock::<Quantity>() {
        return Some(q.clone());
    }
    if let Ok(i) = value.as_int() {
        return Some(Quantity::number(i as f64));
    }
    value.as_float().ok().map(Quantity::number)
}

/// A text.
pub fn text(value: &Dynamic, what: &str) -> Result<String, Fault> {
    match value.read_lock::<ImmutableString>() {
        Some(text) => Ok(text.to_string()),
        None => Err(wrong_kind(value, what, "a text")),
    }
}

/// A value of one of the kinds of the vocabulary; `wanted` is its name with an article.
pub fn take<T: rhai::Variant + Clone>(value: &Dynamic, what: &str, wanted: &str) -> Result<T, Fault> {
    match value.read_lock::<T>() {
        Some(found) => Ok(found.clone()),
        None => Err(wrong_kind(value, what, wanted)),
    }
}

/// An array.
pub fn array(value: &Dynamic, what: &str) -> Result<Array, Fault> {
    take::<Array>(value, what, "an array")
}

/// A map.
pub fn map(value: &Dynamic, what: &str) -> Result<Map, Fault> {
    take::<Map>(value, what, "a map, `#{ .. }`")
}

/// A quantity as scripts get it.
pub fn give(quantity: Quantity) -> Dynamic {
    Dynamic::from(quantity)
}

/// An option map that has been checked against its keys.
#[derive(Debug)]
pub struct Options {
    map: Map,
}

impl Options {
    /// The options of a map whose keys must all be among these.
    ///
    /// # Errors
    /// A value that is no map, or a key that is not known, with the near name.
    pub fn new<'a>(
        value: &Dynamic,
        what: &str,
        keys: impl IntoIterator<Item = &'a str> + Clone,
    ) -> Result<Options, Vec<Fault>> {
        let map = map(value, &format!("the options of {what}")).map_err(|f| vec![f])?;
        let faults: Vec<Fault> = map
            .keys()
            .filter(|key| !keys.clone().into_iter().any(|known| known == key.as_str()))
            .map(|key| {
                Fault::new(codes::UNKNOWN_OPTION, format!("{what} has no option `{key}`"))
                    .candidates(key, keys.clone())
                    .at(Place::Key(key.to_string()))
            })
            .collect();
        if faults.is_empty() { Ok(Options { map }) } else { Err(faults) }
    }

    /// No options.
    pub fn none() -> Options {
        Options { map: Map::new() }
    }

    /// The value of a key, unless it is absent or `()`.
    pub fn get(&self, key: &str) -> Option<&Dynamic> {
        self.map.get(key).filter(|v| !v.is_unit())
    }

    /// The quantity of a key.
    pub fn quantity(&self, key: &str, what: &str, dimension: Dimension) -> Result<Option<Quantity>, Fault> {
        self.get(key)
            .map(|v| quantity(v, what, dimension))
            .transpose()
            .map_err(|f| f.at(Place::Option(key.to_string())))
    }

    /// Keys and values, by key.
    pub fn iter(&self) -> impl Iterator<Item = (&str, &Dynamic)> {
        self.map.iter().filter(|(_, v)| !v.is_unit()).map(|(k, v)| (k.as_str(), v))
    }
}

/// How values of a kind stand in texts.
fn shown<T: rhai::Variant + Clone>(engine: &mut Engine, words: fn(&T) -> String) {
    for name in ["to_string", "to_debug", "print", "debug"] {
        engine.register_fn(name, move |value: T| words(&value));
    }
    engine.register_fn("+", move |text: ImmutableString, value: T| format!("{text}{}", words(&value)));
}

/// Teaches an engine the values that stand for themselves: the unknown one, and faults that a script catches.
pub fn register(engine: &mut Engine, session: &Arc<Session>) {
    engine.register_type_with_name::<Unknown>("unknown");
    super::vocabulary::index_getter::<Unknown>(engine, session, |_, _| Ok(Dynamic::from(Unknown)));
    super::vocabulary::index_setter::<Unknown>(engine, session, |_, _| Ok(Dynamic::UNIT));
    engine.register_type_with_name::<Faults>("fault");
    engine.register_iterator::<Unknown>();
    shown::<MaterialValue>(engine, |m| format!("material {}", m.material.name()));
    shown::<LayerValue>(engine, |l| format!("layer `{}`, {}", l.layer.name, l.layer.thickness));
    shown::<StackValue>(engine, |s| format!("stack `{}`, layers: {}", s.stack.name, s.stack.layers.len()));
    shown::<LightValue>(engine, LightValue::words);
    shown::<CurveValue>(engine, |c| format!("J-V curve of `{}`", c.0.stack.name));
    shown::<StateValue>(engine, |p| format!("bias point of `{}`", p.0.stack.name));
    shown::<PlanValue>(engine, |p| format!("plan: {}, {} points", p.0.words(), p.0.size));
    shown::<SpreadValue>(engine, |s| s.0.words());
    shown::<TableValue>(engine, |t| t.0.words());
    shown::<CapacitanceValue>(engine, |c| format!("C-V curve of `{}`", c.0.stack.name));
    shown::<ResponseValue>(engine, |r| format!("spectral response of `{}`", r.0.stack.name));
    let words = |faults: &mut Faults| -> String {
        let messages: Vec<&str> = faults.0.iter().map(|f| f.message.as_str()).collect();
        messages.join("; ")
    };
    engine.register_fn("to_string", words);
    engine.register_fn("to_debug", words);
    engine.register_get("message", words);
}

/// The number types of Rhai, for the registration of arithmetic.
pub trait Number: rhai::Variant + Clone {
    /// As a plain quantity.
    fn plain(self) -> Quantity;
}

impl Number for INT {
    fn plain(self) -> Quantity {
        Quantity::number(self as f64)
    }
}

impl Number for FLOAT {
    fn plain(self) -> Quantity {
        Quantity::number(self)
    }
}
