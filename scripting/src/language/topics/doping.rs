//! Doping and profiles: constant, graded, measured.

use epiloom_solver::device::Profile;
use rhai::{Array, Dynamic, Map};

use crate::diagnostics::codes;
use crate::language::device_value::{DopingValue, ProfileValue};
use crate::language::dimension::Dimension;
use crate::language::fault::{Fault, Place};
use crate::language::quantity::Quantity;
use crate::language::value::{self, array, quantity, text};
use crate::language::vocabulary::{Answer, function, topic};

topic! {
    "Doping and profiles",
    "Depth in a profile counts from the front of its layer.";

    Function "donors" {
        forms: ["donors(density)", "donors(graded(..))", "donors(..) + acceptors(..)"],
        doc: "Ionised donors of a density, constant or graded. The sum of donors and acceptors is a compensated layer.",
        example: "let doping = donors(2e18.per_cm3) + acceptors(1e16.per_cm3);",
        register: |engine, session| {
            engine.register_type_with_name::<DopingValue>("doping");
            function(engine, session, "donors", 1..=1, |_, arguments| {
                let donors = doping_profile(arguments[0], "donor density")?;
                Ok(Dynamic::from(DopingValue { donors, acceptors: nothing() }))
            });
            engine.register_fn("+", |a: DopingValue, b: DopingValue| -> crate::language::fault::Outcome<DopingValue> {
                Ok(DopingValue { donors: sum(a.donors, b.donors)?, acceptors: sum(a.acceptors, b.acceptors)? })
            });
        },
    }
    Function "acceptors" {
        forms: ["acceptors(density)", "acceptors(graded(..))"],
        doc: "Ionised acceptors of a density, constant or graded.",
        example: "let doping = acceptors(graded(\"exponential\", 1e18.per_cm3, 1e16.per_cm3));",
        register: |engine, session| {
            function(engine, session, "acceptors", 1..=1, |_, arguments| {
                let acceptors = doping_profile(arguments[0], "acceptor density")?;
                Ok(Dynamic::from(DopingValue { donors: nothing(), acceptors }))
            });
        },
    }
    Function "intrinsic" {
        forms: ["intrinsic()"],
        doc: "No doping.",
        example: "let doping = intrinsic();",
        register: |engine, session| {
            function(engine, session, "intrinsic", 0..=0, |_, _| {
                Ok(Dynamic::from(DopingValue { donors: nothing(), acceptors: nothing() }))
            });
        },
    }
    Function "graded" {
        forms: [
            "graded(\"linear\", front, rear)",
            "graded(\"exponential\", front, rear)",
            "graded(\"erfc\", surface, background, depth)",
            "graded([[depth, value], ..])",
        ],
        doc: "A profile of densities, or of compositions (plain numbers): linear or exponential from the layer's front to its \
              rear; `background + (surface - background) erfc(z / depth)`, the profile that diffusion from a constant surface \
              source leaves, depth being 2 sqrt(D t); or a measured table, linear between its points and constant beyond them. \
              The table is an array of pairs, or of maps with `depth` and `density` (or `x`) as `read_csv` gives them.",
        example: "let doping = donors(graded(\"erfc\", 2e19.per_cm3, 1e15.per_cm3, 50.nm));\nlet measured = acceptors(graded([[0.nm, 2e18.per_cm3], [40.nm, 5e17.per_cm3]]));",
        register: |engine, session| {
            engine.register_type_with_name::<ProfileValue>("profile");
            function(engine, session, "graded", 1..=4, |_, arguments| graded(arguments));
        },
    }
}

fn nothing() -> Profile<Quantity> {
    Profile::Constant(Quantity::si(0.0, Dimension::DENSITY))
}

/// The sum of two dopings of one kind: constants add, nothing adds to anything.
fn sum(a: Profile<Quantity>, b: Profile<Quantity>) -> Result<Profile<Quantity>, Fault> {
    match (&a, &b) {
        (Profile::Constant(x), Profile::Constant(y)) => Ok(Profile::Constant(x.add(y)?)),
        (Profile::Constant(x), _) if x.value == 0.0 && x.derivatives.is_empty() => Ok(b),
        (_, Profile::Constant(y)) if y.value == 0.0 && y.derivatives.is_empty() => Ok(a),
        _ => Err(Fault::new(codes::PROFILE, "a graded doping cannot be added to another of its kind")
            .help("give one `graded([[depth, density], ..])` table of the sum")),
    }
}

