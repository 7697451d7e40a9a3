//! Tables that sweeps give: columns and rows, order, choice, groups, statistics, fits.

use std::sync::Arc;

use rhai::{Array, Dynamic, FnPtr, INT, ImmutableString, Map};

use crate::diagnostics::codes;
use crate::language::dimension::Dimension;
use crate::language::fault::{Fault, Outcome, Place};
use crate::language::quantity::Quantity;
use crate::language::table::fit::{Estimate, fit};
use crate::language::table::{Column, Extent, Numbers, Table, TableValue, statistics, veiled};
use crate::language::value::{Unknown, array, described, map, quantity, take, text};
use crate::language::vocabulary::{Answer, Call, caller, function, topic};

use super::plans::closure;

topic! {
    "Tables",
    "A sweep gives a table: one row for each point that was solved, with its coordinates and figures; points that failed stand apart \
     in `failures` and count in no statistics. Numbers keep their units and numerical errors. `print(table)` shows its first rows, \
     and `store(\"name\", table)` keeps a table that was filtered, grouped or otherwise derived (a sweep's own is kept anyway).";

    Function "table" {
        forms: ["table([#{ name: value, .. }, ..])"],
        doc: "A table of rows that the script made itself, maps with the same names; `()` where a row has no value.",
        example: "let yields = table([#{ lot: \"A\", share: 91.percent }, #{ lot: \"B\", share: 87.percent }]);\nprint(yields.best(\"share\").lot);",
        register: |engine, session| function(engine, session, "table", 1..=1, |_, arguments| made(arguments[0])),
    }
    Property "len" of "table" {
        forms: ["table.len", "table.len()"],
        doc: "How many rows it has: points that failed are not among them.",
        example: "print(grid(#{ x: [1, 2, 3] }).run(\"squares\", |p| #{ square: p.x * p.x }).len);",
        register: |engine, session| {
            engine.register_type_with_name::<TableValue>("table");
            engine.register_iterator_result::<TableValue, Dynamic>();
            for name in ["get$len", "len"] {
                caller::<TableValue>(engine, session, name, 0..=0, |call, a| of(call, a, |_, table, _| Ok((table.rows as INT).into())));
            }
        },
    }
    Property "columns" of "table" {
        forms: ["table.columns"],
        doc: "Names of its columns, the coordinates first.",
        example: "print(grid(#{ x: [1, 2, 3] }).run(\"squares\", |p| #{ square: p.x * p.x }).columns);",
        register: |engine, session| {
            caller::<TableValue>(engine, session, "get$columns", 0..=0, |call, a| of(call, a, |_, table, _| {
                Ok(table.columns.iter().map(|c| Dynamic::from(c.name.clone())).collect::<Array>().into())
            }));
        },
    }
    Property "rows" of "table" {
        forms: ["table.rows", "for row in table { .. }", "table[index]"],
        doc: "Its rows, maps of coordinates and figures, in the order of the plan; one of them by its index (from 0, or from -1 backwards).",
        example: "let squares = grid(#{ x: [1, 2, 3] }).run(\"squares\", |p| #{ square: p.x * p.x });\nfor row in squares { print(`${row.x}: ${row.square}`); }\nprint(squares[-1].square);",
        register: |engine, session| {
            caller::<TableValue>(engine, session, "get$rows", 0..=0, |call, a| of(call, a, |call, table, _| {
                fits(call, table.rows)?;
                Ok((0..table.rows).map(|row| Dynamic::from(table.row(row))).collect::<Array>().into())
            }));
        },
    }
    Property "column" of "table" {
        forms: ["table[\"column\"]", "table.column"],
        doc: "The values of a column, by its name; `()` where a row has none.",
        example: "let squares = grid(#{ x: [1, 2, 3] }).run(\"squares\", |p| #{ square: p.x * p.x });\nprint(squares[\"square\"]);\nprint(squares.square);",
        register: |engine, session| {
            caller::<TableValue>(engine, session, "index$get$", 1..=1, |call, a| of(call, a, entry));
        },
    }
    Property "failed" of "table" {
        forms: ["table.failed", "table.failures"],
        doc: "How many points failed; these points, maps with their coordinates, `point` (the index in the plan) and `reason`.",
        example: "let roots = grid(#{ x: [-1, 1] }).run(\"roots\", |p| { if p.x < 0 { throw \"no root\"; } sqrt(p.x) });\nfor f in roots.failures { print(`${f.point}: ${f.reason}`); }",
        register: |engine, session| {
            caller::<TableValue>(engine, session, "get$failed", 0..=0, |call, a| of(call, a, |_, table, _| Ok((table.failures.len() as INT).into())));
            caller::<TableValue>(engine, session, "get$failures", 0..=0, |call, a| of(call, a, failures));
        },
    }
    Method "best" of "table" {
        forms: ["table.best(\"column\")", "table.best(\"column\", \"lowest\")"],
        doc: "The row with the highest (or the lowest) number in a column; the first of several.",
        example: "let hill = grid(#{ x: linear(0, 1, 11) }).run(\"hill\", |p| #{ height: p.x * (1 - p.x) });\nprint(hill.best(\"height\").x);",
        register: |engine, session| caller::<TableValue>(engine, session, "best", 1..=2, |call, a| of(call, a, best)),
    }
    Method "sort" of "table" {
        forms: ["table.sort(\"column\")", "table.sort(\"column\", \"falling\")"],
        doc: "The same rows in the order of a column, rising unless told otherwise; rows without a value come last.",
        example: "let hill = grid(#{ x: linear(0, 1, 5) }).run(\"hill\", |p| #{ height: p.x * (1 - p.x) });\nprint(hill.sort(\"height\", \"falling\"));",
        register: |engine, session| {
            caller::<TableValue>(engine, session, "sort", 1..=2, |call, a| of(call, a, |_, table, a| {
                let name = column_name(a[1])?;
                let falling = choice(a.get(2), ["rising", "falling"])? == 1;
                let order = table.order(&name, falling).map_err(|f| f.at(Place::Argument(0)))?;
                Ok(give(table.picked(&order)))
            }));
        },
    }
    Method "filter" of "table" {
        forms: ["table.filter(|row| condition)"],
        doc: "The rows for which the closure holds.",
        example: "let hill = grid(#{ x: linear(0, 1, 11) }).run(\"hill\", |p| #{ height: p.x * (1 - p.x) });\nprint(hill.filter(|r| r.height > 0.2).len);",
        register: |engine, session| {
            caller::<TableValue>(engine, session, "filter", 1..=1, |call, a| of(call, a, |call, table, a| {
                let rows = passing(call, table, &closure(a[1], 0)?)?;
                let all = table.extent == Extent::Checked;
                Ok(give(if all { table.clone() } else { table.picked(&rows) }))
            }));
        },
    }
    Method "derive" of "table" {
        forms: ["table.derive(\"column\", |row| value)"],
        doc: "The same with one more column, computed from each row; a column of that name is replaced.",
        example: "let hill = grid(#{ x: linear(0, 1, 11) }).run(\"hill\", |p| #{ height: p.x * (1 - p.x) });\nprint(hill.derive(\"depth\", |r| -r.height).best(\"depth\").x);",
        register: |engine, session| caller::<TableValue>(engine, session, "derive", 2..=2, |call, a| of(call, a, derive)),
    }
    Method "group" of "table" {
        forms: ["table.group(\"column\")", "table.group(\"column\", |part| #{ name: value, .. })"],
        doc: "The rows by the values of a column, rising: an array of maps with `value` and `table`; with a closure a table with one row \
              for each value and what the closure made of its part.",
        example: "let hill = grid(#{ x: linear(0, 1, 5), y: [1, 2] }).run(\"hill\", |p| #{ height: p.x * (1 - p.x) * p.y });\nprint(hill.group(\"y\", |part| #{ highest: part.max(\"height\") }));",
        register: |engine, session| caller::<TableValue>(engine, session, "group", 1..=2, |call, a| of(call, a, group)),
    }
    Method "pivot" of "table" {
        forms: ["table.pivot(\"across\", \"down\", \"figure\")"],
        doc: "A figure over two columns, for a map: `across` and `down`, the distinct values of these, rising, and `values`, for each value \
              down an array with one entry for each value across, `()` where there is no row; `names` of the three. Two rows at one place \
              are a fault: filter or group first.",
        example: "let hill = grid(#{ x: linear(0, 1, 3), y: [1, 2] }).run(\"hill\", |p| #{ height: p.x * p.y });\nlet map = hill.pivot(\"x\", \"y\", \"height\");\nprint(map.values[1][2]);",
        register: |engine, session| caller::<TableValue>(engine, session, "pivot", 3..=3, |call, a| of(call, a, pivot)),
    }
    Method "mean" of "table" {
        forms: ["table.mean(\"column\")", "table.spread(\"column\")", "table.min(\"column\")", "table.max(\"column\")", "table.median(\"column\")", "table.sum(\"column\")"],
        doc: "Statistics over the rows that have the figure: arithmetic mean, sample standard deviation (the squares about the mean over \
              the count less one), least and greatest value, median, sum.",
        example: "let lot = random(#{ t: normal(30.nm, 5.percent) }, 500).run(\"lot\", |p| #{ t2: p.t * 2 });\nprint(`${lot.mean(\"t2\")} ${lot.spread(\"t2\")} ${lot.min(\"t2\")} ${lot.max(\"t2\")} ${lot.median(\"t2\")} ${lot.sum(\"t2\")}`);",
        register: |engine, session| {
            caller::<TableValue>(engine, session, "mean", 1..=1, |call, a| number(call, a, |v| Some(statistics::mean(v))));
            caller::<TableValue>(engine, session, "spread", 1..=1, |call, a| number(call, a, statistics::spread));
            caller::<TableValue>(engine, session, "min", 1..=1, |call, a| number(call, a, |v| v.iter().copied().reduce(f64::min)));
            caller::<TableValue>(engine, session, "max", 1..=1, |call, a| number(call, a, |v| v.iter().copied().reduce(f64::max)));
            caller::<TableValue>(engine, session, "median", 1..=1, |call, a| number(call, a, |v| Some(statistics::quantile(&statistics::sorted(v), 0.5))));
            caller::<TableValue>(engine, session, "sum", 1..=1, |call, a| number(call, a, |v| Some(epiloom_solver::math::sum(v.iter().copied()))));
        },
    }
    Method "quantile" of "table" {
        forms: ["table.quantile(\"column\", share)"],
        doc: "The value below which a share (0 to 1, or in percent) of the rows lies: the straight line between the order statistics about \
              (n - 1) share (definition 7 of Hyndman and Fan, The American Statistician 50, 361, 1996).",
        example: "let lot = random(#{ t: normal(30.nm, 5.percent) }, 500).run(\"lot\", |p| #{ t2: p.t * 2 });\nprint(lot.quantile(\"t2\", 5.percent));",
        register: |engine, session| caller::<TableValue>(engine, session, "quantile", 2..=2, |call, a| of(call, a, quantile)),
    }
    Method "statistics" of "table" {
        forms: ["table.statistics(\"column\")"],
        doc: "All of them, a map: `count`, `absent` (rows without the figure), `mean`, `spread`, `standard_error` (of the mean), `min`, \
              `lower_quartile`, `median`, `upper_quartile`, `max`; `()` where there are too few rows.",
        example: "let lot = random(#{ t: normal(30.nm, 5.percent) }, 500).run(\"lot\", |p| #{ t2: p.t * 2 });\nprint(lot.statistics(\"t2\").standard_error);",
        register: |engine, session| caller::<TableValue>(engine, session, "statistics", 1..=1, |call, a| of(call, a, all_statistics)),
    }
    Method "yield" of "table" {
        forms: ["table.yield(|row| specification)"],
        doc: "The share of the rows that meet a specification, in percent; points that failed count neither way.",
        example: "let lot = random(#{ t: normal(30.nm, 5.percent) }, 500).run(\"lot\", |p| #{ t2: p.t * 2 });\nprint(lot.yield(|r| r.t2 > 57.nm && r.t2 < 63.nm));",
        register: |engine, session| {
            caller::<TableValue>(engine, session, "yield", 1..=1, |call, a| of(call, a, |call, table, a| {
                let passed = share(call, table, &closure(a[1], 0)?)?;
                Ok(percent(passed as f64 / table.rows as f64))
            }));
        },
    }
    Method "yield_range" of "table" {
        forms: ["table.yield_range(|row| specification)"],
        doc: "Two shares between which the yield of the process lies with 95 % confidence, when the rows are independent random samples of \
              it (E. B. Wilson, J. Am. Stat. Assoc. 22, 209, 1927).",
        example: "let lot = random(#{ t: normal(30.nm, 5.percent) }, 500).run(\"lot\", |p| #{ t2: p.t * 2 });\nlet range = lot.yield_range(|r| r.t2 > 57.nm);\nprint(`${range[0]} to ${range[1]}`);",
        register: |engine, session| {
            caller::<TableValue>(engine, session, "yield_range", 1..=1, |call, a| of(call, a, |call, table, a| {
                let passed = share(call, table, &closure(a[1], 0)?)?;
                let (low, high) = statistics::share_bounds(passed, table.rows);
                Ok(vec![percent(low), percent(high)].into())
            }));
        },
    }
    Method "fit" of "table" {
        forms: ["table.fit(\"x\", \"y\", \"line\")", "table.fit(\"x\", \"y\", \"parabola\")"],
        doc: "Least squares through the rows: a map of `offset`, `slope` and, for a parabola, `curvature` (y = offset + slope x + \
              curvature x^2), `extremum_at` and `extremum`; quantities that print their standard errors behind `+-`; `spread` about the \
              curve, `determination` (the share of the variance that it takes up), `count`. Standard errors assume deviations that are \
              independent and alike.",
        example: "let hill = grid(#{ x: linear(0, 1, 11) }).run(\"hill\", |p| #{ height: p.x * (1 - p.x) });\nprint(hill.fit(\"x\", \"height\", \"parabola\").extremum_at);",
        register: |engine, session| caller::<TableValue>(engine, session, "fit", 3..=3, |call, a| of(call, a, fitted)),
    }
}

