//! Inputs, data files, stored results: what comes into a script and what leaves it.

use rhai::{Array, Dynamic, Map};

use crate::diagnostics::codes;
use crate::language::dimension::Dimension;
use crate::language::fault::{Fault, Place};
use crate::language::quantity::{Quantity, unknown_unit};
use crate::language::session::{Event, InputRecord, InputValue};
use crate::language::units::{UNITS, unit};
use crate::language::value::{any_quantity, described, give, text};
use crate::language::vocabulary::{Answer, Call, function, topic};

topic! {
    "Inputs and files",
    "Data files are read from the script's folder and below, or from folders opened by `--allow-read`.";

    Function "input" {
        forms: ["input(\"name\", default)"],
        doc: "A value that `--set name=value` on the command line overrides: a quantity, a number, a text or true and false. \
              The value set must have the default's dimension: `--set bsf_thickness=50nm`.",
        example: "let bsf = input(\"bsf_thickness\", 80.nm);",
        register: |engine, session| {
            function(engine, session, "input", 2..=2, input);
        },
    }
    Function "read_csv" {
        forms: ["read_csv(\"file.csv\")"],
        doc: "The rows of a data file as an array of maps. Its header names the columns, with their units as scripts spell \
              them: a column `depth_nm` gives each row a length `depth`. Lines that begin with `#` are remarks.",
        example: "if false { let profile = graded(read_csv(\"ecv_profile.csv\")); }",
        register: |engine, session| {
            function(engine, session, "read_csv", 1..=1, |call, arguments| {
                let (name, content) = read_text(call, arguments[0])?;
                let columns = Columns::read(&name, &content).map_err(|f| f.at(Place::Argument(0)))?;
                Ok(columns.rows().into())
            });
        },
    }
}

/// Name and text of a data file, told to the sink on its first reading.
pub fn read_text(call: &Call, name: &Dynamic) -> Result<(String, String), Fault> {
    let here = |fault: Fault| fault.at(Place::Argument(0));
    let name = text(name, "the name of a file").map_err(here)?;
    let (file, first) = call.session.files.read(&name).map_err(here)?;
    let content =
        std::str::from_utf8(&file.bytes).map_err(|error| here(not_utf8(&name, &file.bytes, error)))?;
    let content = content.strip_prefix('\u{feff}').unwrap_or(content).to_string();
    if first {
        call.session.tell(Event::DataFile(file.clone()));
    }
    Ok((file.name, content))
}

/// The fault of a file in another encoding, with the line that gives it away.
fn not_utf8(name: &str, bytes: &[u8], error: std::str::Utf8Error) -> Fault {
    let message = if bytes.starts_with(&[0xff, 0xfe]) || bytes.starts_with(&[0xfe, 0xff]) {
        format!("the file `{name}` is text in UTF-16, and UTF-8 is read")
    } else {
        let line = 1 + bytes[..error.valid_up_to()].iter().filter(|b| **b == b'\n').count();
        format!("the file `{name}` is not text in UTF-8: line {line} holds a character in another encoding")
    };
    Fault::new(codes::UNREADABLE, message).help("save it as text in UTF-8")
}

/// The fields of a line, apart by the separator; a field may stand in double quotes, which may hold the separator.
fn fields(line: &str, separator: char) -> Vec<&str> {
    let mut quoted = false;
    line.split(move |c: char| {
        quoted ^= c == '"';
        c == separator && !quoted
    })
    .map(|field| {
        let field = field.trim();
        field.strip_prefix('"').and_then(|f| f.strip_suffix('"')).unwrap_or(field).trim()
    })
    .collect()
}

