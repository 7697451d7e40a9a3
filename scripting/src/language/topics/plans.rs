//! Plans of sweeps: grids, lists, samples, their combinations, and running them.

use std::sync::Arc;

use rhai::{Array, Dynamic, Engine, FnPtr, INT, ImmutableString, Map};

use crate::diagnostics::codes;
use crate::language::dimension::Dimension;
use crate::language::fault::{Fault, Outcome, Place};
use crate::language::plan::samples::Filling;
use crate::language::plan::spread::Spread;
use crate::language::plan::{Columns, Given, Plan, PlanValue, SpreadValue};
use crate::language::quantity::Quantity;
use crate::language::session::Session;
use crate::language::sweep;
use crate::language::value::{Unknown, any_quantity, array, map, quantity, take, text};
use crate::language::vocabulary::{
    Answer, Call, caller, function, getter, index_getter, topic, unknown_property,
};

topic! {
    "Plans and sweeps",
    "A plan is a set of points that is never written out: each point is computed from its index, so that a grid of a thousand \
     million points costs no memory. `plan.run(\"name\", |p| ..)` calls a closure for every point on all cores, `p` a map of the \
     point's coordinates, and gives a table of what the closure returned. Each point works on copies of its own of all that the \
     closure uses, so that its result depends on the point alone.";

    Function "grid" {
        forms: ["grid(#{ name: [value, ..], .. })", "grid([#{ name: [value, ..] }, ..])"],
        doc: "Every combination of the values; one value instead of an array is the same at every point. Coordinates are taken in \
              the order of the alphabet, or that of the array of maps; the last one changes fastest.",
        example: "let plan = grid(#{ bsf: [20.nm, 50.nm], x: linear(0.2, 0.8, 4) });\nprint(plan);\nprint(plan.point(5));",
        register: |engine, session| {
            engine.register_type_with_name::<PlanValue>("plan");
            engine.register_type_with_name::<SpreadValue>("spread");
            function(engine, session, "grid", 1..=1, |_, arguments| {
                Ok(give(Plan::grid(columns(arguments[0])?).map_err(first)?))
            });
            index_getter::<PlanValue>(engine, session, |_, arguments| {
                Err(unknown_property("plan", &text(arguments[1], "a property")?).into())
            });
        },
    }
    Function "zip" {
        forms: ["zip(#{ name: [value, ..], .. })", "zip([#{ name: [value, ..] }, ..])"],
        doc: "The first values of all coordinates together, then the second, and so on: process corners, rows of a protocol.",
        example: "let corners = zip(#{ emitter: [90.nm, 150.nm], doping: [1e18.per_cm3, 3e18.per_cm3] });\nprint(corners.size);",
        register: |engine, session| {
            function(engine, session, "zip", 1..=1, |_, arguments| {
                Ok(give(Plan::rows(columns(arguments[0])?).map_err(first)?))
            });
        },
    }
    Function "list" {
        forms: ["list([#{ name: value, .. }, ..])"],
        doc: "The points themselves, maps with the same names; the rows of a table or of a data file are such.",
        example: "let plan = list([#{ x: 0.2, bsf: 20.nm }, #{ x: 0.3, bsf: 50.nm }]);\nprint(plan.point(1));",
        register: |engine, session| function(engine, session, "list", 1..=1, listed),
    }
    Function "random" {
        forms: ["random(#{ name: spread, .. }, count)", "random(#{ name: spread, .. }, count, seed)"],
        doc: "Independent random points; a coordinate with a value instead of a spread has it at every point. Point k depends on k, \
              the name of the coordinate and the seed (0 unless given) alone: more points, or another coordinate, change none of \
              the others.",
        example: "let wafers = random(#{ emitter: normal(120.nm, 5.percent), x: 0.3 }, 1000, 7);\nprint(wafers.point(0).emitter);",
        register: |engine, session| function(engine, session, "random", 2..=3, |_, a| samples(a, Filling::Random)),
    }
    Function "latin_hypercube" {
        forms: ["latin_hypercube(#{ name: spread, .. }, count)", "latin_hypercube(#{ name: spread, .. }, count, seed)"],
        doc: "Random points that cover each spread evenly: of n equally likely slices of a coordinate, each holds one of the n points.",
        example: "print(latin_hypercube(#{ base: uniform(2.um, 4.um), doping: log_normal(1e17.per_cm3, 0.2) }, 50));",
        register: |engine, session| function(engine, session, "latin_hypercube", 2..=3, |_, a| samples(a, Filling::LatinHypercube)),
    }
    Function "low_discrepancy" {
        forms: ["low_discrepancy(#{ name: spread, .. }, count)", "low_discrepancy(#{ name: spread, .. }, count, seed)"],
        doc: "Points that fill the space of all spreads more evenly than random ones (a Sobol sequence, scrambled by the seed): means \
              converge faster, best with a power of two for the count. At most 21 spreads.",
        example: "print(low_discrepancy(#{ base: uniform(2.um, 4.um), x: triangular(0.2, 0.3, 0.4) }, 64).point(3));",
        register: |engine, session| function(engine, session, "low_discrepancy", 2..=3, |_, a| samples(a, Filling::LowDiscrepancy)),
    }
    Function "normal" {
        forms: ["normal(mean, deviation)", "normal(mean, 5.percent)"],
        doc: "A normal spread by mean and standard deviation, the latter in the unit of the mean or in percent of it.",
        example: "print(normal(30.nm, 5.percent));",
        register: |engine, session| {
            function(engine, session, "normal", 2..=2, |_, arguments| {
                let mean = finite(arguments[0], "the mean").map_err(|f| f.at(Place::Argument(0)))?;
                let deviation = width(arguments[1], &mean, "the standard deviation").map_err(|f| f.at(Place::Argument(1)))?;
                spread(Spread::Normal { mean, deviation })
            });
        },
    }
    Function "log_normal" {
        forms: ["log_normal(median, sigma)", "log_normal(median, 20.percent)"],
        doc: "A spread whose logarithm is normal, by median and standard deviation of the natural logarithm (0.2 is about 20 %): for \
              densities and lifetimes, which cannot be negative.",
        example: "print(log_normal(20.ns, 0.3));",
        register: |engine, session| {
            function(engine, session, "log_normal", 2..=2, |_, arguments| {
                let median = finite(arguments[0], "the median").map_err(|f| f.at(Place::Argument(0)))?;
                let sigma = quantity(arguments[1], "the standard deviation of the logarithm", Dimension::NONE)
                    .map_err(|f| f.at(Place::Argument(1)))?;
                let positive = |q: &Quantity, what: &str, index| {
                    if q.value > 0.0 || q.unknown { Ok(()) } else { Err(not_positive(q, what, index)) }
                };
                positive(&median, "the median", 0)?;
                positive(&sigma, "the standard deviation", 1)?;
                spread(Spread::LogNormal { median, sigma: sigma.value })
            });
        },
    }
    Function "uniform" {
        forms: ["uniform(low, high)", "uniform(middle, 5.percent)"],
        doc: "A spread that is as likely anywhere between two values; in percent, that much to either side of the middle.",
        example: "print(uniform(2.um, 4.um));\nprint(uniform(30.nm, 5.percent));",
        register: |engine, session| {
            function(engine, session, "uniform", 2..=2, |_, arguments| {
                let low = finite(arguments[0], "the lowest value").map_err(|f| f.at(Place::Argument(0)))?;
                if in_percent(arguments[1]) && !in_percent(arguments[0]) {
                    let half = width(arguments[1], &low, "the width").map_err(|f| f.at(Place::Argument(1)))?;
                    return spread(Spread::Uniform { low: low.subtract(&half)?, high: low.add(&half)? });
                }
                let high = quantity(arguments[1], "the highest value", low.dimension).map_err(|f| f.at(Place::Argument(1)))?;
                rising(&[&low, &high])?;
                spread(Spread::Uniform { low, high })
            });
        },
    }
    Function "triangular" {
        forms: ["triangular(low, most_likely, high)"],
        doc: "A spread that rises in a straight line from the lowest to the most likely value and falls to the highest.",
        example: "print(triangular(25.nm, 30.nm, 40.nm));",
        register: |engine, session| {
            function(engine, session, "triangular", 3..=3, |_, arguments| {
                let low = finite(arguments[0], "the lowest value").map_err(|f| f.at(Place::Argument(0)))?;
                let mode = quantity(arguments[1], "the most likely value", low.dimension).map_err(|f| f.at(Place::Argument(1)))?;
                let high = quantity(arguments[2], "the highest value", low.dimension).map_err(|f| f.at(Place::Argument(2)))?;
                rising(&[&low, &mode, &high])?;
                spread(Spread::Triangular { low, mode, high })
            });
        },
    }
    Method "times" of "plan" {
        forms: ["first * second", "first.times(second)"],
        doc: "Every combination of the points of two plans, the second changing fastest: three cells at every corner.",
        example: "let plan = grid(#{ x: [0.2, 0.3] }) * random(#{ base: normal(3.um, 5.percent) }, 100);\nprint(plan.size);",
        register: |engine, session| both(engine, session, "times", "*", Plan::product),
    }
    Method "then" of "plan" {
        forms: ["first + second", "first.then(second)"],
        doc: "The points of one plan and then those of another with the same coordinates: a coarse grid and a fine one.",
        example: "let plan = grid(#{ t: [1.um, 2.um] }) + grid(#{ t: linear(2.1.um, 2.9.um, 9) });\nprint(plan.size);",
        register: |engine, session| both(engine, session, "then", "+", Plan::chain),
    }
    Method "filter" of "plan" {
        forms: ["plan.filter(|p| condition)"],
        doc: "The points for which the closure holds. It is asked when the point is run, never before; indices and size stay those of \
              the whole plan.",
        example: "let plan = grid(#{ emitter: [50.nm, 100.nm], total: [150.nm, 80.nm] }).filter(|p| p.emitter < p.total);\nprint(plan);",
        register: |engine, session| {
            caller::<PlanValue>(engine, session, "filter", 1..=1, |_, arguments| {
                let plan = taken(arguments[0])?;
                let closure = closure(arguments[1], 0)?;
                Ok(Dynamic::from(PlanValue(Arc::new(Plan::filtered(&plan, &closure)?))))
            });
        },
    }
    Property "size" of "plan" {
        forms: ["plan.size"],
        doc: "How many points it has, those that a filter leaves out included.",
        example: "print(grid(#{ a: linear(0, 1, 1000), b: linear(0, 1, 1000), c: linear(0, 1, 1000) }).size);",
        register: |engine, session| {
            getter::<PlanValue>(engine, session, "size", |_, arguments| Ok((taken(arguments[0])?.size as INT).into()));
        },
    }
    Method "point" of "plan" {
        forms: ["plan.point(index)"],
        doc: "One point, a map of its coordinates; indices count from 0. `()` where a filter leaves it out.",
        example: "print(grid(#{ x: [0.2, 0.3], t: [1.um, 2.um] }).point(2));",
        register: |engine, session| caller::<PlanValue>(engine, session, "point", 1..=1, point),
    }
    Method "run" of "plan" {
        forms: ["plan.run(\"name\", |p| #{ figure: value, .. })"],
        doc: "Calls the closure for every point, on all cores, and gives the table of its figures: quantities, numbers, texts, yes or \
              no; one value alone is called `value`. A point that fails is kept with its reason, and the others go on; when every \
              point fails, the script stops. `store` in the closure keeps a whole result of the point, as `name/index/..`; `print` \
              comes with the point's index before it. Points that the unfinished archive holds already are not solved again. A sweep \
              inside a point runs on the point's core, and its table is stored with the point.",
        example: "let gaas = material(\"GaAs\", #{ electron_lifetime: 20.ns, hole_lifetime: 20.ns });\nlet cell = stack(\"diode\", [layer(\"emitter\", gaas, 100.nm, donors(2e18.per_cm3)), layer(\"base\", gaas, 2.um, acceptors(1e17.per_cm3))]);\nlet sun = spectrum(\"AM1.5G\");\nlet map = grid(#{ base: [1.um, 2.um] }).run(\"base\", |p| {\n    cell[\"base\"].thickness = p.base;\n    let jv = cell.jv(sun, [0.V]);\n    #{ voc: jv.voc, efficiency: jv.efficiency }\n});\nprint(map.best(\"efficiency\").base);",
        register: |engine, session| {
            caller::<PlanValue>(engine, session, "run", 2..=2, |call, arguments| {
                let plan = taken(arguments[0])?;
                let name = text(arguments[1], "the name of a sweep").map_err(|f| f.at(Place::Argument(0)))?;
                let closure = closure(arguments[2], 1)?;
                if name.trim().is_empty() {
                    return Err(Fault::new(codes::WRONG_CHOICE, "a sweep needs a name").at(Place::Argument(0)).into());
                }
                sweep::run(call.session, call.context, &plan, &name, &closure)
            });
        },
    }
}

