//! From the engine's errors to diagnostics: none of Rhai's own words reach a person.

use std::sync::Arc;

use rhai::{Dynamic, EvalAltResult, LexError, ParseError, ParseErrorType, Position};

use crate::diagnostics::{Diagnostic, codes};

use super::engine::faults_of;
use super::fault::Fault;
use super::quantity::Quantity;
use super::sandbox::{Stop, closed_function};
use super::session::Session;
use super::units::UNITS;
use super::value::{kind_name, with_article};
use super::vocabulary::{callable, entries};

/// Whether the error ends even a check: the run was stopped or is out of bounds.
pub(super) fn is_stop(error: &EvalAltResult) -> bool {
    let (inner, _) = innermost(error);
    matches!(
        inner,
        EvalAltResult::ErrorTerminated(..)
            | EvalAltResult::ErrorTooManyOperations(..)
            | EvalAltResult::ErrorStackOverflow(..)
            | EvalAltResult::Exit(..)
    )
}

/// Why a script was stopped between two operations, if it was.
pub(super) fn stop(error: &EvalAltResult) -> Option<Stop> {
    match innermost(error).0 {
        EvalAltResult::ErrorTerminated(value, _) => value.clone().try_cast::<Stop>(),
        _ => None,
    }
}

/// The error that stops a script.
pub(super) fn stopped(stop: Stop, position: Position) -> Box<EvalAltResult> {
    Box::new(EvalAltResult::ErrorTerminated(Dynamic::from(stop), position))
}

/// Keeps the error's faults without stopping.
pub(super) fn keep(session: &Arc<Session>, error: &EvalAltResult) {
    for (fault, position) in faults(session, error) {
        session.keep(&fault, position);
    }
}

/// The error as diagnostics.
pub(super) fn diagnostics(session: &Arc<Session>, error: &EvalAltResult) -> Vec<Diagnostic> {
    faults(session, error).iter().map(|(fault, position)| session.diagnostic(fault, *position)).collect()
}

/// The innermost error, and the innermost position known.
fn innermost(mut error: &EvalAltResult) -> (&EvalAltResult, Position) {
    let mut position = error.position();
    loop {
        match error {
            EvalAltResult::ErrorInFunctionCall(_, _, inner, _)
            | EvalAltResult::ErrorInModule(_, inner, _) => error = inner,
            other => return (other, position),
        }
        if !error.position().is_none() {
            position = error.position();
        }
    }
}

