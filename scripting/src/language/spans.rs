//! From a position and a place in words to a range of the script: Rhai knows where a call begins, not where its arguments are.

use crate::diagnostics::Span;

use super::fault::Place;

/// The range that `place` means for the call, operator or property at a line and column (both from 1).
///
/// What cannot be found in the text (an option map built elsewhere, say) falls back to the widest place that can.
pub fn locate(text: &str, line: usize, column: usize, place: &Place) -> Span {
    let name = Span::at(text, line, column, None);
    match place {
        Place::Call => name,
        Place::Elsewhere(line, column, inner) => locate(text, *line, *column, inner),
        Place::Argument(index) => arguments(text, name)
            .and_then(|list| list.get(*index).copied())
            .or_else(|| (*index == 0).then(|| assigned(text, name)).flatten())
            .unwrap_or(name),
        Place::Key(key) => option(text, name, key).map_or(name, |(key, _)| key),
        Place::Option(key) => option(text, name, key).map_or(name, |(_, value)| value),
    }
}

/// The ranges of the arguments of the call whose name has this range.
fn arguments(text: &str, name: Span) -> Option<Vec<Span>> {
    let open = skip_blank(text, name.end);
    if text.as_bytes().get(open) != Some(&b'(') {
        return None;
    }
    Some(split(text, open))
}

/// The range of the value assigned to the property or variable whose name has this range.
fn assigned(text: &str, name: Span) -> Option<Span> {
    let bytes = text.as_bytes();
    let mut at = skip_blank(text, name.end);
    while bytes.get(at) == Some(&b'[') {
        at = skip_blank(text, close(text, at)?);
    }
    // `=`, or an operator with `=` after it
    while matches!(bytes.get(at), Some(b'+' | b'-' | b'*' | b'/' | b'%')) {
        at += 1;
    }
    if bytes.get(at) != Some(&b'=') || bytes.get(at + 1) == Some(&b'=') {
        return None;
    }
    let start = skip_blank(text, at + 1);
    let mut end = start;
    while end < bytes.len() && !matches!(bytes[end], b';' | b'}' | b')') {
        end = step(text, end);
    }
    Some(trimmed(text, start, end.min(bytes.len())))
}

/// Ranges of the key and the value of an option in the arguments of the call.
fn option(text: &str, name: Span, key: &str) -> Option<(Span, Span)> {
    let mut areas = arguments(text, name).unwrap_or_default();
    areas.extend(assigned(text, name));
    for area in areas {
        let mut at = area.start;
        while at < area.end {
            // arguments may be calls and arrays that hold the map
            if text[at..].starts_with("#{") {
                for entry in split(text, at + 1) {
                    if let Some(found) = entry_of(text, entry, key) {
                        return Some(found);
                    }
                }
                at += 2;
            } else if matches!(text.as_bytes()[at], b'(' | b'[' | b'{') {
                at += 1;
            } else {
                at = step(text, at);
            }
        }
    }
    None
}

/// Key and value of the map entry in this range, if its key is this one.
fn entry_of(text: &str, entry: Span, key: &str) -> Option<(Span, Span)> {
    let words = &text[entry.start..entry.end];
    let quoted = format!("\"{key}\"");
    let spelled = if words.starts_with(&quoted) { quoted.as_str() } else { key };
    let rest = words.strip_prefix(spelled)?;
    let value = rest.trim_start().strip_prefix(':')?.trim_start();
    let start = entry.end - value.len();
    Some((Span::new(entry.start, entry.start + spelled.len()), trimmed(text, start, entry.end)))
}

/// The first call of a method of this name whose arguments use the variable that its chain of calls begins with: the range of
/// the name, and the variable.
pub fn call_on_own_variable<'a>(text: &'a str, method: &str) -> Option<(Span, &'a str)> {
    for (at, _) in text.match_indices(&format!(".{method}(")) {
        let name = Span::new(at + 1, at + 1 + method.len());
        let variable = word_at(text, chain_start(text, at));
        let end = close(text, name.end).unwrap_or(text.len());
        let mut inside = name.end;
        while !variable.is_empty() && inside < end {
            let word = word_at(text, inside);
            if word == variable && !text[..inside].ends_with('.') {
                return Some((name, variable));
            }
            inside += word.len().max(text[inside..].chars().next().map_or(1, char::len_utf8));
        }
    }
    None
}

/// Where the chain of calls and properties begins that goes on with the point at this place.
fn chain_start(text: &str, point: usize) -> usize {
    let (mut start, mut depth) = (point, 0_i32);
    for (at, letter) in text[..point].char_indices().rev() {
        match letter {
            ')' | ']' => depth += 1,
            '(' | '[' if depth > 0 => depth -= 1,
            _ if depth > 0 || letter.is_alphanumeric() || matches!(letter, '_' | '.') => {}
            _ => break,
        }
        start = at;
    }
    start
}