/// A table of the rows of an array.
fn made(given: &Dynamic) -> Answer {
    let rows = array(given, "the rows of a table").map_err(|f| f.at(Place::Argument(0)))?;
    let mut columns: Vec<(ImmutableString, Vec<Dynamic>)> = Vec::new();
    for (index, row) in rows.iter().enumerate() {
        let row = map(row, &format!("row {index} of the table")).map_err(|f| f.at(Place::Argument(0)))?;
        let known = |name: &str| columns.iter().any(|(column, _)| column == name);
        let strange = row.keys().find(|name| index > 0 && !known(name.as_str()));
        let missing = columns.iter().find(|(name, _)| !row.contains_key(name.as_str()));
        if let Some(name) = strange.map(|name| name.as_str()).or(missing.map(|(name, _)| name.as_str())) {
            return Err(Fault::new(
                codes::WRONG_KIND,
                format!("row {index} of the table has other names than the first: `{name}`"),
            )
            .at(Place::Argument(0))
            .into());
        }
        for (name, value) in row {
            match columns.iter_mut().find(|(column, _)| column == name.as_str()) {
                Some((_, values)) => values.push(value.flatten()),
                None => columns.push((name.as_str().into(), vec![value.flatten()])),
            }
        }
    }
    let columns: Result<Vec<Column>, Fault> =
        columns.into_iter().map(|(name, values)| Column::of_values(name, values)).collect();
    Ok(give(Table::of_columns("table", rows.len(), columns.map_err(|f| f.at(Place::Argument(0)))?)))
}

