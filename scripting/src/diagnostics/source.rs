//! A script's text, and places in it as byte ranges.

/// A script: its name as shown to a person, and its text.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct SourceText {
    /// File name as a person gave it.
    pub name: String,
    /// The text.
    pub text: String,
}

impl SourceText {
    /// A script of this name and text.
    pub fn new(name: impl Into<String>, text: impl Into<String>) -> Self {
        SourceText { name: name.into(), text: text.into() }
    }

    /// Line and character column, both from 1, of a byte offset; an offset past the end gives the end.
    pub fn position(&self, offset: usize) -> (usize, usize) {
        let before = &self.text[..snap(&self.text, offset)];
        let line_start = before.rfind('\n').map_or(0, |at| at + 1);
        (before.matches('\n').count() + 1, before[line_start..].chars().count() + 1)
    }
}

/// A range of bytes in a script, `start <= end`, on character boundaries.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub struct Span {
    /// First byte.
    pub start: usize,
    /// One past the last byte.
    pub end: usize,
}

impl Span {
    /// The range `start..end`.
    pub fn new(start: usize, end: usize) -> Self {
        Span { start, end: end.max(start) }
    }

    /// The place at a line and character column (both from 1), `length` characters long or, without one, the token there.
    ///
    /// A column of 0 is the first character that is not blank; a line beyond the text is its end.
    pub fn at(text: &str, line: usize, column: usize, length: Option<usize>) -> Self {
        let start = offset(text, line, column);
        let rest = line_from(text, start);
        let bytes = match length {
            Some(characters) => rest.chars().take(characters.max(1)).map(char::len_utf8).sum(),
            None => token_length(rest),
        };
        Span { start, end: start + bytes }
    }

    /// The same range made to fit `text`: inside it and on character boundaries.
    pub fn within(self, text: &str) -> Self {
        let start = snap(text, self.start);
        Span { start, end: snap(text, self.end).max(start) }
    }
}

/// `offset` brought into `text` and back to the boundary of a character.
fn snap(text: &str, offset: usize) -> usize {
    let mut at = offset.min(text.len());
    while !text.is_char_boundary(at) {
        at -= 1;
    }
    at
}

/// Byte offset of a line and character column, both from 1.
fn offset(text: &str, line: usize, column: usize) -> usize {
    let mut start = 0;
    for _ in 1..line.max(1) {
        match text[start..].find('\n') {
            Some(at) => start += at + 1,
            None => return text.len(),
        }
    }
    let rest = line_from(text, start);
    let characters = match column {
        0 => rest.chars().take_while(|c| c.is_whitespace()).count(),
        _ => column - 1,
    };
    start + rest.chars().take(characters).map(char::len_utf8).sum::<usize>()
}

/// What is left of the line from a byte offset, without its line end.
fn line_from(text: &str, start: usize) -> &str {
    let rest = text[start..].split('\n').next().unwrap_or_default();
    rest.strip_suffix('\r').unwrap_or(rest)
}

/// Bytes of the token that `rest` begins with: a name, a number with its unit, a string, or one character.
fn token_length(rest: &str) -> usize {
    let mut characters = rest.char_indices();
    let Some((_, first)) = characters.next() else { return 0 };
    let part_of_name = |c: char| c.is_alphanumeric() || c == '_';
    if first == '"' || first == '`' {
        let mut escaped = false;
        for (at, c) in characters {
            if !escaped && c == first {
                return at + c.len_utf8();
            }
            escaped = !escaped && c == '\\';
        }
        return rest.len();
    }
    if first.is_ascii_digit() {
        return number_length(rest);
    }
    if part_of_name(first) {
        return characters.find(|&(_, c)| !part_of_name(c)).map_or(rest.len(), |(at, _)| at);
    }
    first.len_utf8()
}

/// Bytes of the number that `rest` begins with, a unit read off it (`30.nm`, `2e-18.per_cm3`) included.
fn number_length(rest: &str) -> usize {
    let bytes = rest.as_bytes();
    let mut at = 0;
    while let Some(&byte) = bytes.get(at) {
        let next_is_word = bytes.get(at + 1).is_some_and(|b| b.is_ascii_alphanumeric() || *b == b'_');
        let exponent_sign = (byte == b'-' || byte == b'+')
            && at > 0
            && matches!(bytes[at - 1], b'e' | b'E')
            && bytes[..at - 1].iter().all(|b| b.is_ascii_digit() || matches!(b, b'.' | b'_'));
        let inside =
            byte.is_ascii_alphanumeric() || byte == b'_' || (byte == b'.' && next_is_word) || exponent_sign;
        if !inside {
            break;
        }
        at += 1;
    }
    at
}
