//! A script in colours: its text cut into words with a class each. Nothing of the text is lost or added.

/// Words that steer a script.
const KEYWORDS: [&str; 36] = [
    "as",
    "break",
    "case",
    "catch",
    "const",
    "continue",
    "default",
    "do",
    "else",
    "export",
    "false",
    "fn",
    "for",
    "global",
    "if",
    "import",
    "in",
    "is_def_fn",
    "is_def_var",
    "is_shared",
    "let",
    "loop",
    "private",
    "return",
    "switch",
    "this",
    "throw",
    "true",
    "try",
    "until",
    "while",
    "Fn",
    "call",
    "curry",
    "type_of",
    "with",
];

/// What a piece of a script is.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Class {
    /// White space, names, signs.
    Plain,
    /// A comment.
    Comment,
    /// A text.
    Text,
    /// A number.
    Number,
    /// The unit behind a number.
    Unit,
    /// A word that steers.
    Keyword,
    /// The name of a function where it is called.
    Call,
    /// A property.
    Property,
}

impl Class {
    /// Name of the style on the page; none for plain text.
    pub fn style(self) -> Option<&'static str> {
        match self {
            Class::Plain => None,
            Class::Comment => Some("c"),
            Class::Text => Some("t"),
            Class::Number => Some("n"),
            Class::Unit => Some("u"),
            Class::Keyword => Some("k"),
            Class::Call => Some("f"),
            Class::Property => Some("p"),
        }
    }
}

/// The pieces of a script, in order; put together they are its text.
pub fn pieces(script: &str) -> Vec<(Class, &str)> {
    let mut pieces: Vec<(Class, &str)> = Vec::new();
    let mut at = 0;
    while at < script.len() {
        let rest = &script[at..];
        let (class, length) = next(rest, &pieces);
        // at least one letter, so that the loop ends
        let length = length.max(rest.chars().next().map_or(1, char::len_utf8));
        match pieces.last_mut() {
            Some((Class::Plain, text)) if class == Class::Plain => {
                *text = &script[at - text.len()..at + length];
            }
            _ => pieces.push((class, &rest[..length])),
        }
        at += length;
    }
    pieces
}

/// Class and length in bytes of the piece at the beginning of `rest`.
fn next(rest: &str, before: &[(Class, &str)]) -> (Class, usize) {
    if rest.starts_with("//") {
        return (Class::Comment, rest.find('\n').unwrap_or(rest.len()));
    }
    if rest.starts_with("/*") {
        return (Class::Comment, block_comment(rest));
    }
    let first = rest.chars().next().unwrap_or(' ');
    match first {
        '"' => return (Class::Text, quoted(rest, '"')),
        '`' => return (Class::Text, quoted(rest, '`')),
        '\'' => return (Class::Text, quoted(rest, '\'')),
        _ => {}
    }
    let after_point = before
        .last()
        .is_some_and(|(class, text)| *class == Class::Plain && text.ends_with('.') && !text.ends_with(".."));
    let after_number = matches!(before, [.., (Class::Number, _), (Class::Plain, ".")]);
    if first.is_ascii_digit() {
        return (Class::Number, number(rest));
    }
    if first == '_' || first.is_alphabetic() {
        let length = rest.find(|c: char| c != '_' && !c.is_alphanumeric()).unwrap_or(rest.len());
        let (word, behind) = rest.split_at(length);
        let called = behind.trim_start_matches([' ', '\t']).starts_with('(');
        let class = match () {
            () if after_number => Class::Unit,
            () if after_point && called => Class::Call,
            () if after_point => Class::Property,
            () if KEYWORDS.contains(&word) => Class::Keyword,
            () if called => Class::Call,
            () => Class::Plain,
        };
        return (class, length);
    }
    (Class::Plain, first.len_utf8())
}

/// Length of a block comment, comments inside it included; the rest where it is not closed.
fn block_comment(text: &str) -> usize {
    let mut depth = 0_usize;
    let mut at = 0;
    while let Some(rest) = text.get(at..).filter(|rest| !rest.is_empty()) {
        if rest.starts_with("/*") {
            depth += 1;
            at += 2;
        } else if rest.starts_with("*/") {
            depth -= 1;
            at += 2;
            if depth == 0 {
                return at;
            }
        } else {
            at += rest.chars().next().map_or(1, char::len_utf8);
        }
    }
    text.len()
}

