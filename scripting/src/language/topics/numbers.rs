//! Numbers and quantities: arithmetic, comparison, units, printing.

use std::cmp::Ordering;
use std::sync::Arc;

use rhai::{Array, Dynamic, Engine, FLOAT, INT, ImmutableString};

use crate::diagnostics::codes;
use crate::language::dimension::Dimension;
use crate::language::fault::{Fault, Outcome, Place};
use crate::language::quantity::Quantity;
use crate::language::session::Session;
use crate::language::steps;
use crate::language::units::UNITS;
use crate::language::value::{Number, any_quantity, give, quantity, text};
use crate::language::vocabulary::{Answer, Call, function, getter, index_getter, topic};

topic! {
    "Numbers and units",
    "A number becomes a quantity by the unit written behind it: `30.nm`, `2e17.per_cm3`, `(t + 5).um`, or by a product \
     with the unit's name: `1.5 * um`. Sums and comparisons need the same dimension; products and quotients have the \
     dimension that follows. A quotient of whole numbers is real: `3 / 2` is `1.5`. A quantity carries the numerical \
     error of the figure it comes from, and prints it: `28.3121 mA/cm2 +- 0.0003`.";

    Method "to" of "quantity" {
        forms: ["quantity.to(\"unit\")"],
        doc: "The number in a unit, as a dimensionless quantity: it prints all its digits, mixes with plain numbers, \
              keeps numerical error and derivatives, and can be given to `exp`, `ln` or `pow`.",
        example: "let t = 30.nm;\nprint(t.to(\"um\"));",
        register: |engine, session| {
            function(engine, session, "to", 2..=2, |_, arguments| {
                let quantity = any_quantity(arguments[0]);
                let name = text(arguments[1], "the unit")?;
                match quantity {
                    Some(quantity) => Ok(give(quantity.to(&name)?)),
                    None => Err(not_a_quantity(arguments[0]).into()),
                }
            });
        },
    }
    Property "error" of "quantity" {
        forms: ["quantity.error"],
        doc: "Its absolute numerical error, a quantity of the same dimension; zero for a number taken as it stands.",
        example: "print((1.5.V).error);",
        register: |engine, session| {
            getter::<Quantity>(engine, session, "error", |_, arguments| {
                let q = arguments[0].read_lock::<Quantity>().map(|q| q.clone()).unwrap_or_default();
                let error = Quantity { value: q.error.unwrap_or(0.0), error: None, derivatives: Vec::new(), ..q };
                Ok(give(error))
            });
        },
    }
    Function "abs" {
        forms: ["abs(x)"],
        doc: "Absolute value of a number or quantity.",
        example: "print(abs(-5.mV));",
        register: |engine, _| {
            engine.register_fn("abs", |q: Quantity| q.abs());
        },
    }
    Function "min" {
        forms: ["min(x, y)"],
        doc: "The smaller of two numbers or of two quantities of one dimension.",
        example: "print(min(30.nm, 1.um));",
        register: |engine, _| choice(engine, "min", Ordering::Less),
    }
    Function "max" {
        forms: ["max(x, y)"],
        doc: "The larger of two numbers or of two quantities of one dimension.",
        example: "print(max(30.nm, 1.um));",
        register: |engine, _| choice(engine, "max", Ordering::Greater),
    }
    Function "linear" {
        forms: ["linear(from, to, count)"],
        doc: "An array of so many values in equal steps from the first to the last, both included. Each is what a person would type \
              for it: of `linear(0, 1, 11)` the fourth is 0.3 to the last bit.",
        example: "for t in linear(20.nm, 100.nm, 5) { print(t); }",
        register: |engine, session| {
            function(engine, session, "linear", 3..=3, |call, arguments| spaced(call, arguments, false));
        },
    }
    Function "logarithmic" {
        forms: ["logarithmic(from, to, count)"],
        doc: "An array of so many values in equal ratios from the first to the last, both included; both must be positive. Round ones \
              are exact: every decade between 1e16 and 1e19.",
        example: "for density in logarithmic(1e16.per_cm3, 1e19.per_cm3, 4) { print(density); }",
        register: |engine, session| {
            function(engine, session, "logarithmic", 3..=3, |call, arguments| spaced(call, arguments, true));
        },
    }
    Constant "infinity" {
        forms: ["infinity"],
        doc: "No bound: `infinity.ns` is the lifetime of a channel that is switched off.",
        example: "print(infinity.ns);",
        register: |engine, session| arithmetic(engine, session),
    }
}

fn not_a_quantity(value: &Dynamic) -> Fault {
    if value.is::<crate::language::value::Unknown>() {
        return Fault::of_unknown();
    }
    if value.is_unit() {
        return Fault::new(
            crate::diagnostics::codes::ABSENT_FIGURE,
            "`.to(..)` of a value that does not exist, `()`",
        )
        .help("a figure of merit that does not exist is `()`, and `.reason(\"voc\")` of the result says why; compare with `()` first");
    }
    Fault::new(crate::diagnostics::codes::WRONG_KIND, "`.to(..)` belongs to a quantity")
        .label(format!("this is {}", crate::language::value::described(value)))
}