/// The error as faults with their positions; those that follow from an unknown value left out.
fn faults(session: &Arc<Session>, error: &EvalAltResult) -> Vec<(Fault, Position)> {
    let (inner, position) = innermost(error);
    let one = |fault: Fault| vec![(fault, position)];
    match inner {
        EvalAltResult::ErrorRuntime(value, _) => match faults_of(value) {
            Some(faults) => {
                faults.0.into_iter().filter(|f| !f.of_unknown).map(|fault| (fault, position)).collect()
            }
            None => one(Fault::new(codes::THROWN, thrown(value))),
        },
        EvalAltResult::ErrorTerminated(value, _)
            if matches!(
                value.clone().try_cast::<Stop>(),
                Some(Stop::Fault | Stop::Share(_) | Stop::Halted)
            ) =>
        {
            Vec::new()
        }
        EvalAltResult::ErrorTerminated(value, _) => one(match value.clone().try_cast::<Stop>() {
            Some(Stop::Operations) => too_many_operations(session),
            Some(Stop::Memory) => {
                Fault::new(codes::TOO_LARGE, "the script needs more memory than it may have")
                    .label(format!("stopped here, at {} MB", session.options.limits.memory >> 20))
            }
            _ => Fault::new(codes::INTERRUPTED, "the run was interrupted").label("stopped here"),
        }),
        EvalAltResult::ErrorParsing(kind, _) => one(parsing(&session.source.text, kind, position)),
        EvalAltResult::ErrorFunctionNotFound(signature, _) => not_found(signature).map_or_else(Vec::new, one),
        EvalAltResult::ErrorVariableNotFound(name, _) => {
            one(unknown_name(&session.source.text, name, position))
        }
        EvalAltResult::ErrorDotExpr(message, _) => dotted(message).map_or_else(Vec::new, one),
        EvalAltResult::ErrorPropertyNotFound(name, _) => {
            let mut fault = Fault::new(codes::NO_SUCH_ENTRY, format!("the map has no entry `{name}`"));
            let coordinates = super::point::coordinates();
            if !coordinates.is_empty() {
                let all: Vec<String> = coordinates.iter().map(|name| format!("`{name}`")).collect();
                fault = fault.note(format!("the point itself has {}", all.join(", ")));
                if let Some(near) = crate::diagnostics::suggest(name, coordinates.iter().map(String::as_str))
                {
                    fault = fault.help(format!("did you mean `{near}`?"));
                }
            }
            one(fault)
        }
        EvalAltResult::ErrorIndexNotFound(index, _) => one(Fault::new(
            codes::NO_SUCH_ENTRY,
            format!("there is no entry {}", super::value::described(index)),
        )),
        EvalAltResult::ErrorArrayBounds(length, index, _) => one(Fault::new(
            codes::NO_SUCH_ENTRY,
            format!("there is no entry {index} in an array of {length}"),
        )
        .help("entries count from 0, or from -1 backwards")),
        EvalAltResult::ErrorStringBounds(length, index, _) => one(Fault::new(
            codes::NO_SUCH_ENTRY,
            format!("there is no character {index} in a text of {length}"),
        )),
        EvalAltResult::ErrorIndexingType(kind, _) => indexing(kind).map_or_else(Vec::new, one),
        EvalAltResult::ErrorVariableExists(name, _) | EvalAltResult::ErrorForbiddenVariable(name, _) => {
            one(Fault::new(codes::RESERVED_WORD, format!("`{name}` cannot be a variable"))
                .help(format!("choose another name: `my_{name}`")))
        }
        EvalAltResult::ErrorMismatchDataType(wanted, found, _)
        | EvalAltResult::ErrorMismatchOutputType(wanted, found, _) => {
            mismatch(wanted, found).map_or_else(Vec::new, one)
        }
        EvalAltResult::ErrorFor(_) => {
            one(Fault::new(codes::WRONG_KIND, "`for` goes through an array, a range or a text")
                .help("for t in [20.nm, 30.nm] { .. }"))
        }
        EvalAltResult::ErrorDataRace(words, _) => {
            // the engine names the function at the end of its words, and no place
            let text = &session.source.text;
            let method = words.rsplit('\'').nth(1).unwrap_or_default();
            match super::spans::call_on_own_variable(text, method) {
                Some((span, variable)) if position.is_none() => {
                    let (line, column) = session.source.position(span.start);
                    let short = |n: usize| u16::try_from(n).unwrap_or(u16::MAX);
                    vec![(super::captured::held(variable), Position::new(short(line), short(column)))]
                }
                _ => one(super::captured::in_use()),
            }
        }
        EvalAltResult::ErrorAssignmentToConstant(name, _)
        | EvalAltResult::ErrorNonPureMethodCallOnConstant(name, _) => {
            one(Fault::new(codes::RESERVED_WORD, format!("`{name}` is a constant and cannot be changed"))
                .help("define it by `let` instead of `const`"))
        }
        EvalAltResult::ErrorArithmetic(..) => {
            one(Fault::new(codes::ARITHMETIC, "this calculation with whole numbers has no result")
                .help("write one of the numbers with a point, `2.0`, to calculate with real numbers"))
        }
        EvalAltResult::ErrorTooManyOperations(_) => one(too_many_operations(session)),
        EvalAltResult::ErrorTooManyVariables(_) => {
            one(Fault::new(codes::TOO_LARGE, "the script defines too many variables"))
        }
        EvalAltResult::ErrorStackOverflow(_) => {
            one(Fault::new(codes::TOO_DEEP, "functions call each other too deeply"))
        }
        EvalAltResult::ErrorDataTooLarge(what, _) => one(Fault::new(
            codes::TOO_LARGE,
            match what.to_lowercase() {
                w if w.contains("string") => {
                    format!("a text grew beyond {} bytes", session.options.limits.text)
                }
                w if w.contains("array") => {
                    format!("an array grew beyond {} entries", session.options.limits.array)
                }
                w if w.contains("map") => format!("a map grew beyond {} entries", session.options.limits.map),
                _ => "a value grew too large".to_string(),
            },
        )),
        EvalAltResult::ErrorModuleNotFound(..) | EvalAltResult::ErrorTooManyModules(_) => {
            one(closed_function("import"))
        }
        EvalAltResult::ErrorUnboundThis(_) => {
            one(Fault::new(codes::UNKNOWN_NAME, "`this` stands for nothing here")
                .help("pass the value as an argument"))
        }
        EvalAltResult::ErrorBitFieldBounds(..) | EvalAltResult::LoopBreak(..) => {
            one(Fault::new(codes::SYNTAX, "this cannot stand here"))
        }
        EvalAltResult::Return(..) | EvalAltResult::Exit(..) => Vec::new(),
        _ => one(Fault::new(codes::INTERNAL, "the script engine failed")),
    }
}