/// A doping: a density of zero or more, or a profile of such.
fn doping_profile(value: &Dynamic, what: &str) -> Result<Profile<Quantity>, Fault> {
    let profile = match value.read_lock::<ProfileValue>() {
        Some(profile) => profile.0.clone(),
        None => Profile::Constant(
            quantity(value, what, Dimension::DENSITY).map_err(|f| f.at(Place::Argument(0)))?,
        ),
    };
    let mut fault = None;
    for value in values(&profile) {
        if value.dimension != Dimension::DENSITY {
            fault = Some(
                Fault::new(codes::WRONG_DIMENSION, format!("{what} must be graded between densities"))
                    .label(format!("expected {}; found {value}", Dimension::DENSITY.family())),
            );
        } else if value.value < 0.0 {
            fault = Some(
                Fault::new(codes::DOPING_NEGATIVE, format!("{what} must not be negative"))
                    .label(format!("this is {value}"))
                    .help("the kind is told by the word: donors(..) or acceptors(..)"),
            );
        }
    }
    match fault {
        Some(fault) => Err(fault.at(Place::Argument(0))),
        None => Ok(profile),
    }
}

/// The numbers a profile is made from, depths left out.
pub fn values(profile: &Profile<Quantity>) -> Vec<&Quantity> {
    match profile {
        Profile::Constant(value) => vec![value],
        Profile::Linear { front, rear } | Profile::Exponential { front, rear } => vec![front, rear],
        Profile::Erfc { surface, background, .. } => vec![surface, background],
        Profile::Table { values, .. } => values.iter().collect(),
    }
}

fn graded(arguments: &mut [&mut Dynamic]) -> Answer {
    if arguments.len() == 1 {
        let table = array(arguments[0], "the table").map_err(|f| f.at(Place::Argument(0)))?;
        return table_profile(&table)
            .map(|p| Dynamic::from(ProfileValue(p)))
            .map_err(|f| f.at(Place::Argument(0)).into());
    }
    let shape = text(arguments[0], "the shape of a profile").map_err(|f| f.at(Place::Argument(0)))?;
    let count = if shape == "erfc" { 4 } else { 3 };
    let known = ["linear", "exponential", "erfc"];
    if !known.contains(&shape.as_str()) {
        return Err(Fault::new(codes::WRONG_CHOICE, format!("no profile is called \"{shape}\""))
            .candidates(&shape, known)
            .at(Place::Argument(0))
            .into());
    }
    if arguments.len() != count {
        return Err(Fault::new(codes::WRONG_ARGUMENTS, format!("`graded(\"{shape}\", ..)` takes {count} arguments"))
            .help("graded(\"linear\", front, rear), graded(\"exponential\", front, rear), graded(\"erfc\", surface, background, depth)")
            .into());
    }
    let front = level(arguments[1], 1)?;
    let rear = level(arguments[2], 2)?;
    if front.dimension != rear.dimension {
        return Err(Fault::new(
            codes::DIMENSIONS_DIFFER,
            format!("a profile from {front} to {rear} has no dimension"),
        )
        .at(Place::Argument(2))
        .into());
    }
    let profile = match shape.as_str() {
        "linear" => Profile::Linear { front, rear },
        "exponential" => {
            for (index, value) in [(1, &front), (2, &rear)] {
                if value.value <= 0.0 && !value.unknown {
                    return Err(Fault::new(
                        codes::PROFILE,
                        "an exponential profile goes between positive values",
                    )
                    .label(format!("this is {value}"))
                    .at(Place::Argument(index))
                    .into());
                }
            }
            Profile::Exponential { front, rear }
        }
        _ => {
            let depth = quantity(arguments[3], "the depth of the profile", Dimension::LENGTH)
                .map_err(|f| f.at(Place::Argument(3)))?;
            if depth.value <= 0.0 && !depth.unknown {
                return Err(Fault::new(codes::PROFILE, "the depth of an erfc profile must be positive")
                    .label(format!("this is {depth}"))
                    .at(Place::Argument(3))
                    .into());
            }
            Profile::Erfc { surface: front, background: rear, depth }
        }
    };
    Ok(Dynamic::from(ProfileValue(profile)))
}

