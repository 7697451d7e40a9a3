//! Pictures from a script: written into the folder of the archive, and nowhere else.

use std::path::{Component, Path};

use rhai::{Array, Dynamic, Map};

use crate::archive::Snapshot;
use crate::diagnostics::codes;
use crate::language::dimension::Dimension;
use crate::language::fault::{Fault, Place};
use crate::language::point;
use crate::language::session::PictureRefused;
use crate::language::value::{Options, any_quantity, described, text};
use crate::language::vocabulary::{Answer, Call, OptionRow, function, topic};
use crate::picture::chart::Scale;
use crate::picture::charts::{self, Choice};
use crate::picture::{Chart, Format, Kind, PictureError, View, convert, draw, overlay};

use super::results::{is_result, snapshot_of, stack_name};

/// Bytes of a picture's name.
const LONGEST_NAME: usize = 200;

static OPTIONS: &[OptionRow] = &[
    OptionRow {
        key: "chart",
        takes: "a text: `jv`, `power`, `cv`, `eqe`, `bands`, `carriers`, `field`, `rates`, `ledger`, `lines`, `map` or `histogram`",
        doc: "What to show; without it the first that the result gives.",
    },
    OptionRow {
        key: "names",
        takes: "an array of texts",
        doc: "Names of several results in the legend, instead of the keys of their map or the names of their stacks.",
    },
    OptionRow {
        key: "title",
        takes: "a text",
        doc: "The title instead of the file's name; `\"\"` for none.",
    },
    OptionRow {
        key: "x",
        takes: "a text",
        doc: "The column of a table along; of a histogram the one that is counted.",
    },
    OptionRow { key: "y", takes: "a text or an array of texts", doc: "The columns of a table up." },
    OptionRow { key: "z", takes: "a text", doc: "The column that a map shows by colour." },
    OptionRow {
        key: "x_scale",
        takes: "a text: `linear` or `log`",
        doc: "Scale of the axis along, instead of what suits the data.",
    },
    OptionRow { key: "y_scale", takes: "a text: `linear` or `log`", doc: "Scale of the axis up." },
    OptionRow {
        key: "x_range",
        takes: "an array of two numbers",
        doc: "Range of the axis along, in its unit.",
    },
    OptionRow { key: "y_range", takes: "an array of two numbers", doc: "Range of the axis up, in its unit." },
    OptionRow {
        key: "width",
        takes: "a length",
        doc: "Width, 40 mm to 1 m; one column of print, 85 mm, if not given.",
    },
    OptionRow {
        key: "height",
        takes: "a length",
        doc: "Height, 40 mm to 1 m; what the content needs if not given.",
    },
];

topic! {
    "Pictures",
    "Pictures go into the folder of the archive and below it, and nowhere else; checking and replaying write none.";

    Function "picture" {
        forms: ["picture(\"bands.svg\", result)", "picture(\"jv.svg\", [result, ..])", "picture(\"jv.svg\", #{ name: result, .. })", "picture(\"bands.svg\", result, #{ options })"],
        doc: "Draws a result (what `store` takes) into a file that ends in `.svg`, `.png` or `.pdf`. Several results of a kind are laid \
              over each other, a colour for each, with a legend of their names. Each file name once. What a picture leaves out, such \
              as values off its scale, stands in its notes.",
        options: OPTIONS,
        example: "let gaas = material(\"GaAs\", #{ electron_lifetime: 20.ns, hole_lifetime: 20.ns });\nlet cell = stack(\"diode\", [layer(\"emitter\", gaas, 100.nm, donors(2e18.per_cm3)), layer(\"base\", gaas, 2.um, acceptors(1e17.per_cm3))]);\npicture(\"carriers.svg\", cell.equilibrium(), #{ chart: \"carriers\", title: \"Carriers in the dark\" });",
        register: |engine, session| {
            function(engine, session, "picture", 2..=3, picture);
        },
    }
}