/// A reading error as a diagnostic.
pub(super) fn parse_diagnostic(session: &Arc<Session>, error: &ParseError) -> Diagnostic {
    let position = error.position();
    let fault = parsing(&session.source.text, error.err_type(), position);
    session.diagnostic(&fault, position)
}

/// What is wrong with the text.
fn parsing(text: &str, kind: &ParseErrorType, position: Position) -> Fault {
    let syntax = |message: String| Fault::new(codes::SYNTAX, message);
    match kind {
        ParseErrorType::VariableUndefined(name) => unknown_name(text, name, position),
        ParseErrorType::UnexpectedEOF => {
            syntax("the script ends too early".to_string()).help("a bracket or brace above is not closed")
        }
        ParseErrorType::BadInput(LexError::ImproperSymbol(word, _)) | ParseErrorType::Reserved(word)
            if matches!(word.as_str(), "eval" | "import") =>
        {
            closed_function(word)
        }
        ParseErrorType::BadInput(LexError::ImproperSymbol(word, _)) | ParseErrorType::Reserved(word)
            if word.chars().all(|c| c.is_alphanumeric() || c == '_') =>
        {
            Fault::new(codes::RESERVED_WORD, format!("`{word}` is a reserved word"))
                .help(format!("choose another name: `my_{word}`"))
        }
        ParseErrorType::BadInput(LexError::ImproperSymbol(word, _)) => match word.as_str() {
            "===" | "!==" => {
                syntax(format!("`{word}` is no operator here")).help(format!("write `{}`", &word[..2]))
            }
            "->" | "=>" | "::" | ":=" => syntax(format!("`{word}` cannot stand here")),
            "++" | "--" => syntax(format!("`{word}` is no operator here")).help("write `x += 1`"),
            _ => syntax(format!("`{word}` cannot stand here")),
        },
        ParseErrorType::BadInput(error) => match error {
            LexError::UnterminatedString => syntax("a text is not closed".to_string()).help(
                "close it with the quote it begins with; a text over several lines stands in back quotes",
            ),
            LexError::StringTooLong(_) => Fault::new(codes::TOO_LARGE, "a text in the script is too long"),
            LexError::MalformedNumber(words) => syntax(format!("`{words}` is no number")),
            LexError::MalformedChar(words) => syntax(format!("`'{words}'` is no character"))
                .help("texts stand in double quotes: \"window\""),
            LexError::MalformedEscapeSequence(words) => {
                syntax(format!("`{words}` has no meaning in a text")).help("write a backslash as `\\\\`")
            }
            LexError::UnexpectedInput(words) => {
                let fault = syntax(format!("`{words}` cannot stand here"));
                match foreign_sign(words) {
                    Some(help) => fault.help(help),
                    None => fault,
                }
            }
            LexError::MalformedIdentifier(words) => syntax(format!("`{words}` is no name")),
            _ => syntax("this cannot be read".to_string()),
        },
        ParseErrorType::UnknownOperator(words) => syntax(format!("`{words}` is no operator")),
        ParseErrorType::MissingToken(token, why) if token == "," => {
            let closing = match why.to_lowercase() {
                w if w.contains("array") => "]",
                w if w.contains("map") => "}",
                _ => ")",
            };
            syntax(format!("`,` or `{closing}` is missing before this place"))
        }
        ParseErrorType::MissingToken(token, _) => {
            let fault = syntax(format!("`{token}` is missing before this place"));
            match (token == ";").then(|| unit_apart(text, position)) {
                Some(Some(written)) => {
                    fault.help(format!("a unit stands behind a point, without a blank: `{written}`"))
                }
                Some(None) => fault.help("end the statement before this place with `;`"),
                None => fault,
            }
        }
        ParseErrorType::DuplicatedProperty(key) => syntax(format!("the map has two entries `{key}`")),
        ParseErrorType::DuplicatedVariable(name) | ParseErrorType::VariableExists(name) => {
            syntax(format!("`{name}` is defined twice"))
        }
        ParseErrorType::ForbiddenVariable(name) => {
            if super::units::unit(name).is_some() {
                Fault::new(codes::UNIT_SHADOWED, format!("`{name}` is a unit and cannot be a variable"))
                    .help(format!("choose another name: `{name}_value`"))
            } else {
                Fault::new(
                    codes::ALREADY_DEFINED,
                    format!("`{name}` is a word of the language and cannot be a variable"),
                )
                .help(format!("choose another name: `my_{name}`"))
            }
        }
        ParseErrorType::AssignmentToConstant(name) => {
            Fault::new(codes::RESERVED_WORD, format!("`{name}` is a constant and cannot be changed"))
                .help("define it by `let` instead of `const`")
        }
        ParseErrorType::AssignmentToInvalidLHS(_) => assigned_to_call(),
        ParseErrorType::FnDuplicatedDefinition(name, count) => Fault::new(
            codes::ALREADY_DEFINED,
            format!("the function `{name}` with {count} arguments is defined twice"),
        ),
        ParseErrorType::FnDuplicatedParam(name, argument) => {
            syntax(format!("the function `{name}` has two arguments `{argument}`"))
        }
        ParseErrorType::WrongFnDefinition => {
            syntax("a function cannot be defined inside another".to_string())
                .help("define it at the outer level, or write a closure: `let f = |x| ..;`")
        }
        ParseErrorType::FnMissingName
        | ParseErrorType::FnMissingParams(_)
        | ParseErrorType::FnMissingBody(_) => {
            syntax("the definition of a function is not complete".to_string())
                .help("fn name(argument) { .. }")
        }
        ParseErrorType::VariableExpected => syntax("a name is expected here".to_string()),
        ParseErrorType::PropertyExpected => syntax("a property or key is expected here".to_string())
            .help("keys of a map are words or texts: #{ recombination_velocity: 1e6.cm_per_s }"),
        ParseErrorType::ExprExpected(_) => syntax("a value is expected here".to_string()),
        ParseErrorType::MismatchedType(wanted, found) => mismatch(wanted, found)
            .unwrap_or_else(|| syntax("a value of another kind is expected here".to_string())),
        ParseErrorType::MalformedIndexExpr(_) => syntax("this cannot stand in the brackets".to_string())
            .help("layers are found by name, `cell[\"window\"]`, entries of an array by number, `points[0]`"),
        ParseErrorType::LoopBreak => syntax("`break` and `continue` stand inside a loop".to_string()),
        ParseErrorType::ExprTooDeep => Fault::new(codes::TOO_DEEP, "an expression has too many levels"),
        ParseErrorType::TooManyFunctions => Fault::new(codes::TOO_LARGE, "the script has too many functions"),
        ParseErrorType::LiteralTooLarge(..) => {
            Fault::new(codes::TOO_LARGE, "a text, array or map in the script is too large")
        }
        ParseErrorType::ModuleUndefined(_) => closed_function("import"),
        _ => syntax("the text cannot be read here".to_string()),
    }
}