/// The ranges of the bodies of the functions that `fn` defines.
pub fn function_bodies(text: &str) -> Vec<Span> {
    let bytes = text.as_bytes();
    let mut bodies = Vec::new();
    let mut at = 0;
    let mut previous = b' ';
    while at < bytes.len() {
        let word_start = !(previous.is_ascii_alphanumeric() || previous == b'_');
        if word_start && text[at..].starts_with("fn ") {
            let mut open = at + 3;
            while open < bytes.len() && bytes[open] != b'{' {
                open = step(text, open);
            }
            if open < bytes.len() {
                let end = close(text, open).unwrap_or(text.len());
                bodies.push(Span::new(open, end));
                at = end;
                previous = b' ';
                continue;
            }
        }
        previous = bytes[at];
        at = if matches!(bytes[at], b'(' | b'[' | b'{') { at + 1 } else { step(text, at).max(at + 1) };
    }
    bodies
}

/// Names that the script binds where the engine does not ask: loop variables, arguments of functions and closures.
pub fn bindings(text: &str) -> Vec<(&str, Span)> {
    let mut found = Vec::new();
    let mut at = 0;
    let mut before = ';';
    while at < text.len() {
        let start = skip_blank(text, at);
        let rest = &text[start..];
        let Some(first) = rest.chars().next() else { break };
        if first.is_alphabetic() || first == '_' {
            let word = word_at(text, start);
            let end = start + word.len();
            match word {
                "for" => {
                    let until = text[end..].find(" in ").map_or(end, |i| end + i);
                    names_between(text, end, until, &mut found);
                }
                "fn" => {
                    let open = text[end..].find('(').map_or(end, |i| end + i);
                    let until = text[open..].find(')').map_or(open, |i| open + i);
                    names_between(text, open, until, &mut found);
                }
                _ => {}
            }
            before = 'a';
            at = end;
        } else if rest.starts_with("||") {
            // "or" between two values, or the empty list of a closure's arguments: neither binds a name
            before = ';';
            at = start + 2;
        } else if first == '|' && !(before.is_alphanumeric() || matches!(before, ')' | ']' | '}' | '"')) {
            let until = text[start + 1..].find('|').map_or(text.len(), |i| start + 1 + i);
            names_between(text, start + 1, until, &mut found);
            before = ';';
            at = (until + 1).min(text.len());
        } else if matches!(first, '"' | '`' | '\'') {
            before = '"';
            at = quoted(text, start).max(start + 1);
        } else {
            before = if first.is_ascii_digit() { 'a' } else { first };
            at = start + first.len_utf8();
        }
    }
    found
}

/// The word that begins at `at`.
fn word_at(text: &str, at: usize) -> &str {
    let rest = &text[at..];
    let end = rest.find(|c: char| !(c.is_alphanumeric() || c == '_')).unwrap_or(rest.len());
    &rest[..end]
}

/// All words of a range.
fn names_between<'a>(text: &'a str, start: usize, end: usize, found: &mut Vec<(&'a str, Span)>) {
    let mut at = start;
    while at < end {
        let word = word_at(text, at);
        if word.is_empty() {
            at += text[at..].chars().next().map_or(1, char::len_utf8);
        } else {
            found.push((word, Span::new(at, at + word.len())));
            at += word.len();
        }
    }
}

/// The comma-separated parts between the bracket at `open` and its partner.
fn split(text: &str, open: usize) -> Vec<Span> {
    let bytes = text.as_bytes();
    let mut parts = Vec::new();
    let mut start = skip_blank(text, open + 1);
    let mut at = start;
    // the arguments of a closure hold commas of their own
    if bytes.get(at) == Some(&b'|') {
        at = text[at + 1..].find('|').map_or(text.len(), |end| at + end + 2);
    }
    while at < bytes.len() {
        match bytes[at] {
            b')' | b']' | b'}' => break,
            b',' => {
                parts.push(trimmed(text, start, at));
                start = skip_blank(text, at + 1);
                at = start;
                if bytes.get(at) == Some(&b'|') {
                    at = text[at + 1..].find('|').map_or(text.len(), |end| at + end + 2);
                }
            }
            _ => at = step(text, at),
        }
    }
    let last = trimmed(text, start, at.min(text.len()));
    if last.start < last.end {
        parts.push(last);
    }
    parts
}

/// The place after the token, string, comment or bracketed part that begins at `at`.
fn step(text: &str, at: usize) -> usize {
    let bytes = text.as_bytes();
    match bytes[at] {
        b'"' | b'`' | b'\'' => quoted(text, at),
        b'(' | b'[' | b'{' => close(text, at).unwrap_or(text.len()),
        b'/' if text[at..].starts_with("//") || text[at..].starts_with("/*") => {
            skip_blank(text, at).max(at + 1)
        }
        _ => at + text[at..].chars().next().map_or(1, char::len_utf8),
    }
}