fn give(plan: Plan) -> Dynamic {
    Dynamic::from(PlanValue(Arc::new(plan)))
}

/// A fault of the first argument.
fn first(fault: Fault) -> Fault {
    fault.at_if_unplaced(Place::Argument(0))
}

fn spread(spread: Spread) -> Answer {
    if spread.unknown() {
        return Err(Fault::of_unknown().into());
    }
    Ok(Dynamic::from(SpreadValue(spread)))
}

/// The plan of a value.
fn taken(value: &Dynamic) -> Result<Arc<Plan>, Fault> {
    Ok(take::<PlanValue>(value, "the plan", "a plan")?.0)
}

/// A closure that is the argument of this index.
pub fn closure(value: &Dynamic, index: usize) -> Result<FnPtr, Fault> {
    take::<FnPtr>(value, "what is done with each point or row", "a closure, such as `|p| ..`")
        .map_err(|f| f.at(Place::Argument(index)))
}

/// Coordinates with their values, from a map or an array of maps.
fn columns(given: &Dynamic) -> Result<Columns, Fault> {
    let mut columns = Columns::new();
    for (name, value) in named(given)? {
        if columns.iter().any(|(known, _)| *known == name) {
            return Err(first(Fault::new(codes::PLAN, format!("the coordinate `{name}` stands twice"))));
        }
        columns.push((name, values(&value)));
    }
    Ok(columns)
}