/// What was meant where a number and its unit stand apart, `30 nm`; the position is that of the unit.
fn unit_apart(text: &str, position: Position) -> Option<String> {
    let at = offset(text, position)?;
    let unit = word_from(text, at);
    super::units::unit(unit)?;
    let before = text[..at].trim_end_matches(' ');
    let digits = before.len()
        - before.trim_end_matches(|c: char| c.is_ascii_digit() || matches!(c, '.' | 'e' | '-')).len();
    let number = &before[before.len() - digits..];
    number.parse::<f64>().is_ok().then(|| format!("{number}.{unit}"))
}

/// The byte that a position names.
fn offset(text: &str, position: Position) -> Option<usize> {
    let line = position.line()?;
    let at = crate::diagnostics::Span::at(text, line, position.position().unwrap_or(0), Some(1)).start;
    text.is_char_boundary(at).then_some(at)
}

/// The word that begins at a byte.
fn word_from(text: &str, at: usize) -> &str {
    let rest = text.get(at..).unwrap_or_default();
    let end = rest.find(|c: char| !(c.is_alphanumeric() || c == '_')).unwrap_or(rest.len());
    &rest[..end]
}

/// What to write instead of a sign that word processors and keyboards put into scripts.
fn foreign_sign(words: &str) -> Option<&'static str> {
    Some(match words.chars().next()? {
        '\u{b5}' | '\u{3bc}' => {
            "units are spelled in plain letters: `um` for micrometre, `us` for microsecond"
        }
        '\u{3a9}' | '\u{2126}' => "units are spelled in plain letters: `ohm_cm2`",
        '²' | '³' | '⁻' => "powers in units are spelled in plain characters: `per_cm3`, `cm2`",
        '“' | '”' | '„' | '«' | '»' => "texts stand in straight quotes: \"window\"",
        '‘' | '’' => "texts stand in straight double quotes: \"window\"",
        '\u{2212}' | '\u{2013}' | '\u{2014}' => "the minus sign is `-`",
        '×' | '·' => "the sign of a product is `*`",
        '÷' => "the sign of a quotient is `/`",
        '\u{a0}' | '\u{200b}' | '\u{feff}' => {
            "an invisible character that is no blank stands here: type the blank anew"
        }
        _ => return None,
    })
}