fn picture(call: &Call, arguments: &mut [&mut Dynamic]) -> Answer {
    let name = text(arguments[0], "the name of a picture").map_err(|f| f.at(Place::Argument(0)))?;
    let here = |fault: Fault| fault.at(Place::Argument(0));
    below(&name).map_err(here)?;
    let format = Format::of(Path::new(&name)).map_err(|error| here(fault_of(&error)))?;
    let options = match arguments.get(2) {
        Some(value) => Options::new(value, "picture", OPTIONS.iter().map(|row| row.key))
            .map_err(crate::language::fault::Faults)?,
        None => Options::none(),
    };
    let wish = wish(&name, &options)?;
    let session = call.session;
    if point::inside() {
        return Err(Fault::new(codes::NO_PICTURE, "a point of a plan draws no picture")
            .help("store the result in the point, and draw it with `epiloom plot`")
            .into());
    }
    if !session.state().pictures.insert(name.clone()) {
        return Err(here(
            Fault::new(codes::SNAPSHOT_TWICE, format!("two pictures are called `{name}`"))
                .help("put what changes into the name: picture(`bands ${t}.svg`, ..)"),
        )
        .into());
    }
    let here_too = |fault: Fault| fault.at(Place::Argument(1));
    let mut snapshots = Vec::new();
    for (name, result) in results(arguments[1], &wish)? {
        match snapshot_of(&name, 0, &result).map_err(here_too)? {
            Some(snapshot) => snapshots.push(snapshot),
            None => return Ok(Dynamic::UNIT),
        }
    }
    if session.checking() {
        return Ok(Dynamic::UNIT);
    }
    let bytes = drawn(&snapshots, &wish, format).map_err(|error| here_too(fault_of(&error)))?;
    session.write_picture(name.clone(), bytes).map_err(|refused| {
        here(match refused {
            PictureRefused::Outside => outside(&name),
            PictureRefused::Unwritable(why) => {
                Fault::new(codes::UNWRITABLE, format!("the picture `{name}` cannot be written: {why}"))
            }
        })
    })?;
    Ok(Dynamic::UNIT)
}

/// The results to draw with their names: one under the title of the picture, or several.
fn results(given: &Dynamic, wish: &Wish) -> Result<Vec<(String, Dynamic)>, Fault> {
    let mut found: Vec<(String, Dynamic)> = Vec::new();
    if let Some(list) = given.read_lock::<Array>()
        && list.iter().any(is_result)
    {
        for (place, result) in list.iter().enumerate() {
            let stack = stack_name(result)
                .filter(|name| list.iter().filter(|r| stack_name(r).as_ref() == Some(name)).count() == 1);
            found.push((stack.unwrap_or_else(|| (place + 1).to_string()), result.flatten_clone()));
        }
    } else if let Some(map) = given.read_lock::<Map>()
        && map.values().any(is_result)
    {
        found.extend(map.iter().map(|(name, result)| (name.to_string(), result.flatten_clone())));
    } else {
        let mut names = wish.names.iter();
        let name = names.next().unwrap_or(&wish.title).clone();
        return Ok(vec![(name, given.clone())]);
    }
    if !wish.names.is_empty() && wish.names.len() != found.len() {
        return Err(Fault::new(
            codes::WRONG_CHOICE,
            format!("there are {} names for {} results", wish.names.len(), found.len()),
        )
        .at(Place::Option("names".to_string())));
    }
    for ((name, _), wanted) in found.iter_mut().zip(&wish.names) {
        name.clone_from(wanted);
    }
    Ok(found)
}

/// What a script asks of a picture.
struct Wish {
    names: Vec<String>,
    kind: Option<Kind>,
    choice: Choice,
    view: View,
    title: String,
}

fn wish(name: &str, options: &Options) -> Result<Wish, Fault> {
    let word = |key: &str| {
        let given = options.get(key).map(|value| text(value, &format!("`{key}`")));
        given.transpose().map_err(|f| f.at(Place::Option(key.to_string())))
    };
    let kind = match word("chart")? {
        None => None,
        Some(word) => Some(Kind::named(&word).ok_or_else(|| {
            fault_of(&PictureError::UnknownChart { word }).at(Place::Option("chart".to_string()))
        })?),
    };
    let scale = |key: &str| match word(key)?.as_deref() {
        None => Ok(None),
        Some("linear") => Ok(Some(Scale::Linear)),
        Some("log") => Ok(Some(Scale::Log)),
        Some(other) => Err(Fault::new(codes::WRONG_CHOICE, format!("no scale is called \"{other}\""))
            .candidates(other, ["linear", "log"])
            .at(Place::Option(key.to_string()))),
    };
    let length = |key: &str| {
        let given = options.quantity(key, &format!("the {key} of a picture"), Dimension::LENGTH)?;
        match given.map(|q| q.value * 1e3) {
            Some(mm) if !(39.999..=1000.001).contains(&mm) => Err(Fault::new(
                codes::WRONG_CHOICE,
                format!("the {key} of a picture must be within 40 mm to 1 m"),
            )
            .at(Place::Option(key.to_string()))),
            mm => Ok(mm),
        }
    };
    let given_title = word("title")?;
    let stem = Path::new(name).file_stem().unwrap_or_default().to_string_lossy().into_owned();
    let mut view = View {
        height: length("height")?,
        x_scale: scale("x_scale")?,
        y_scale: scale("y_scale")?,
        x_range: range(options, "x_range")?,
        y_range: range(options, "y_range")?,
        titled: given_title.as_deref() != Some(""),
        ..View::default()
    };
    if let Some(width) = length("width")? {
        view.width = width;
    }
    let choice = Choice { x: word("x")?, y: texts(options, "y")?, z: word("z")?, least_is_best: false };
    Ok(Wish {
        names: texts(options, "names")?,
        kind,
        choice,
        view,
        title: given_title.filter(|t| !t.is_empty()).unwrap_or(stem),
    })
}