/// A data file by columns.
pub struct Columns {
    names: Vec<(String, Option<&'static crate::language::units::Unit>)>,
    values: Vec<Vec<f64>>,
}

impl Columns {
    /// Reads a header and rows of numbers, apart by commas (or semicolons, or tabs).
    ///
    /// # Errors
    /// A fault that names file, line and column.
    pub fn read(file: &str, content: &str) -> Result<Columns, Fault> {
        let fault = |line: usize, message: String| {
            Fault::new(codes::DATA_FILE, format!("`{file}`, line {line}: {message}"))
        };
        let mut lines = content
            .lines()
            .enumerate()
            .map(|(index, line)| (index + 1, line.trim()))
            .filter(|(_, line)| !line.is_empty() && !line.starts_with('#'));
        let Some((header_line, header)) = lines.next() else {
            return Err(fault(1, "no header that names the columns".to_string()));
        };
        let separator = [';', '\t', ','].into_iter().find(|s| header.contains(*s)).unwrap_or(',');
        let names: Vec<_> = fields(header, separator).into_iter().map(column_name).collect();
        if let Some(number) = names.iter().find(|(name, _)| name.parse::<f64>().is_ok()) {
            return Err(fault(
                header_line,
                format!("a header that names the columns is missing: it begins with `{}`", number.0),
            ));
        }
        if let Some((at, (name, _))) =
            names.iter().enumerate().find(|(at, n)| names[..*at].iter().any(|m| m.0 == n.0))
        {
            return Err(fault(
                header_line,
                format!("two columns are called `{name}`, the second is number {}", at + 1),
            ));
        }
        let mut values = vec![Vec::new(); names.len()];
        for (line, row) in lines {
            let fields = fields(row, separator);
            if fields.len() != names.len() {
                let fault =
                    fault(line, format!("{} fields where the header has {}", fields.len(), names.len()));
                return Err(if separator == ',' && fields.len() > names.len() {
                    fault.help(
                        "commas stand between columns; the decimals of a number follow a point, `2.5e18`",
                    )
                } else {
                    fault
                });
            }
            for ((field, column), (name, _)) in fields.iter().zip(&mut values).zip(&names) {
                match field.parse::<f64>() {
                    Ok(number) if number.is_finite() => column.push(number),
                    _ => {
                        let fault = fault(line, format!("column `{name}`: `{field}` is no number"));
                        let comma = field.replacen(',', ".", 1);
                        return Err(if field.contains(',') && comma.parse::<f64>().is_ok() {
                            fault.help(format!("the decimals of a number follow a point: `{comma}`"))
                        } else {
                            fault
                        });
                    }
                }
            }
        }
        Ok(Columns { names, values })
    }

    /// SI values of a column of this name (without its unit) and dimension.
    pub fn quantity(&self, name: &str, dimension: Dimension) -> Option<Vec<f64>> {
        let index = self
            .names
            .iter()
            .position(|(n, u)| n == name && u.map_or(Dimension::NONE, |u| u.dimension) == dimension)?;
        let unit = self.names[index].1;
        Some(self.values[index].iter().map(|v| unit.map_or(*v, |u| u.to_si(*v))).collect())
    }