/// What is asked of a table: its receiver and the arguments, the table itself being the first.
type Question = fn(&Call, &Table, &[&mut Dynamic]) -> Outcome<Dynamic>;

/// Asks a table something: nothing of a share of one; while checking, what comes is not known.
fn of(call: &Call, arguments: &mut [&mut Dynamic], question: Question) -> Outcome<Dynamic> {
    let table = take::<TableValue>(arguments[0], "the table", "a table")?.0;
    match table.extent {
        Extent::Share => Err(table.waited_for(call.position)),
        Extent::Whole => question(call, &table, arguments),
        Extent::Checked => question(call, &table, arguments).map(veiled),
    }
}

fn give(table: Table) -> Dynamic {
    Dynamic::from(TableValue(Arc::new(table)))
}

fn percent(share: f64) -> Dynamic {
    Dynamic::from(Quantity::number(share).shown_in("percent"))
}

fn column_name(value: &Dynamic) -> Result<String, Fault> {
    text(value, "the name of a column").map_err(|f| f.at(Place::Argument(0)))
}

/// Whether so many values may stand in an array.
fn fits(call: &Call, count: usize) -> Result<(), Fault> {
    let most = call.session.options.limits.array;
    if count <= most {
        return Ok(());
    }
    Err(Fault::new(codes::TOO_LARGE, format!("{count} rows are more than the {most} that an array may hold"))
        .help("ask the table itself: `table.mean(\"voc\")`, `table.best(\"voc\")`, `table.filter(|r| ..)`, `table[0]`"))
}

