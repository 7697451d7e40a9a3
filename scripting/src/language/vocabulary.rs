//! The vocabulary: one row for each thing a script can say. A row drives registration, near names, forms in messages and the reference page.

use std::any::TypeId;
use std::ops::RangeInclusive;
use std::sync::Arc;

use rhai::{Dynamic, Engine, NativeCallContext, Position};

use crate::diagnostics::codes;

use super::fault::{Fault, Faults, Outcome};
use super::session::Session;
use super::topics;
use super::value::Unknown;

/// What a row describes.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Sort {
    /// `name(..)`.
    Function,
    /// `value.name(..)`.
    Method,
    /// `value.name`, to be read and, where the form shows it, set.
    Property,
    /// A word with a fixed value.
    Constant,
}

/// One option of an option map.
#[derive(Clone, Copy, Debug)]
pub struct OptionRow {
    /// Its key.
    pub key: &'static str,
    /// What it takes: "a velocity", "a text: `a` or `b`".
    pub takes: &'static str,
    /// One sentence.
    pub doc: &'static str,
}

/// One row of the vocabulary.
pub struct Entry {
    /// Function, method, property or constant.
    pub sort: Sort,
    /// The kind of value that a method or property belongs to; empty otherwise.
    pub owner: &'static str,
    /// The word.
    pub name: &'static str,
    /// How it is written.
    pub forms: &'static [&'static str],
    /// What it does: the manual.
    pub doc: &'static str,
    /// Its option map.
    pub options: &'static [OptionRow],
    /// A script that runs as it stands.
    pub example: &'static str,
    /// Teaches it to an engine.
    pub register: fn(&mut Engine, &Arc<Session>),
}

/// A chapter of the reference page.
pub struct Topic {
    /// Its heading.
    pub title: &'static str,
    /// What it is about.
    pub intro: &'static str,
    /// Its rows.
    pub entries: &'static [Entry],
}

/// Declares a topic: `sort "name" of "owner" { forms: [..], doc: "..", options: .., example: "..", register: |engine, session| .. }`.
macro_rules! topic {
    (
        $title:literal, $intro:literal;
        $(
            $sort:ident $name:literal $(of $owner:literal)? {
                forms: [$($form:literal),+ $(,)?],
                doc: $doc:literal,
                $(options: $options:expr,)?
                example: $example:literal,
                register: $register:expr $(,)?
            }
        )*
    ) => {
        /// The rows of this topic.
        pub static TOPIC: $crate::language::vocabulary::Topic = $crate::language::vocabulary::Topic {
            title: $title,
            intro: $intro,
            entries: &[$(
                $crate::language::vocabulary::Entry {
                    sort: $crate::language::vocabulary::Sort::$sort,
                    owner: concat!("", $($owner)?),
                    name: $name,
                    forms: &[$($form),+],
                    doc: $doc,
                    options: topic!(@options $($options)?),
                    example: $example,
                    register: $register,
                },
            )*],
        };
    };
    (@options) => { &[] };
    (@options $options:expr) => { $options };
}
pub(super) use topic;

/// All topics, in the order of the reference page.
pub fn topics() -> &'static [&'static Topic] {
    topics::ALL
}

/// All rows.
pub fn entries() -> impl Iterator<Item = &'static Entry> {
    topics().iter().flat_map(|topic| topic.entries.iter())
}

/// Rows of a function or method of this name.
pub fn callable(name: &str) -> impl Iterator<Item = &'static Entry> {
    entries().filter(move |e| e.name == name && matches!(e.sort, Sort::Function | Sort::Method))
}

/// Names of the properties of a kind of value.
pub fn properties(owner: &'static str) -> impl Iterator<Item = &'static str> + Clone {
    topics()
        .iter()
        .flat_map(|topic| topic.entries.iter())
        .filter(move |e| e.owner == owner && e.sort == Sort::Property)
        .map(|e| e.name)
}

/// A call in progress, as the functions of the vocabulary see it.
pub struct Call<'a> {
    /// The run.
    pub session: &'a Arc<Session>,
    /// Where the call stands.
    pub position: Position,
    /// The call as the engine sees it, to call closures in.
    pub context: &'a NativeCallContext<'a>,
}