/// Words of every script that no row of the vocabulary teaches.
const PLAIN_WORDS: [&str; 20] = [
    "print",
    "push",
    "pop",
    "len",
    "keys",
    "values",
    "range",
    "insert",
    "remove",
    "contains",
    "map",
    "filter",
    "sort",
    "join",
    "split",
    "to_string",
    "type_of",
    "is_empty",
    "append",
    "reduce",
];

/// Words of the engine that begin statements or stand for values.
const KEYWORDS: [&str; 10] =
    ["let", "const", "else", "for", "while", "loop", "return", "break", "true", "false"];

/// A name that nothing has defined; a variable of the script where a function asks for it.
fn unknown_name(text: &str, name: &str, position: Position) -> Fault {
    let defined: Vec<&str> = definitions(text).collect();
    if defined.contains(&name) && inside_function(text, position) {
        return Fault::new(
            codes::FUNCTION_SEES_ARGUMENTS,
            format!("`{name}` is a variable of the script, and a function cannot see it"),
        )
        .label("not an argument of this function")
        .help(format!(
            "a function sees only its arguments: pass `{name}` to it, or write a closure, `|t| ..`"
        ));
    }
    let fault = Fault::new(codes::UNKNOWN_NAME, format!("nothing is called `{name}`"));
    if defined.contains(&name) {
        return fault.help("it is defined further down, or in a block that has ended");
    }
    let after = offset(text, position).and_then(|at| text.get(at + name.len()..)).map_or("", str::trim_start);
    if after.starts_with(':') && !after.starts_with("::") {
        return fault.help(format!("a map of options begins with `#{{`: #{{ {name}: .. }}"));
    }
    if entries().any(|e| e.name == name && e.sort == super::vocabulary::Sort::Function) {
        return fault.help(format!("`{name}` is a function: write `{name}(..)`"));
    }
    let known = defined.into_iter().chain(UNITS.iter().map(|u| u.name)).chain(KEYWORDS);
    let known: Vec<&str> = known.collect();
    match crate::diagnostics::suggest(name, known.iter().copied()) {
        Some(near) => fault.help(format!("did you mean `{near}`?")),
        None => fault.help(format!("define it above: let {name} = ..;")),
    }
}