/// A density or a composition.
fn level(value: &Dynamic, index: usize) -> Result<Quantity, Fault> {
    let fault = |found: String| {
        Fault::new(codes::WRONG_KIND, "a profile goes between densities, or between compositions")
            .label(format!("expected {}, or a plain number; found {found}", Dimension::DENSITY.family()))
            .at(Place::Argument(index))
    };
    if value.is::<value::Unknown>() {
        return Err(Fault::of_unknown());
    }
    match value::any_quantity(value) {
        Some(q) if q.dimension == Dimension::DENSITY || q.is_number() => {
            if q.value.is_finite() {
                Ok(q)
            } else {
                Err(Fault::new(codes::NOT_FINITE, "a value of the profile is not finite")
                    .at(Place::Argument(index)))
            }
        }
        _ => Err(fault(value::described(value))),
    }
}

/// A profile from pairs or maps of depth and value.
fn table_profile(table: &Array) -> Result<Profile<Quantity>, Fault> {
    let (mut depths, mut values) = (Vec::new(), Vec::new());
    for (row, entry) in table.iter().enumerate() {
        let (depth, value) = pair(entry, "depth", &["density", "x", "value"], row)?;
        let depth = quantity(&depth, &format!("the depth in row {row} of the table"), Dimension::LENGTH);
        // A table with named columns comes from a file: the unit belongs into its header, not to one number.
        depths.push(depth.map_err(|fault| match entry.is_map() && fault.code == codes::BARE_NUMBER {
            true => fault.help("name the unit in the header of the file, as scripts spell it: `depth_nm`"),
            false => fault,
        })?);
        values.push(level(&value, 0)?);
    }
    let fault = |message: String| {
        Err(Fault::new(codes::PROFILE, message).help("graded([[0.nm, 2e18.per_cm3], [40.nm, 5e17.per_cm3]])"))
    };
    if depths.len() < 2 {
        return fault(format!("a table needs two rows or more, not {}", depths.len()));
    }
    if let Some(row) = depths.windows(2).position(|d| d[1].value <= d[0].value) {
        return fault(format!(
            "depths must increase: {} in row {row} is followed by {}",
            depths[row],
            depths[row + 1]
        ));
    }
    if let Some(odd) = values.iter().find(|v| v.dimension != values[0].dimension) {
        return fault(format!("the table holds {} beside {odd}", values[0]));
    }
    Ok(Profile::Table { depths, values })
}

/// The two entries of a row of a table, given as a pair or as a map.
pub fn pair(entry: &Dynamic, first: &str, second: &[&str], row: usize) -> Result<(Dynamic, Dynamic), Fault> {
    if let Some(pair) = entry.read_lock::<Array>()
        && pair.len() == 2
    {
        return Ok((pair[0].clone(), pair[1].clone()));
    }
    if let Some(map) = entry.read_lock::<Map>() {
        let found = second.iter().find_map(|key| map.get(*key));
        if let (Some(a), Some(b)) = (map.get(first), found) {
            return Ok((a.clone(), b.clone()));
        }
    }
    if entry.is::<value::Unknown>() {
        return Err(Fault::of_unknown());
    }
    if let Some(map) = entry.read_lock::<Map>() {
        let columns: Vec<&str> = map.keys().map(|key| key.as_str()).collect();
        let lacks = if columns.contains(&first) { second[0] } else { first };
        let shown = columns.iter().map(|c| format!("`{c}`")).collect::<Vec<_>>().join(", ");
        let fault = Fault::new(codes::PROFILE, format!("the table has no column `{lacks}`"))
            .label(format!("its columns are {shown}"));
        let mut names = columns.iter();
        // `depth_nn`: the name is right, and what follows it is no unit.
        return Err(match names.find(|c| c.strip_prefix(lacks).is_some_and(|rest| rest.starts_with('_'))) {
            Some(odd) => {
                let word = &odd[lacks.len() + 1..];
                let unit = super::super::quantity::unknown_unit(word);
                let help = unit.help.clone().unwrap_or_default();
                fault.note(format!("`{word}` in `{odd}` is no unit that scripts know: {help}"))
            }
            None => fault.help(format!(
                "a row is a map of `{first}` and `{}`, or a pair of them in brackets",
                second[0]
            )),
        });
    }
    Err(Fault::new(
        codes::PROFILE,
        format!("row {row} of the table is not a pair of `{first}` and `{}`", second[0]),
    )
    .label(format!("found {}", value::described(entry))))
}