/// Names and values in the order given.
fn named(given: &Dynamic) -> Result<Vec<(ImmutableString, Dynamic)>, Fault> {
    let pairs = |map: Map| map.into_iter().map(|(name, value)| (name.as_str().into(), value.flatten()));
    if given.is::<Unknown>() {
        return Err(Fault::of_unknown());
    }
    if !given.is_array() {
        return Ok(pairs(map(given, "what a plan varies").map_err(first)?).collect());
    }
    let mut list = Vec::new();
    for entry in array(given, "what a plan varies")? {
        list.extend(pairs(map(&entry, "an entry of the array").map_err(first)?));
    }
    Ok(list)
}

/// The values of a coordinate: those of an array or range, or one.
fn values(value: &Dynamic) -> Vec<Dynamic> {
    if let Some(list) = value.read_lock::<Array>() {
        return list.iter().map(Dynamic::flatten_clone).collect();
    }
    const MOST: usize = 1 << 20;
    if let Some(range) = value.read_lock::<std::ops::Range<INT>>() {
        return range.clone().take(MOST).map(Dynamic::from).collect();
    }
    if let Some(range) = value.read_lock::<std::ops::RangeInclusive<INT>>() {
        return range.clone().take(MOST).map(Dynamic::from).collect();
    }
    vec![value.clone()]
}