/// The place after the partner of the bracket at `open`.
fn close(text: &str, open: usize) -> Option<usize> {
    let mut at = open + 1;
    while at < text.len() {
        match text.as_bytes()[at] {
            b')' | b']' | b'}' => return Some(at + 1),
            _ => at = step(text, at),
        }
    }
    None
}

/// The place after the string that begins at `at`.
fn quoted(text: &str, at: usize) -> usize {
    let quote = text.as_bytes()[at];
    let mut i = at + 1;
    while i < text.len() {
        match text.as_bytes()[i] {
            b'\\' => i += 2,
            b'$' if quote == b'`' && text[i..].starts_with("${") => {
                i = close(text, i + 1).unwrap_or(text.len())
            }
            c if c == quote => return i + 1,
            _ => i += 1,
        }
    }
    text.len()
}

/// The first place from `at` on that is neither blank nor comment.
fn skip_blank(text: &str, mut at: usize) -> usize {
    loop {
        let Some(rest) = text.get(at..) else { return text.len() };
        let trimmed = rest.trim_start();
        at += rest.len() - trimmed.len();
        if trimmed.starts_with("//") {
            at += trimmed.find('\n').unwrap_or(trimmed.len());
        } else if trimmed.starts_with("/*") {
            at += trimmed.find("*/").map_or(trimmed.len(), |end| end + 2);
        } else {
            return at;
        }
    }
}

/// A range without blanks at its ends.
fn trimmed(text: &str, start: usize, end: usize) -> Span {
    let end = end.max(start);
    let words = text.get(start..end).unwrap_or_default();
    Span::new(start, start + words.trim_end().len())
}

#[cfg(test)]
mod tests {
    use super::*;

    fn found(text: &str, name: &str, place: Place) -> String {
        let start = text.find(name).expect("the name is in the text");
        let line = text[..start].matches('\n').count() + 1;
        let column = start - text[..start].rfind('\n').map_or(0, |at| at + 1) + 1;
        let span = locate(text, line, column, &place);
        text[span.start..span.end].to_string()
    }

    /// Source of truth: the text itself, read by eye.
    #[test]
    fn arguments_options_and_assigned_values_are_found() {
        let text = "let a = 1;\nlayer(\"emitter, front\", gaas /* a, b */, (t - 200).nm, donors(2e18.per_cm3, 3), #{ optics: \"inert\", gap: 1.eV })";
        assert_eq!(found(text, "layer", Place::Call), "layer");
        assert_eq!(found(text, "layer", Place::Argument(0)), "\"emitter, front\"");
        assert_eq!(found(text, "layer", Place::Argument(2)), "(t - 200).nm");
        assert_eq!(found(text, "layer", Place::Argument(3)), "donors(2e18.per_cm3, 3)");
        assert_eq!(found(text, "layer", Place::Option("optics".into())), "\"inert\"");
        assert_eq!(found(text, "layer", Place::Key("gap".into())), "gap");
        assert_eq!(found(text, "layer", Place::Option("gap".into())), "1.eV");
        assert_eq!(found(text, "layer", Place::Option("none".into())), "layer");
        assert_eq!(found(text, "layer", Place::Argument(9)), "layer");
        let set = "cell[\"window\"].thickness = (5 - 7).nm; next()";
        assert_eq!(found(set, "thickness", Place::Argument(0)), "(5 - 7).nm");
        let nested = "cell.front = ohmic(#{ \"recombination_velocity\": 1 });";
        assert_eq!(found(nested, "ohmic", Place::Option("recombination_velocity".into())), "1");
        let closures = "run(|a, b| a + b, `x ${f(1, \")\")} y`, 3)";
        assert_eq!(found(closures, "run", Place::Argument(0)), "|a, b| a + b");
        assert_eq!(found(closures, "run", Place::Argument(2)), "3");
    }

    /// Source of truth: the text itself: "or" binds nothing, closures with and without arguments bind theirs.
    #[test]
    fn only_bound_names_are_found() {
        let text = "let f = |a, b| a || b || x | y; let g = || z; for i in 0..3 { } t.filter(|r| r.x > 1.um || (r.y) || r.z < 2.nm)";
        let names: Vec<&str> = bindings(text).into_iter().map(|(name, _)| name).collect();
        assert_eq!(names, ["a", "b", "i", "r"]);
    }

    /// Source of truth: a torn script must not make the search read past its end.
    #[test]
    fn torn_text_is_survived() {
        for text in
            ["layer(", "layer(\"a", "layer(`${", "layer(#{ gap", "layer(/*", "x =", "layer(|a", "layer(\"\\"]
        {
            for place in [Place::Call, Place::Argument(0), Place::Option("gap".into())] {
                let span = locate(text, 1, 1, &place);
                assert!(text.get(span.start..span.end).is_some(), "{text} {place:?}");
            }
        }
    }
}