/// Which of two words is given; the first if none is.
fn choice(value: Option<&&mut Dynamic>, words: [&'static str; 2]) -> Result<usize, Fault> {
    let Some(value) = value else { return Ok(0) };
    let given = text(value, "the choice").map_err(|f| f.at(Place::Argument(1)))?;
    words.iter().position(|word| *word == given).ok_or_else(|| {
        Fault::new(codes::WRONG_CHOICE, format!("there is no choice \"{given}\""))
            .candidates(&given, words)
            .at(Place::Argument(1))
    })
}

/// A row by its number, a column by its name.
fn entry(call: &Call, table: &Table, arguments: &[&mut Dynamic]) -> Outcome<Dynamic> {
    if let Some(name) = arguments[1].read_lock::<ImmutableString>() {
        let column = table.column(&name)?;
        fits(call, table.rows)?;
        return Ok((0..table.rows).map(|row| column.get(row)).collect::<Array>().into());
    }
    let index = quantity(arguments[1], "the index of a row", Dimension::NONE)?;
    if table.extent == Extent::Checked {
        return Ok(table.row(0).into());
    }
    let rows = table.rows as f64;
    let at = if index.value < 0.0 { index.value + rows } else { index.value };
    if at.fract() != 0.0 || !(0.0..rows).contains(&at) {
        return Err(Fault::new(
            codes::NO_SUCH_ENTRY,
            format!("there is no row {index} in a table of {}", table.rows),
        )
        .help("rows count from 0, or from -1 backwards")
        .into());
    }
    Ok(table.row(at as usize).into())
}

fn failures(call: &Call, table: &Table, _: &[&mut Dynamic]) -> Outcome<Dynamic> {
    fits(call, table.failures.len())?;
    let list = table.failures.iter().map(|failure| {
        let mut map = table.plan.as_ref().map_or_else(Map::new, |plan| plan.point(failure.point));
        map.insert("point".into(), (failure.point as INT).into());
        map.insert("reason".into(), failure.reason.to_string().into());
        Dynamic::from(map)
    });
    Ok(list.collect::<Array>().into())
}

fn best(_: &Call, table: &Table, arguments: &[&mut Dynamic]) -> Outcome<Dynamic> {
    let name = column_name(arguments[1])?;
    let lowest = choice(arguments.get(2), ["highest", "lowest"])? == 1;
    table.existing(&name).map_err(|f| f.at(Place::Argument(0)))?;
    let numbers = table.numbers(&name)?;
    let mut found: Option<usize> = None;
    for (row, value) in numbers.values.iter().enumerate().filter(|(_, v)| !v.is_nan()) {
        let better = found.is_none_or(|best| {
            let best = numbers.values[best];
            if lowest { *value < best } else { *value > best }
        });
        if better {
            found = Some(row);
        }
    }
    Ok(found.map_or(Dynamic::UNIT, |row| table.row(row).into()))
}

/// Calls a closure with each row.
fn each(
    call: &Call,
    table: &Table,
    closure: &FnPtr,
    mut take: impl FnMut(usize, Dynamic) -> Outcome<()>,
) -> Outcome<()> {
    for row in 0..table.rows {
        let mut map = Dynamic::from(table.row(row));
        if table.extent == Extent::Checked {
            map = veiled(map);
        }
        take(row, closure.call_raw(call.context, None, [map])?)?;
    }
    Ok(())
}

/// The rows for which a closure holds.
fn passing(call: &Call, table: &Table, closure: &FnPtr) -> Outcome<Vec<usize>> {
    let mut rows = Vec::new();
    each(call, table, closure, |row, answer| {
        match answer.as_bool() {
            Ok(true) => rows.push(row),
            Ok(false) => {}
            Err(_) if answer.is::<Unknown>() => {}
            Err(_) => {
                return Err(Fault::new(codes::WRONG_KIND, "the closure must give yes or no")
                    .label(format!("it gave {}", described(&answer)))
                    .at(Place::Argument(0))
                    .into());
            }
        }
        Ok(())
    })?;
    Ok(rows)
}

/// How many rows meet a specification; a table without rows has no yield.
fn share(call: &Call, table: &Table, closure: &FnPtr) -> Outcome<usize> {
    if table.rows == 0 {
        return Err(Fault::new(codes::EMPTY_TABLE, format!("the table `{}` has no rows", table.name)).into());
    }
    Ok(passing(call, table, closure)?.len())
}

fn derive(call: &Call, table: &Table, arguments: &[&mut Dynamic]) -> Outcome<Dynamic> {
    let name = column_name(arguments[1])?;
    let closure = closure(arguments[2], 1)?;
    let mut values = Vec::with_capacity(table.rows);
    each(call, table, &closure, |_, value| {
        values.push(value);
        Ok(())
    })?;
    let column = Column::of_values(name.as_str(), values).map_err(|f| f.at(Place::Argument(1)))?;
    let mut wider = table.clone();
    match wider.columns.iter().position(|c| c.name == name.as_str()) {
        Some(at) if at < wider.coordinates => {
            return Err(Fault::new(codes::WRONG_CHOICE, format!("`{name}` is a coordinate of the table"))
                .help("give the new column another name")
                .at(Place::Argument(0))
                .into());
        }
        Some(at) => wider.columns[at] = column,
        None => wider.columns.push(column),
    }
    Ok(give(wider))
}

fn group(call: &Call, table: &Table, arguments: &[&mut Dynamic]) -> Outcome<Dynamic> {
    let name = column_name(arguments[1])?;
    let groups = table.groups(&name).map_err(|f| f.at(Place::Argument(0)))?;
    fits(call, groups.len())?;
    if arguments.len() < 3 {
        let list = groups.into_iter().map(|(value, rows)| {
            let part = table.picked(&rows);
            Dynamic::from(Map::from([("value".into(), value), ("table".into(), give(part))]))
        });
        return Ok(list.collect::<Array>().into());
    }
    let closure = closure(arguments[2], 1)?;
    let mut values = Vec::new();
    let mut made: Vec<(ImmutableString, Vec<Dynamic>)> = Vec::new();
    for (at, (value, rows)) in groups.into_iter().enumerate() {
        values.push(value);
        let answer = closure.call_raw(call.context, None, [give(table.picked(&rows))])?;
        if answer.is::<Unknown>() {
            return Ok(answer);
        }
        let map = match answer.read_lock::<Map>() {
            Some(map) => map.clone(),
            None => Map::from([("value".into(), answer.clone())]),
        };
        for (key, value) in map {
            let position = match made.iter().position(|(known, _)| known == key.as_str()) {
                Some(position) => position,
                None => {
                    made.push((key.as_str().into(), Vec::new()));
                    made.len() - 1
                }
            };
            let column = &mut made[position].1;
            column.resize(at, Dynamic::UNIT);
            column.push(value);
        }
    }
    let rows = values.len();
    let mut columns = vec![Column::of_values(name.as_str(), values)?];
    for (key, mut values) in made {
        if key == name.as_str() {
            continue;
        }
        values.resize(rows, Dynamic::UNIT);
        columns.push(Column::of_values(key, values).map_err(|f| f.at(Place::Argument(1)))?);
    }
    let grouped = Table::of_columns(&table.name, rows, columns);
    Ok(give(Table { coordinates: 1, extent: table.extent, ..grouped }))
}

fn pivot(call: &Call, table: &Table, arguments: &[&mut Dynamic]) -> Outcome<Dynamic> {
    let mut names = Vec::new();
    for (at, value) in arguments[1..].iter().enumerate() {
        names.push(text(value, "the name of a column").map_err(|f| f.at(Place::Argument(at)))?);
    }
    let place = |at: usize| move |fault: Fault| fault.at(Place::Argument(at));
    let across = table.groups(&names[0]).map_err(place(0))?;
    let down = table.groups(&names[1]).map_err(place(1))?;
    let figure = table.column(&names[2]).map_err(place(2))?;
    fits(call, across.len().saturating_mul(down.len()))?;
    let mut at_column = vec![usize::MAX; table.rows];
    for (index, (_, rows)) in across.iter().enumerate() {
        rows.iter().for_each(|row| at_column[*row] = index);
    }
    let mut values = Array::new();
    for (_, rows) in &down {
        let mut line: Array = vec![Dynamic::UNIT; across.len()];
        for row in rows.iter().filter(|row| at_column[**row] != usize::MAX) {
            let slot = &mut line[at_column[*row]];
            if !slot.is_unit() {
                return Err(Fault::new(
                    codes::WRONG_CHOICE,
                    format!("two rows have the same `{}` and `{}`", names[0], names[1]),
                )
                .help("filter the table first, or group it: what else the plan varies must be fixed")
                .into());
            }
            *slot = figure.get(*row);
        }
        values.push(line.into());
    }
    let mut map = Map::new();
    map.insert("across".into(), across.into_iter().map(|(value, _)| value).collect::<Array>().into());
    map.insert("down".into(), down.into_iter().map(|(value, _)| value).collect::<Array>().into());
    map.insert("values".into(), values.into());
    map.insert("names".into(), names.into_iter().map(Dynamic::from).collect::<Array>().into());
    Ok(map.into())
}

/// A number of a column; `()` where there are too few rows for it.
fn number(
    call: &Call,
    arguments: &mut [&mut Dynamic],
    statistic: fn(&[f64]) -> Option<f64>,
) -> Outcome<Dynamic> {
    let table = take::<TableValue>(arguments[0], "the table", "a table")?.0;
    if table.extent == Extent::Share {
        return Err(table.waited_for(call.position));
    }
    let (values, numbers) = existing(&table, arguments[1])?;
    let found = if table.extent == Extent::Checked { Some(1.0) } else { statistic(&values) };
    let value = found.map_or(Dynamic::UNIT, |v| Dynamic::from(numbers.quantity(v)));
    Ok(if table.extent == Extent::Checked { veiled(value) } else { value })
}

fn existing<'a>(table: &'a Table, name: &Dynamic) -> Result<(Vec<f64>, &'a Numbers), Fault> {
    table.existing(&column_name(name)?).map_err(|f| f.at(Place::Argument(0)))
}