/// Length of a text in quotes; in back quotes `${ }` may hold quotes of its own. The rest where it is not closed.
fn quoted(text: &str, quote: char) -> usize {
    let mut at = 1;
    let mut depth = 0_usize;
    let mut letters = text[1..].char_indices().peekable();
    while let Some((index, letter)) = letters.next() {
        at = 1 + index + letter.len_utf8();
        match letter {
            '\\' if quote != '`' => {
                letters.next();
            }
            '$' if quote == '`' && depth == 0 && letters.peek().is_some_and(|(_, next)| *next == '{') => {
                letters.next();
                depth = 1;
            }
            '{' if depth > 0 => depth += 1,
            '}' if depth > 0 => depth -= 1,
            _ if letter == quote && depth == 0 => return at,
            '\n' if quote != '`' => return at - 1,
            _ => {}
        }
    }
    at.max(text.len())
}

/// Length of a number; the point of `30.nm` is not part of it.
fn number(text: &str) -> usize {
    let bytes = text.as_bytes();
    let digits = |mut at: usize| {
        while bytes.get(at).is_some_and(|b| b.is_ascii_digit() || *b == b'_') {
            at += 1;
        }
        at
    };
    if let [b'0', b'x' | b'X' | b'b' | b'B' | b'o' | b'O', ..] = bytes {
        return 2 + text[2..].find(|c: char| !c.is_ascii_hexdigit() && c != '_').unwrap_or(text.len() - 2);
    }
    let mut at = digits(0);
    if bytes.get(at) == Some(&b'.') && bytes.get(at + 1).is_some_and(u8::is_ascii_digit) {
        at = digits(at + 1);
    }
    if bytes.get(at).is_some_and(|b| matches!(b, b'e' | b'E')) {
        let sign = usize::from(bytes.get(at + 1).is_some_and(|b| matches!(b, b'+' | b'-')));
        if bytes.get(at + 1 + sign).is_some_and(u8::is_ascii_digit) {
            at = digits(at + 1 + sign);
        }
    }
    at
}

#[cfg(test)]
mod tests {
    use super::*;

    fn shown(script: &str) -> Vec<(Class, &str)> {
        pieces(script).into_iter().filter(|(class, _)| *class != Class::Plain).collect()
    }

    /// Source of truth: the words of the language, read by hand.
    #[test]
    fn words_are_told_apart() {
        let script = "let a = layer(\"b\", m, 30.nm, donors(2e17.per_cm3)); // why\na.front = `x ${f(\"`\")} y`; 1.5e-3; t.mpp.voltage /* a /* b */ c */";
        let expected = [
            (Class::Keyword, "let"),
            (Class::Call, "layer"),
            (Class::Text, "\"b\""),
            (Class::Number, "30"),
            (Class::Unit, "nm"),
            (Class::Call, "donors"),
            (Class::Number, "2e17"),
            (Class::Unit, "per_cm3"),
            (Class::Comment, "// why"),
            (Class::Property, "front"),
            (Class::Text, "`x ${f(\"`\")} y`"),
            (Class::Number, "1.5e-3"),
            (Class::Property, "mpp"),
            (Class::Property, "voltage"),
            (Class::Comment, "/* a /* b */ c */"),
        ];
        assert_eq!(shown(script), expected);
    }

    /// Source of truth: the text itself, which must come back whole, however it breaks off.
    #[test]
    fn no_letter_is_lost() {
        let script = "/* a */ let s = \"é\\\"\u{202e}\"; `${ {1} } ´` x.y().z 0x1f 1..3 'c' \"open\nnext `";
        for end in (0..=script.len()).filter(|end| script.is_char_boundary(*end)) {
            let text: String = pieces(&script[..end]).into_iter().map(|(_, piece)| piece).collect();
            assert_eq!(text, &script[..end]);
        }
    }
}