/// A text or an array of texts.
fn texts(options: &Options, key: &str) -> Result<Vec<String>, Fault> {
    let Some(value) = options.get(key) else { return Ok(Vec::new()) };
    let here = |fault: Fault| fault.at(Place::Option(key.to_string()));
    match value.read_lock::<Array>() {
        Some(list) => list.iter().map(|each| text(each, "a column").map_err(here)).collect(),
        None => Ok(vec![text(value, "a column").map_err(here)?]),
    }
}

/// Two numbers, the lower first; quantities count in the unit that they were given in.
fn range(options: &Options, key: &str) -> Result<Option<(f64, f64)>, Fault> {
    let Some(value) = options.get(key) else { return Ok(None) };
    let wrong = || {
        Fault::new(codes::WRONG_KIND, format!("`{key}` must be an array of two numbers, the lower first"))
            .label(format!("found {}", described(value)))
            .help(format!("{key}: [0, 1.2]"))
            .at(Place::Option(key.to_string()))
    };
    let list = value.read_lock::<Array>().map(|list| list.clone()).ok_or_else(wrong)?;
    let number =
        |value: &Dynamic| any_quantity(value).map(|q| q.unit().map_or(q.value, |u| u.typed(q.value)));
    match list.as_slice() {
        [from, to] => match (number(from), number(to)) {
            (Some(from), Some(to)) if from < to => Ok(Some((from, to))),
            _ => Err(wrong()),
        },
        _ => Err(wrong()),
    }
}

fn drawn(snapshots: &[Snapshot], wish: &Wish, format: Format) -> Result<Vec<u8>, PictureError> {
    let mut charts: Vec<Chart> = Vec::new();
    for snapshot in snapshots {
        let kind = match (wish.kind, charts.first()) {
            (Some(kind), _) => kind,
            (None, Some(first)) => first.kind,
            (None, None) if wish.choice.z.is_some() => Kind::Map,
            (None, None) => charts::first(snapshot)?,
        };
        charts.push(charts::chart(snapshot, kind, &wish.choice)?);
    }
    let several = charts.len() > 1;
    let nothing =
        || PictureError::Nothing { snapshot: wish.title.clone(), of: String::new(), reason: String::new() };
    let mut chart = overlay::overlay(charts)?.ok_or_else(nothing)?;
    if several {
        chart.title.clone_from(&wish.title);
    }
    convert::bytes(&draw(&chart, &wish.view)?.svg, format)
}

/// Whether a name stays below the output folder by its words alone; links are looked at where it is written.
fn below(name: &str) -> Result<(), Fault> {
    let plain = Path::new(name).components().all(|part| matches!(part, Component::Normal(_)));
    // a backslash or a colon would leave the folder on other systems
    let strange = name.chars().any(|c| c.is_control() || matches!(c, '\\' | ':'));
    if name.trim().is_empty() || name.len() > LONGEST_NAME {
        return Err(Fault::new(
            codes::WRONG_CHOICE,
            format!("the name of a picture has 1 to {LONGEST_NAME} letters"),
        ));
    }
    if !plain || strange {
        return Err(outside(name));
    }
    Ok(())
}

fn outside(name: &str) -> Fault {
    Fault::new(codes::OUTSIDE_OUTPUT, format!("the picture `{name}` would lie outside the folder of the archive"))
        .help("give it a plain name: picture(\"bands.svg\", ..); `epiloom run --out FOLDER/NAME.epiloom` sets the folder")
}

fn fault_of(error: &PictureError) -> Fault {
    let code = match error {
        PictureError::Conversion { .. } => codes::INTERNAL,
        _ => codes::NO_PICTURE,
    };
    let fault = Fault::new(code, error.to_string());
    match error.help() {
        Some(help) => fault.help(help),
        None => fault,
    }
}