impl Call<'_> {
    /// Line and column of the call, 0 where unknown.
    pub fn line_and_column(&self) -> (usize, usize) {
        (self.position.line().unwrap_or(0), self.position.position().unwrap_or(0))
    }
}

/// What the functions of the vocabulary return.
pub type Answer = Result<Dynamic, Faults>;

impl From<Fault> for Faults {
    fn from(fault: Fault) -> Self {
        Faults(vec![fault])
    }
}

/// The body of a function of the vocabulary.
pub type Body = fn(&Call, &mut [&mut Dynamic]) -> Answer;

/// Registers a function for each number of arguments in the range; every argument may be of any kind.
///
/// Arguments come by value: a function that took its first one by reference would make the engine write it back
/// where it came from, as if it had been changed.
pub fn function(
    engine: &mut Engine,
    session: &Arc<Session>,
    name: &'static str,
    arguments: RangeInclusive<usize>,
    body: Body,
) {
    for count in arguments {
        by_value::<Dynamic>(engine, session, name, count, body);
    }
}

/// Registers a method of values of type `T` that changes nothing; the range counts the arguments between the brackets.
pub fn method<T: rhai::Variant + Clone>(
    engine: &mut Engine,
    session: &Arc<Session>,
    name: &'static str,
    arguments: RangeInclusive<usize>,
    body: Body,
) {
    for count in arguments {
        by_value::<T>(engine, session, name, count + 1, body);
    }
}

/// Registers a function of so many arguments by value, the first of which is a `T`.
fn by_value<T: rhai::Variant + Clone>(
    engine: &mut Engine,
    session: &Arc<Session>,
    name: &'static str,
    count: usize,
    body: Body,
) {
    let session = Arc::clone(session);
    let run = move |context: NativeCallContext, mut arguments: Vec<Dynamic>| -> Outcome<Dynamic> {
        let call = Call { session: &session, position: context.call_position(), context: &context };
        let mut references: Vec<&mut Dynamic> = arguments.iter_mut().collect();
        settle(&call, body(&call, &mut references).map_err(|faults| with_forms(name, faults)))
    };
    type D = Dynamic;
    type C<'a> = NativeCallContext<'a>;
    match count {
        0 => engine.register_fn(name, move |c: C| run(c, Vec::new())),
        1 => engine.register_fn(name, move |c: C, x: T| run(c, vec![D::from(x)])),
        2 => engine.register_fn(name, move |c: C, x: T, y: D| run(c, vec![D::from(x), y])),
        3 => engine.register_fn(name, move |c: C, x: T, y: D, z: D| run(c, vec![D::from(x), y, z])),
        4 => engine.register_fn(name, move |c: C, x: T, y: D, z: D, u: D| run(c, vec![D::from(x), y, z, u])),
        _ => engine.register_fn(name, move |c: C, x: T, y: D, z: D, u: D, v: D| {
            run(c, vec![D::from(x), y, z, u, v])
        }),
    };
}

/// The body of a function that calls closures, whose errors it passes on.
pub type Caller = fn(&Call, &mut [&mut Dynamic]) -> Outcome<Dynamic>;

/// Registers a method that calls closures; the range counts the arguments between the brackets.
pub fn caller<T: rhai::Variant + Clone>(
    engine: &mut Engine,
    session: &Arc<Session>,
    name: &'static str,
    arguments: RangeInclusive<usize>,
    body: Caller,
) {
    for count in arguments {
        let mut kinds = vec![TypeId::of::<T>()];
        kinds.extend(vec![TypeId::of::<Dynamic>(); count]);
        let session = Arc::clone(session);
        engine.register_raw_fn(
            name,
            kinds,
            move |context: NativeCallContext, arguments: &mut [&mut Dynamic]| {
                let call = Call { session: &session, position: context.call_position(), context: &context };
                // the receiver is copied, so that the engine sees that it is not changed
                let mut values: Vec<Dynamic> = arguments.iter().map(|value| value.flatten_clone()).collect();
                let mut references: Vec<&mut Dynamic> = values.iter_mut().collect();
                settle_error(&call, body(&call, &mut references))
            },
        );
    }
}