/// Names that `let`, `const` and `for` define anywhere in the text.
fn definitions(text: &str) -> impl Iterator<Item = &str> {
    let words: Vec<&str> =
        text.split(|c: char| !(c.is_alphanumeric() || c == '_')).filter(|w| !w.is_empty()).collect();
    let mut names: Vec<&str> = words
        .windows(2)
        .filter(|pair| matches!(pair[0], "let" | "const" | "for"))
        .map(|pair| pair[1])
        .collect();
    names.dedup();
    names.into_iter()
}

/// Whether a position lies in the body of a `fn`.
fn inside_function(text: &str, position: Position) -> bool {
    let Some(line) = position.line() else { return false };
    let at = crate::diagnostics::Span::at(text, line, position.position().unwrap_or(0), Some(1)).start;
    super::spans::function_bodies(text).iter().any(|body| body.start <= at && at < body.end)
}

fn assigned_to_call() -> Fault {
    Fault::new(codes::ASSIGNED_TO_CALL, "the result of a call cannot be assigned to")
        .help("a layer is edited by its name in brackets: cell[\"window\"].thickness = 5.nm;")
}

/// A call in a form that does not exist; nothing if that only follows from an unknown value.
fn not_found(signature: &str) -> Option<Fault> {
    let (name, arguments) = match signature.split_once('(') {
        Some((name, rest)) => (name.trim(), rest.trim_end().trim_end_matches(')')),
        None => (signature.trim(), ""),
    };
    let kinds: Vec<&str> =
        arguments.split(',').map(str::trim).filter(|k| !k.is_empty()).map(kind_name).collect();
    if kinds.contains(&"unknown value") {
        return None;
    }
    if matches!(name, "sleep" | "timestamp" | "eval") {
        return Some(closed_function(name));
    }
    let absent = kinds.contains(&"`()`");
    let operator = !name.chars().any(|c| c.is_alphanumeric() || c == '_');
    if operator && absent {
        return Some(
            Fault::new(codes::ABSENT_FIGURE, format!("`{name}` with a value that does not exist, `()`"))
                .help("a figure of merit that does not exist is `()`, and `.reason(\"voc\")` of the result says why; compare with `()` first"),
        );
    }
    if operator {
        let words = kinds.iter().map(|k| with_article(k)).collect::<Vec<_>>().join(" and ");
        let fault = Fault::new(codes::WRONG_KIND, format!("`{name}` has no meaning for {words}"));
        return Some(match name {
            ".." | "..=" => {
                fault.help("a range counts whole numbers, `0..5`; quantities: linear(20.nm, 100.nm, 5)")
            }
            _ => fault,
        });
    }
    if name == "layer" && kinds.first() == Some(&"stack") {
        return Some(
            Fault::new(codes::UNKNOWN_FUNCTION, "a stack has no function `layer`")
                .help("a layer is found by its name in brackets: cell[\"window\"].thickness = 5.nm;"),
        );
    }
    let forms: Vec<&str> = callable(name).flat_map(|e| e.forms.iter().copied()).collect();
    if forms.is_empty() {
        let fault = Fault::new(codes::UNKNOWN_FUNCTION, format!("no function is called `{name}`"));
        let known = entries().filter(|e| !matches!(e.sort, super::vocabulary::Sort::Constant));
        let names: Vec<&str> = PLAIN_WORDS.into_iter().chain(known.map(|e| e.name)).collect();
        return Some(match crate::diagnostics::suggest(name, names.iter().copied()) {
            Some(near) => {
                let form = callable(near).next().map_or(near, |e| e.forms[0]);
                fault.help(format!("did you mean `{form}`?"))
            }
            None => fault,
        });
    }
    let given = match kinds.len() {
        0 => "without arguments".to_string(),
        _ => format!("with {}", kinds.iter().map(|k| with_article(k)).collect::<Vec<_>>().join(", ")),
    };
    Some(
        Fault::new(codes::WRONG_ARGUMENTS, format!("`{name}` is called {given}, a form it does not have"))
            .help(format!("its forms: {}", forms.join("; "))),
    )
}

