//! Functions of plain numbers: exponentials, powers, trigonometry, all through the solver's own so that every machine agrees.

use std::sync::Arc;

use epiloom_solver::math::elementary;
use rhai::{Engine, FLOAT, INT};

use crate::diagnostics::codes;
use crate::language::fault::{Fault, Place};
use crate::language::quantity::Quantity;
use crate::language::session::Session;
use crate::language::value::{Unknown, any_quantity, described, give};
use crate::language::vocabulary::{function, topic};

topic! {
    "Functions of numbers",
    "They take plain numbers and dimensionless quantities (a ratio, or what `.to(\"unit\")` gives), keep numerical error and \
     derivatives, and give the same bits on every machine.";

    Function "exp" {
        forms: ["exp(x)"],
        doc: "e to the power x.",
        example: "print(exp(0.5.V / 25.85.mV));",
        register: |engine, session| one(engine, session, "exp", |x| { let e = elementary::exp(x); (e, e) }),
    }
    Function "ln" {
        forms: ["ln(x)"],
        doc: "Natural logarithm.",
        example: "print(ln(2e17.per_cm3 / 1e17.per_cm3));",
        register: |engine, session| one(engine, session, "ln", |x| (elementary::ln(x), 1.0 / x)),
    }
    Function "log10" {
        forms: ["log10(x)"],
        doc: "Logarithm to base ten.",
        example: "print(log10(1e17.per_cm3.to(\"per_cm3\")));",
        register: |engine, session| one(engine, session, "log10", |x| (elementary::log10(x), 1.0 / (x * std::f64::consts::LN_10))),
    }
    Function "sqrt" {
        forms: ["sqrt(x)"],
        doc: "Square root of a number, or of a quantity whose root has a dimension: the root of an area is a length.",
        example: "print(sqrt(25.cm2_per_s * 10.ns));",
        register: |engine, session| {
            function(engine, session, "sqrt", 1..=1, |_, arguments| match any_quantity(arguments[0]) {
                Some(q) => Ok(give(q.sqrt().map_err(|f| f.at(Place::Argument(0)))?)),
                None => Err(not_a_number("sqrt", arguments[0]).into()),
            });
        },
    }
    Function "pow" {
        forms: ["pow(x, y)", "x ** y"],
        doc: "x to the power y; a quantity with a unit takes powers that leave whole exponents of its dimension.",
        example: "print(pow(2, 0.5));",
        register: |engine, session| {
            function(engine, session, "pow", 2..=2, |_, arguments| {
                let base = any_quantity(arguments[0]).ok_or_else(|| not_a_number("pow", arguments[0]))?;
                let exponent = any_quantity(arguments[1]).ok_or_else(|| not_a_number("pow", arguments[1]))?;
                Ok(give(base.power(&exponent)?))
            });
        },
    }
    Function "sin" {
        forms: ["sin(x)"],
        doc: "Sine of an angle in radians.",
        example: "print(sin(0.5));",
        register: |engine, session| one(engine, session, "sin", |x| (elementary::sin(x), elementary::cos(x))),
    }
    Function "cos" {
        forms: ["cos(x)"],
        doc: "Cosine of an angle in radians.",
        example: "print(cos(0.5));",
        register: |engine, session| one(engine, session, "cos", |x| (elementary::cos(x), -elementary::sin(x))),
    }
    Function "tan" {
        forms: ["tan(x)"],
        doc: "Tangent of an angle in radians.",
        example: "print(tan(0.5));",
        register: |engine, session| one(engine, session, "tan", |x| { let t = elementary::tan(x); (t, 1.0 + t * t) }),
    }
    Function "asin" {
        forms: ["asin(x)"],
        doc: "Inverse sine, in radians.",
        example: "print(asin(0.5));",
        register: |engine, session| one(engine, session, "asin", |x| (elementary::asin(x), 1.0 / (1.0 - x * x).sqrt())),
    }
    Function "acos" {
        forms: ["acos(x)"],
        doc: "Inverse cosine, in radians.",
        example: "print(acos(0.5));",
        register: |engine, session| one(engine, session, "acos", |x| (elementary::acos(x), -1.0 / (1.0 - x * x).sqrt())),
    }
    Function "atan" {
        forms: ["atan(x)"],
        doc: "Inverse tangent, in radians.",
        example: "print(atan(1));",
        register: |engine, session| one(engine, session, "atan", |x| (elementary::atan(x), 1.0 / (1.0 + x * x))),
    }
    Function "sinh" {
        forms: ["sinh(x)"],
        doc: "Hyperbolic sine.",
        example: "print(sinh(0.5));",
        register: |engine, session| one(engine, session, "sinh", |x| (elementary::sinh(x), elementary::cosh(x))),
    }
    Function "cosh" {
        forms: ["cosh(x)"],
        doc: "Hyperbolic cosine.",
        example: "print(cosh(0.5));",
        register: |engine, session| one(engine, session, "cosh", |x| (elementary::cosh(x), elementary::sinh(x))),
    }
    Function "tanh" {
        forms: ["tanh(x)"],
        doc: "Hyperbolic tangent.",
        example: "print(tanh(0.5));",
        register: |engine, session| one(engine, session, "tanh", |x| { let t = elementary::tanh(x); (t, 1.0 - t * t) }),
    }
    Function "floor" {
        forms: ["floor(x)"],
        doc: "The largest whole number not above x.",
        example: "print(floor(2.7));",
        register: |engine, session| one(engine, session, "floor", |x| (x.floor(), 0.0)),
    }
    Function "ceiling" {
        forms: ["ceiling(x)"],
        doc: "The smallest whole number not below x.",
        example: "print(ceiling(2.3));",
        register: |engine, session| one(engine, session, "ceiling", |x| (x.ceil(), 0.0)),
    }
    Function "round" {
        forms: ["round(x)"],
        doc: "The nearest whole number; halves go away from zero.",
        example: "print(round(2.5));",
        register: |engine, session| one(engine, session, "round", |x| (x.round(), 0.0)),
    }
    Function "to_int" {
        forms: ["to_int(x)"],
        doc: "The whole number without what follows the point, as arrays and `range` want it: `points[to_int(n / 2)]`.",
        example: "print(to_int(7 / 2));",
        register: |engine, session| {
            function(engine, session, "to_int", 1..=1, |_, arguments| {
                let q = any_quantity(arguments[0]).ok_or_else(|| not_a_number("to_int", arguments[0]))?;
                let whole = q.function("to_int", |x| (x.trunc(), 0.0))?;
                if whole.value.abs() < 9e15 {
                    Ok((whole.value as INT).into())
                } else {
                    Err(Fault::new(codes::ARITHMETIC, "the number is too large for a whole number").into())
                }
            });
        },
    }
}