fn quantile(_: &Call, table: &Table, arguments: &[&mut Dynamic]) -> Outcome<Dynamic> {
    let (values, numbers) = existing(table, arguments[1])?;
    let share = quantity(arguments[2], "the share", Dimension::NONE).map_err(|f| f.at(Place::Argument(1)))?;
    if !(0.0..=1.0).contains(&share.value) {
        return Err(Fault::new(codes::SHARE, "the share must lie between 0 and 1")
            .label(format!("this is {share}"))
            .at(Place::Argument(1))
            .into());
    }
    Ok(Dynamic::from(numbers.quantity(statistics::quantile(&statistics::sorted(&values), share.value))))
}

fn all_statistics(_: &Call, table: &Table, arguments: &[&mut Dynamic]) -> Outcome<Dynamic> {
    let (values, numbers) = existing(table, arguments[1])?;
    let sorted = statistics::sorted(&values);
    let spread = statistics::spread(&values);
    let give = |v: f64| Dynamic::from(numbers.quantity(v));
    let mut map = Map::new();
    map.insert("count".into(), (values.len() as INT).into());
    map.insert("absent".into(), ((table.rows - values.len()) as INT).into());
    map.insert("mean".into(), give(statistics::mean(&values)));
    map.insert("spread".into(), spread.map_or(Dynamic::UNIT, give));
    let of_mean = spread.map(|s| s / (values.len() as f64).sqrt());
    map.insert("standard_error".into(), of_mean.map_or(Dynamic::UNIT, give));
    for (name, share) in
        [("min", 0.0), ("lower_quartile", 0.25), ("median", 0.5), ("upper_quartile", 0.75), ("max", 1.0)]
    {
        map.insert(name.into(), give(statistics::quantile(&sorted, share)));
    }
    Ok(map.into())
}