/// Arithmetic, comparison, units and printing of quantities and numbers.
fn arithmetic(engine: &mut Engine, session: &Arc<Session>) {
    engine.register_type_with_name::<Quantity>("quantity");
    for pair in [pairs::<Quantity, Quantity>, pairs::<Quantity, INT>, pairs::<Quantity, FLOAT>] {
        pair(engine);
    }
    pairs::<INT, Quantity>(engine);
    pairs::<FLOAT, Quantity>(engine);
    engine.register_fn("-", |q: Quantity| q.negate());
    engine.register_fn("+", |q: Quantity| q);
    plain_numbers(engine);
    units(engine);
    printing(engine);
    index_getter::<Quantity>(engine, session, |_, arguments| {
        let name = text(arguments[1], "a property")?;
        let q = arguments[0].read_lock::<Quantity>().map(|q| q.clone()).unwrap_or_default();
        Err(no_unit(&name, &q).into())
    });
}

/// The fault of `30.nanometre`.
pub fn no_unit(name: &str, of: &Quantity) -> Fault {
    crate::language::quantity::unknown_unit(name).label(format!("neither a unit nor a property of {of}"))
}

/// Operators between two kinds of number of which one is a quantity.
fn pairs<A: AsQuantity, B: AsQuantity>(engine: &mut Engine) {
    fn out(result: Result<Quantity, Fault>) -> Outcome<Quantity> {
        Ok(result?)
    }
    engine.register_fn("+", |a: A, b: B| out(a.quantity().add(&b.quantity())));
    engine.register_fn("-", |a: A, b: B| out(a.quantity().subtract(&b.quantity())));
    engine.register_fn("*", |a: A, b: B| out(a.quantity().multiply(&b.quantity())));
    engine.register_fn("/", |a: A, b: B| out(a.quantity().divide(&b.quantity())));
    engine.register_fn("%", |a: A, b: B| out(a.quantity().remainder(&b.quantity())));
    engine.register_fn("**", |a: A, b: B| out(a.quantity().power(&b.quantity())));
    fn order<A: AsQuantity, B: AsQuantity>(
        engine: &mut Engine,
        name: &'static str,
        holds: fn(Ordering) -> bool,
    ) {
        engine.register_fn(name, move |a: A, b: B| -> Outcome<bool> {
            Ok(a.quantity().compare(&b.quantity(), name)?.is_some_and(holds))
        });
    }
    order::<A, B>(engine, "==", Ordering::is_eq);
    order::<A, B>(engine, "<", Ordering::is_lt);
    order::<A, B>(engine, "<=", Ordering::is_le);
    order::<A, B>(engine, ">", Ordering::is_gt);
    order::<A, B>(engine, ">=", Ordering::is_ge);
    order::<A, B>(engine, "!=", Ordering::is_ne);
}

/// What arithmetic of plain numbers does differently here: real quotients, exact comparison, own powers.
fn plain_numbers(engine: &mut Engine) {
    fn real(engine: &mut Engine, name: &str, f: fn(f64, f64) -> f64) {
        engine.register_fn(name, move |a: FLOAT, b: FLOAT| f(a, b));
        engine.register_fn(name, move |a: INT, b: FLOAT| f(a as f64, b));
        engine.register_fn(name, move |a: FLOAT, b: INT| f(a, b as f64));
    }
    fn test(engine: &mut Engine, name: &str, f: fn(f64, f64) -> bool) {
        engine.register_fn(name, move |a: FLOAT, b: FLOAT| f(a, b));
        engine.register_fn(name, move |a: INT, b: FLOAT| f(a as f64, b));
        engine.register_fn(name, move |a: FLOAT, b: INT| f(a, b as f64));
    }
    real(engine, "/", |a, b| a / b);
    engine.register_fn("/", |a: INT, b: INT| a as f64 / b as f64);
    let power =
        |a: f64, b: f64| Quantity::number(a).power(&Quantity::number(b)).map_or(f64::NAN, |q| q.value);
    real(engine, "**", power);
    engine.register_fn("**", move |a: INT, b: INT| -> Dynamic {
        match u32::try_from(b).ok().and_then(|b| a.checked_pow(b)) {
            Some(whole) => whole.into(),
            None => power(a as f64, b as f64).into(),
        }
    });
    test(engine, "==", |a, b| a == b);
    test(engine, "!=", |a, b| a != b);
    test(engine, "<", |a, b| a < b);
    test(engine, "<=", |a, b| a <= b);
    test(engine, ">", |a, b| a > b);
    test(engine, ">=", |a, b| a >= b);
}