fn listed(_: &Call, arguments: &mut [&mut Dynamic]) -> Answer {
    let points = array(arguments[0], "the points of a list").map_err(first)?;
    let mut columns = Columns::new();
    for (index, point) in points.iter().enumerate() {
        let point = map(point, &format!("point {index} of the list")).map_err(first)?;
        if index == 0 {
            columns =
                point.keys().map(|name| (name.as_str().into(), Vec::with_capacity(points.len()))).collect();
        }
        if let Some(name) = point.keys().find(|name| !columns.iter().any(|(known, _)| known == name.as_str()))
        {
            return Err(first(Fault::new(
                codes::PLAN,
                format!("point {index} of the list has a `{name}`, the first has none"),
            ))
            .into());
        }
        for (name, values) in &mut columns {
            let Some(value) = point.get(name.as_str()) else {
                return Err(first(Fault::new(
                    codes::PLAN,
                    format!("point {index} of the list has no `{name}`"),
                ))
                .into());
            };
            values.push(value.flatten_clone());
        }
    }
    if points.is_empty() {
        return Err(first(Fault::new(codes::PLAN, "the list has no points")).into());
    }
    Ok(give(Plan::rows(columns).map_err(first)?))
}

fn samples(arguments: &mut [&mut Dynamic], filling: Filling) -> Answer {
    let whole = |value: &Dynamic, what: &str, index: usize, low: f64| -> Result<u64, Fault> {
        let number = quantity(value, what, Dimension::NONE).map_err(|f| f.at(Place::Argument(index)))?;
        if number.unknown {
            return Err(Fault::of_unknown());
        }
        let fits = number.value.fract() == 0.0 && (low..=9e15).contains(&number.value);
        if fits {
            return Ok(number.value as u64);
        }
        Err(Fault::new(codes::PLAN, format!("{what} must be a whole number from {low}"))
            .label(format!("this is {number}"))
            .at(Place::Argument(index)))
    };
    let count = whole(arguments[1], "the count", 1, 1.0)?;
    let seed = arguments.get(2).map_or(Ok(0), |seed| whole(seed, "the seed", 2, 0.0))?;
    let mut columns = Vec::new();
    for (name, value) in named(arguments[0])? {
        let given = match value.read_lock::<SpreadValue>() {
            Some(spread) => Given::Spread(spread.0.clone()),
            None => Given::Value(value.clone()),
        };
        columns.push((name, given));
    }
    Ok(give(Plan::samples(filling, columns, count, seed).map_err(first)?))
}