/// What the engine's own library would compute with the platform's functions.
pub(super) fn replace_platform_functions(engine: &mut Engine) {
    fn one(engine: &mut Engine, name: &str, f: fn(f64) -> f64) {
        engine.register_fn(name, move |x: FLOAT| f(x));
        engine.register_fn(name, move |n: INT| f(n as f64));
    }
    one(engine, "log", elementary::log10);
    one(engine, "asinh", |x| elementary::ln(x.abs() + (x * x + 1.0).sqrt()).copysign(x));
    one(engine, "acosh", |x| elementary::ln(x + (x * x - 1.0).sqrt()));
    one(engine, "atanh", |x| 0.5 * elementary::ln((1.0 + x) / (1.0 - x)));
    engine.register_fn("log", |x: FLOAT, base: FLOAT| elementary::ln(x) / elementary::ln(base));
    engine.register_fn("hypot", |x: FLOAT, y: FLOAT| (x * x + y * y).sqrt());
    engine.register_fn("atan", elementary::atan2);
}

/// A function of one plain number, with its slope.
fn one(engine: &mut Engine, session: &Arc<Session>, name: &'static str, f: fn(f64) -> (f64, f64)) {
    engine.register_fn(name, move |x: FLOAT| f(x).0);
    engine.register_fn(name, move |n: INT| f(n as f64).0);
    let _ = session;
    engine.register_fn(name, move |q: Quantity| -> crate::language::fault::Outcome<Quantity> {
        Ok(q.function(name, f).map_err(|fault| fault.at(Place::Argument(0)))?)
    });
}

fn not_a_number(name: &str, value: &rhai::Dynamic) -> Fault {
    if value.is::<Unknown>() {
        return Fault::of_unknown();
    }
    Fault::new(codes::WRONG_KIND, format!("`{name}` takes numbers"))
        .label(format!("found {}", described(value)))
}