fn fitted(_: &Call, table: &Table, arguments: &[&mut Dynamic]) -> Outcome<Dynamic> {
    let x_name = column_name(arguments[1])?;
    let y_name = text(arguments[2], "the name of a column").map_err(|f| f.at(Place::Argument(1)))?;
    let x = table.numbers(&x_name).map_err(|f| f.at(Place::Argument(0)))?;
    let y = table.numbers(&y_name).map_err(|f| f.at(Place::Argument(1)))?;
    let curve = text(arguments[3], "the curve").map_err(|f| f.at(Place::Argument(2)))?;
    let words = ["line", "parabola"];
    let Some(degree) = words.iter().position(|word| *word == curve).map(|at| at + 1) else {
        return Err(Fault::new(codes::WRONG_CHOICE, format!("no curve is called \"{curve}\""))
            .candidates(&curve, words)
            .at(Place::Argument(2))
            .into());
    };
    let pairs = x.values.iter().zip(&y.values).filter(|(x, y)| x.is_finite() && y.is_finite());
    let (mut abscissae, mut ordinates): (Vec<f64>, Vec<f64>) = pairs.unzip();
    if table.extent == Extent::Checked {
        (abscissae, ordinates) = (vec![0.0, 1.0, 2.0, 3.0], vec![0.0, 1.0, 3.0, 1.0]);
    }
    let Some(found) = fit(&abscissae, &ordinates, degree) else {
        return Err(Fault::new(
            codes::FIT,
            format!("a {curve} needs rows at {} different `{x_name}` at least", degree + 1),
        )
        .label(format!(
            "the table has {} with both numbers",
            crate::language::table::shown::counted(abscissae.len(), "row")
        ))
        .into());
    };
    let mut dimension = y.dimension;
    let mut map = Map::new();
    let shown = |estimate: Estimate, of: &Numbers| {
        Dynamic::from(Quantity { error: estimate.error, ..of.quantity(estimate.value) })
    };
    for (name, estimate) in ["offset", "slope", "curvature"].into_iter().zip(found.coefficients) {
        let plain = Quantity { error: estimate.error, ..Quantity::si(estimate.value, dimension) };
        map.insert(name.into(), if name == "offset" { shown(estimate, y) } else { Dynamic::from(plain) });
        dimension = dimension.over(x.dimension).ok_or_else(|| {
            Fault::new(codes::WRONG_DIMENSION, "the coefficients of the fit leave the range of dimensions")
        })?;
    }
    if degree == 2 {
        let (at, top) =
            found.extremum.map_or((Dynamic::UNIT, Dynamic::UNIT), |(at, top)| (shown(at, x), shown(top, y)));
        map.insert("extremum_at".into(), at);
        map.insert("extremum".into(), top);
    }
    map.insert("spread".into(), found.spread.map_or(Dynamic::UNIT, |s| Dynamic::from(y.quantity(s))));
    map.insert(
        "determination".into(),
        found.determination.map_or(Dynamic::UNIT, |d| Dynamic::from(Quantity::number(d))),
    );
    map.insert("count".into(), (abscissae.len() as INT).into());
    Ok(map.into())
}