    /// One map for each row.
    fn rows(&self) -> Array {
        let count = self.values.first().map_or(0, Vec::len);
        (0..count)
            .map(|row| {
                let mut map = Map::new();
                for ((name, unit), column) in self.names.iter().zip(&self.values) {
                    let value = match unit {
                        Some(unit) => Quantity::in_unit(column[row], unit),
                        None => Quantity::number(column[row]),
                    };
                    map.insert(name.as_str().into(), give(value));
                }
                Dynamic::from(map)
            })
            .collect()
    }
}

/// A column's name and unit: `current_density_mA_per_cm2` is `current_density` in `mA_per_cm2`.
fn column_name(word: &str) -> (String, Option<&'static crate::language::units::Unit>) {
    let longest = UNITS
        .iter()
        .filter(|u| word.strip_suffix(u.name).is_some_and(|rest| rest.len() > 1 && rest.ends_with('_')))
        .max_by_key(|u| u.name.len());
    match longest {
        Some(unit) => (word[..word.len() - unit.name.len() - 1].to_string(), Some(unit)),
        None => (word.to_string(), None),
    }
}

fn input(call: &Call, arguments: &mut [&mut Dynamic]) -> Answer {
    let name = text(arguments[0], "the name of an input").map_err(|f| f.at(Place::Argument(0)))?;
    call.session.state().input_calls.insert(call.line_and_column());
    let default = match any_quantity(arguments[1]) {
        Some(quantity) => InputValue::Quantity(quantity),
        None if arguments[1].is_string() => InputValue::Text(text(arguments[1], "the default")?),
        None => {
            match arguments[1].as_bool() {
                Ok(flag) => InputValue::Flag(flag),
                Err(_) if arguments[1].is::<crate::language::value::Unknown>() => {
                    return Err(Fault::of_unknown().into());
                }
                Err(_) => {
                    return Err(Fault::new(codes::WRONG_KIND, format!("the default of input `{name}` must be a quantity, a number, a text, true or false"))
                    .label(format!("found {}", described(arguments[1])))
                    .at(Place::Argument(1))
                    .into());
                }
            }
        }
    };
    if call.session.state().inputs.contains_key(&name) {
        return Err(Fault::new(codes::INPUT_TWICE, format!("input `{name}` is declared twice"))
            .help(format!("keep it in a variable: let {name} = input(\"{name}\", ..);"))
            .at(Place::Argument(0))
            .into());
    }
    let set =
        call.session.options.set.iter().rev().find(|(key, _)| *key == name).map(|(_, value)| value.clone());
    let (used, fault) = match &set {
        None => (default.clone(), None),
        Some(words) => match read_value(&name, words, &default) {
            Ok(value) => (value, None),
            Err(fault) => (default.clone(), Some(fault)),
        },
    };
    let record = InputRecord { name: name.clone(), default, used: used.clone(), overridden: set.is_some() };
    call.session.state().inputs.insert(name, record.clone());
    call.session.tell(Event::Input(record));
    if let Some(fault) = fault {
        return Err(fault.into());
    }
    Ok(match (used, arguments[1].as_int()) {
        (InputValue::Text(words), _) => words.into(),
        (InputValue::Flag(flag), _) => flag.into(),
        // whole numbers stay whole, so that they can count
        (InputValue::Quantity(q), Ok(_))
            if q.value.fract() == 0.0 && q.value.abs() < 9e15 && q.is_number() =>
        {
            (q.value as i64).into()
        }
        (InputValue::Quantity(q), _) => give(q),
    })
}

/// The value of `--set`, of the kind and dimension of the default.
fn read_value(name: &str, words: &str, default: &InputValue) -> Result<InputValue, Fault> {
    let bad = |message: String| Fault::new(codes::BAD_INPUT_VALUE, message);
    match default {
        InputValue::Text(_) => Ok(InputValue::Text(words.to_string())),
        InputValue::Flag(_) => match words.trim() {
            "true" | "yes" => Ok(InputValue::Flag(true)),
            "false" | "no" => Ok(InputValue::Flag(false)),
            other => Err(bad(format!("--set {name}={other}: true or false is wanted"))
                .help(format!("--set {name}=true"))),
        },
        InputValue::Quantity(default) => {
            let value = read_quantity(words).map_err(|mut fault| {
                if fault.code == codes::UNKNOWN_UNIT && !default.is_number() {
                    let units = UNITS.iter().filter(|u| u.dimension == default.dimension).map(|u| u.name);
                    let units = units.collect::<Vec<_>>().join(", ");
                    fault = fault.note(format!("units of {}: {units}", default.dimension.family_name()));
                }
                fault.message = format!("--set {name}={words}: {}", fault.message);
                fault.code = codes::BAD_INPUT_VALUE;
                fault
            })?;
            if value.dimension != default.dimension {
                let unit = default.unit().map_or("", |u| u.name);
                return Err(bad(format!(
                    "--set {name}={words}: {} is wanted, not {}",
                    default.dimension.family_name(),
                    value.dimension.family_name()
                ))
                .help(format!("--set {name}={}{unit}", default.literal())));
            }
            Ok(InputValue::Quantity(value))
        }
    }
}

/// A number and a unit as typed on a command line: "50nm", "50.nm", "2e17 per_cm3", "5 %", "0.3".
///
/// # Errors
/// What is no number, or an unknown unit.
pub fn read_quantity(words: &str) -> Result<Quantity, Fault> {
    let words = words.trim();
    let mut best = None;
    for (end, _) in words.char_indices().map(|(at, c)| (at + c.len_utf8(), c)) {
        if let Ok(number) = words[..end].trim_end().parse::<f64>()
            && words[..end].ends_with(|c: char| c.is_ascii_digit() || c == '.')
        {
            best = Some((number, end));
        }
    }
    let Some((number, end)) = best else {
        return Err(Fault::new(codes::BAD_INPUT_VALUE, format!("`{words}` does not begin with a number")));
    };
    if !number.is_finite() {
        return Err(Fault::new(codes::BAD_INPUT_VALUE, format!("`{words}` is not finite")));
    }
    let name = words[end..].trim().trim_start_matches('.');
    if name.is_empty() {
        return Ok(Quantity::number(number));
    }
    if name.starts_with(',') {
        return Err(Fault::new(
            codes::BAD_INPUT_VALUE,
            "the decimals of a number follow a point, not a comma",
        ));
    }
    let found = unit(name).or_else(|| UNITS.iter().find(|u| u.symbol == name));
    match found {
        Some(unit) => Ok(Quantity::in_unit(number, unit)),
        None => Err(unknown_unit(name)),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Source of truth: the specified spellings of `--set`, read by hand.
    #[test]
    fn numbers_with_units_are_read_as_typed() {
        for (words, si, dimension) in [
            ("50nm", 5e-8, Dimension::LENGTH),
            ("50.nm", 5e-8, Dimension::LENGTH),
            ("2e17 per_cm3", 2e23, Dimension::DENSITY),
            ("2e17per_cm3", 2e23, Dimension::DENSITY),
            ("5 %", 0.05, Dimension::NONE),
            ("-0.5V", -0.5, Dimension::VOLTAGE),
            ("1.5e-3", 1.5e-3, Dimension::NONE),
            ("3 m", 3.0, Dimension::LENGTH),
            ("2ohm_cm2", 2e-4, Dimension::AREA_RESISTANCE),
        ] {
            let read = read_quantity(words).unwrap_or_else(|f| panic!("{words}: {}", f.message));
            assert_eq!((read.value, read.dimension), (si, dimension), "{words}");
        }
        assert_eq!(read_quantity("nm").unwrap_err().code, codes::BAD_INPUT_VALUE);
        assert_eq!(read_quantity("5 nmm").unwrap_err().code, codes::UNKNOWN_UNIT);
        assert!(read_quantity("5,5nm").unwrap_err().message.contains("follow a point"));
        assert_eq!(read_quantity("1e999").unwrap_err().code, codes::BAD_INPUT_VALUE);
    }

    /// Source of truth: the specified column names.
    #[test]
    fn columns_carry_their_units() {
        let name = |word: &str| {
            let (name, unit) = column_name(word);
            (name, unit.map(|u| u.name))
        };
        assert_eq!(name("current_density_mA_per_cm2"), ("current_density".to_string(), Some("mA_per_cm2")));
        assert_eq!(name("depth_um"), ("depth".to_string(), Some("um")));
        assert_eq!(name("voltage_V"), ("voltage".to_string(), Some("V")));
        assert_eq!(name("n"), ("n".to_string(), None));
        assert_eq!(name("density_per_cm3"), ("density".to_string(), Some("per_cm3")));
        let columns = Columns::read("x.csv", "# remark\ndepth_nm, density_per_cm3\n0,2e18\n40,5e17\n")
            .map_err(|f| f.message.clone());
        assert_eq!(columns.unwrap().quantity("density", Dimension::DENSITY), Some(vec![2e24, 5e23]));
        let torn = Columns::read("x.csv", "a,b\n1,2\n3\n").err().unwrap();
        assert!(torn.message.contains("line 3"), "{}", torn.message);
    }
}