/// As [`settle`], where errors of closures may come along.
fn settle_error(call: &Call, outcome: Outcome<Dynamic>) -> Outcome<Dynamic> {
    outcome.or_else(|error| match *error {
        rhai::EvalAltResult::ErrorRuntime(value, Position::NONE) if value.is::<Faults>() => {
            settle(call, Err(value.cast::<Faults>()))
        }
        other if call.session.checking() && !super::report::is_stop(&other) => {
            super::report::keep(call.session, &other);
            Ok(Dynamic::from(Unknown))
        }
        other => Err(Box::new(other)),
    })
}

/// Registers a property of values of type `T` that can be read.
pub fn getter<T: rhai::Variant + Clone>(
    engine: &mut Engine,
    session: &Arc<Session>,
    name: &'static str,
    body: Body,
) {
    method_owned::<T>(engine, session, format!("get${name}"), 0, body);
}

/// Registers the setting of a property of values of type `T`.
pub fn setter<T: rhai::Variant + Clone>(
    engine: &mut Engine,
    session: &Arc<Session>,
    name: &'static str,
    body: Body,
) {
    method_owned::<T>(engine, session, format!("set${name}"), 1, body);
}

/// Registers what `value[key]` (and `value.key` where no property of that name is registered) gives.
pub fn index_getter<T: rhai::Variant + Clone>(engine: &mut Engine, session: &Arc<Session>, body: Body) {
    method_owned::<T>(engine, session, "index$get$".to_string(), 1, body);
}

/// Registers what `value[key] = ..` (and `value.key = ..` where no property of that name is registered) does.
pub fn index_setter<T: rhai::Variant + Clone>(engine: &mut Engine, session: &Arc<Session>, body: Body) {
    method_owned::<T>(engine, session, "index$set$".to_string(), 2, body);
}

fn method_owned<T: rhai::Variant + Clone>(
    engine: &mut Engine,
    session: &Arc<Session>,
    name: String,
    arguments: usize,
    body: Body,
) {
    let mut kinds = vec![TypeId::of::<T>()];
    kinds.extend(vec![TypeId::of::<Dynamic>(); arguments]);
    register(engine, session, &name, kinds, body);
}

fn register(engine: &mut Engine, session: &Arc<Session>, name: &str, kinds: Vec<TypeId>, body: Body) {
    let session = Arc::clone(session);
    engine.register_raw_fn(name, kinds, move |context: NativeCallContext, arguments: &mut [&mut Dynamic]| {
        let call = Call { session: &session, position: context.call_position(), context: &context };
        settle(&call, body(&call, arguments))
    });
}

/// An argument of the wrong kind, with no better help: the forms of the function.
fn with_forms(name: &str, faults: Faults) -> Faults {
    let helped = faults.0.into_iter().map(|fault| {
        if fault.code != codes::WRONG_KIND || fault.help.is_some() || fault.of_unknown {
            return fault;
        }
        let forms: Vec<&str> = callable(name).flat_map(|e| e.forms.iter().copied()).collect();
        let title = if forms.len() == 1 { "its form" } else { "its forms" };
        fault.help(format!("{title}: {}", forms.join("; ")))
    });
    Faults(helped.collect())
}

/// A run stops at the first fault; a check keeps it and goes on with an unknown value.
fn settle(call: &Call, answer: Answer) -> Outcome<Dynamic> {
    match answer {
        Ok(value) => Ok(value),
        Err(faults) if call.session.checking() => {
            for fault in faults.0.iter().filter(|f| !f.of_unknown) {
                call.session.keep(fault, call.position);
            }
            Ok(Dynamic::from(Unknown))
        }
        Err(faults) => Err(Box::new(rhai::EvalAltResult::ErrorRuntime(Dynamic::from(faults), call.position))),
    }
}

/// The fault of a property that a kind of value does not have.
pub fn unknown_property(owner: &'static str, name: &str) -> Fault {
    Fault::new(
        codes::UNKNOWN_PROPERTY,
        format!("{} has no property `{name}`", super::value::with_article(owner)),
    )
    .candidates(name, properties(owner))
}