/// An access by a point that leads nowhere.
fn dotted(message: &str) -> Option<Fault> {
    // the engine gives only a sentence; the quoted words in it are the property and the kind of value
    let quoted: Vec<&str> = message.split('\'').skip(1).step_by(2).collect();
    let property = quoted.first().copied().unwrap_or_default();
    let kind = quoted.get(1).map_or("value", |k| kind_name(k));
    match kind {
        "unknown value" => None,
        "`()`" => Some(
            Fault::new(codes::ABSENT_FIGURE, format!("`.{property}` of a value that does not exist, `()`"))
                .help("a figure of merit that does not exist is `()`, and `.reason(\"voc\")` of the result says why; compare with `()` first"),
        ),
        "whole number" | "number" | "quantity" => Some(
            super::quantity::unknown_unit(property).label("neither a unit nor a property of a number"),
        ),
        kind => {
            let names: Vec<&str> = entries().filter(|e| e.owner == kind).map(|e| e.name).collect();
            let fault =
                Fault::new(codes::UNKNOWN_PROPERTY, format!("{} has no property `{property}`", with_article(kind)));
            if kind == "contact" {
                return Some(
                    fault.help("give the stack a new one: cell.front = ohmic(#{ recombination_velocity: 1e6.cm_per_s });"),
                );
            }
            Some(if names.is_empty() { fault } else { fault.candidates(property, names.iter().copied()) })
        }
    }
}

fn indexing(kind: &str) -> Option<Fault> {
    let name = kind_name(kind.split([' ', '[']).next().unwrap_or(kind));
    if kind.contains("unknown") {
        return None;
    }
    Some(Fault::new(codes::WRONG_KIND, format!("{} has no entries in brackets of that kind", with_article(name)))
        .help("arrays take whole numbers, `points[0]`, maps and stacks texts, `cell[\"window\"]`; `to_int(x)` makes a number whole"))
}

fn mismatch(wanted: &str, found: &str) -> Option<Fault> {
    let (wanted, found) = (kind_name(wanted), kind_name(found));
    if wanted == "unknown value" || found == "unknown value" {
        return None;
    }
    if found == "`()`" {
        return Some(Fault::new(
            codes::ABSENT_FIGURE,
            format!("{} is wanted, and there is nothing, `()`", with_article(wanted)),
        ));
    }
    Some(
        Fault::new(
            codes::WRONG_KIND,
            format!("{} is wanted here, not {}", with_article(wanted), with_article(found)),
        )
        .help("`to_int(x)` makes a number whole, `.to(\"unit\")` makes a quantity a number"),
    )
}

/// What a script threw, for a person.
fn thrown(value: &Dynamic) -> String {
    if let Some(q) = value.read_lock::<Quantity>() {
        return q.to_string();
    }
    if value.is_unit() {
        return "the script stopped itself".to_string();
    }
    match value.clone().into_string() {
        Ok(text) => text,
        Err(_) => format!("the script stopped itself with {}", super::value::described(value)),
    }
}

fn too_many_operations(session: &Session) -> Fault {
    let limits = &session.options.limits;
    let message = if super::point::inside() {
        format!("the point did more than {} operations", limits.point_operations)
    } else {
        format!("the script did more than {} operations", limits.operations)
    };
    Fault::new(codes::TOO_MANY_OPERATIONS, message).label("stopped here")
}