/// A quantity of any dimension that is finite.
fn finite(value: &Dynamic, what: &str) -> Result<Quantity, Fault> {
    quantity(value, what, any_quantity(value).map_or(Dimension::NONE, |q| q.dimension))
}

fn in_percent(value: &Dynamic) -> bool {
    any_quantity(value).and_then(|q| q.shown_in).is_some_and(|unit| unit.name == "percent")
}

/// A width in the unit of `of`, or in percent of it; never negative.
fn width(value: &Dynamic, of: &Quantity, what: &str) -> Result<Quantity, Fault> {
    let width = if in_percent(value) {
        let share = quantity(value, what, Dimension::NONE)?;
        Quantity { shown_in: of.shown_in, ..of.abs().multiply(&share)? }
    } else {
        let mut fault_or_width = quantity(value, what, of.dimension);
        if let Err(fault) = &mut fault_or_width
            && fault.code == codes::BARE_NUMBER
        {
            fault.help =
                Some("give it in the unit of the mean, or as a share of it: `5.percent`".to_string());
        }
        fault_or_width?
    };
    if width.value < 0.0 {
        return Err(
            Fault::new(codes::PLAN, format!("{what} must not be negative")).label(format!("this is {width}"))
        );
    }
    Ok(width)
}

fn not_positive(q: &Quantity, what: &str, index: usize) -> Fault {
    Fault::new(codes::PLAN, format!("{what} must be positive"))
        .label(format!("this is {q}"))
        .at(Place::Argument(index))
}

/// Bounds of a spread, each not below the one before and the last above the first.
fn rising(bounds: &[&Quantity]) -> Result<(), Fault> {
    if bounds.iter().any(|q| q.unknown) {
        return Ok(());
    }
    let fall = bounds.windows(2).position(|pair| pair[1].value < pair[0].value);
    let empty = bounds[0].value == bounds[bounds.len() - 1].value;
    match fall.map(|at| at + 1).or_else(|| empty.then(|| bounds.len() - 1)) {
        None => Ok(()),
        Some(at) => Err(Fault::new(codes::PLAN, "the bounds of a spread must rise")
            .label(format!("{} after {}", bounds[at], bounds[at - 1]))
            .at(Place::Argument(at))),
    }
}

/// Registers an operation on two plans as a method and as an operator.
fn both(
    engine: &mut Engine,
    session: &Arc<Session>,
    name: &'static str,
    operator: &'static str,
    combine: fn(&Arc<Plan>, &Arc<Plan>) -> Result<Plan, Fault>,
) {
    let _ = session;
    for word in [name, operator] {
        engine.register_fn(word, move |a: PlanValue, b: PlanValue| -> Outcome<PlanValue> {
            Ok(PlanValue(Arc::new(combine(&a.0, &b.0)?)))
        });
    }
}

fn point(call: &Call, arguments: &mut [&mut Dynamic]) -> Outcome<Dynamic> {
    let plan = taken(arguments[0])?;
    let index = quantity(arguments[1], "the index", Dimension::NONE).map_err(|f| f.at(Place::Argument(0)))?;
    if index.unknown {
        return Err(Fault::of_unknown().into());
    }
    if index.value.fract() != 0.0 || index.value < 0.0 || index.value >= plan.size as f64 {
        return Err(Fault::new(
            codes::NO_SUCH_ENTRY,
            format!("there is no point {index} in a plan of {}", plan.size),
        )
        .help("points count from 0")
        .at(Place::Argument(0))
        .into());
    }
    let k = index.value as u64;
    let ask = |closure: &FnPtr, point: Map| closure.call_raw(call.context, None, [Dynamic::from(point)]);
    if plan.admits(k, &ask)? { Ok(plan.point(k).into()) } else { Ok(Dynamic::UNIT) }
}