/// Each unit as a property of numbers and dimensionless quantities.
fn units(engine: &mut Engine) {
    for unit in UNITS {
        engine.register_get(unit.name, move |n: &mut INT| Quantity::in_unit(*n as f64, unit));
        engine.register_get(unit.name, move |x: &mut FLOAT| Quantity::in_unit(*x, unit));
        engine.register_get(unit.name, move |q: &mut Quantity| -> Outcome<Quantity> {
            Ok(q.times_unit(unit)?)
        });
    }
}

/// Quantities in texts.
fn printing(engine: &mut Engine) {
    engine.register_fn("to_string", |q: Quantity| q.to_string());
    engine.register_fn("to_debug", |q: Quantity| q.to_string());
    engine.register_fn("print", |q: Quantity| q.to_string());
    engine.register_fn("debug", |q: Quantity| q.to_string());
    engine.register_fn("+", |text: ImmutableString, q: Quantity| format!("{text}{q}"));
    engine.register_fn("+", |q: Quantity, text: ImmutableString| format!("{q}{text}"));
}

/// Values in equal steps or ratios.
fn spaced(call: &Call, arguments: &mut [&mut Dynamic], ratios: bool) -> Answer {
    let at = |index: usize| move |fault: Fault| fault.at(Place::Argument(index));
    let from = finite(arguments[0], "the first value").map_err(at(0))?;
    let to = quantity(arguments[1], "the last value", from.dimension).map_err(at(1))?;
    let count = quantity(arguments[2], "the count", Dimension::NONE).map_err(at(2))?;
    if from.unknown || to.unknown || count.unknown {
        return Err(Fault::of_unknown().into());
    }
    let most = call.session.options.limits.array;
    if count.value.fract() != 0.0 || count.value < 2.0 || count.value > most as f64 {
        return Err(Fault::new(
            codes::WRONG_KIND,
            format!("the count must be a whole number from 2 to {most}"),
        )
        .label(format!("this is {count}"))
        .at(Place::Argument(2))
        .into());
    }
    if ratios && (from.value <= 0.0 || to.value <= 0.0) {
        return Err(Fault::new(codes::PROFILE, "equal ratios go between positive values")
            .label(format!("this is {}", if from.value <= 0.0 { &from } else { &to }))
            .at(Place::Argument(usize::from(from.value > 0.0)))
            .into());
    }
    let last = count.value as usize - 1;
    let mut list = Array::with_capacity(last + 1);
    // numbers in the unit that they are typed in, so that the values are those that a person would type
    let unit = from.unit();
    let typed = |q: &Quantity| unit.map_or(q.value, |unit| unit.typed(q.value));
    let (first, end) = (typed(&from), typed(&to));
    for k in 0..=last {
        let share = Quantity::number(k as f64 / last as f64);
        let value = match k {
            0 => from.clone(),
            k if k == last => to.clone(),
            _ => {
                let (rough, number) = if ratios {
                    (from.multiply(&to.divide(&from)?.power(&share)?)?, steps::ratio(first, end, k, last))
                } else {
                    (from.add(&to.subtract(&from)?.multiply(&share)?)?, steps::step(first, end, k, last))
                };
                // errors and derivatives come from the arithmetic of quantities
                Quantity { value: unit.map_or(number, |unit| unit.to_si(number)), ..rough }
            }
        };
        list.push(give(Quantity { shown_in: from.shown_in, ..value }));
    }
    Ok(list.into())
}

/// A quantity of any dimension, or a number, that is finite.
fn finite(value: &Dynamic, what: &str) -> Result<Quantity, Fault> {
    let dimension = any_quantity(value).map_or(Dimension::NONE, |q| q.dimension);
    quantity(value, what, dimension)
}

/// The smaller or larger of two numbers of any kind.
fn choice(engine: &mut Engine, name: &'static str, wanted: Ordering) {
    fn pick<A: AsQuantity, B: AsQuantity>(engine: &mut Engine, name: &'static str, wanted: Ordering) {
        engine.register_fn(name, move |a: A, b: B| -> Outcome<Quantity> {
            let (a, b) = (a.quantity(), b.quantity());
            let order = a.compare(&b, name)?;
            let mut chosen = if order == Some(wanted.reverse()) { b.clone() } else { a.clone() };
            chosen.unknown = a.unknown || b.unknown;
            Ok(chosen)
        });
    }
    pick::<Quantity, Quantity>(engine, name, wanted);
    pick::<Quantity, INT>(engine, name, wanted);
    pick::<Quantity, FLOAT>(engine, name, wanted);
    pick::<INT, Quantity>(engine, name, wanted);
    pick::<FLOAT, Quantity>(engine, name, wanted);
}

/// A quantity, or a number taken as one.
trait AsQuantity: rhai::Variant + Clone {
    fn quantity(&self) -> Quantity;
}

impl AsQuantity for Quantity {
    fn quantity(&self) -> Quantity {
        self.clone()
    }
}

impl AsQuantity for INT {
    fn quantity(&self) -> Quantity {
        self.plain()
    }
}

impl AsQuantity for FLOAT {
    fn quantity(&self) -> Quantity {
        self.plain()
    }
}
