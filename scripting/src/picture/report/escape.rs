//! Text on its way into the page: whatever a script or an archive holds, it shows as itself and does nothing.

/// The text for the inside of an element or a quoted attribute.
///
/// Markup characters become references. Control characters, and those that turn the direction of the text around, are
/// written out as `\u{202e}`: a reader sees what is there.
pub fn escape(text: &str) -> String {
    let mut out = String::with_capacity(text.len() + 16);
    for letter in text.chars() {
        match letter {
            '&' => out.push_str("&amp;"),
            '<' => out.push_str("&lt;"),
            '>' => out.push_str("&gt;"),
            '"' => out.push_str("&quot;"),
            '\'' => out.push_str("&#39;"),
            '\n' | '\t' => out.push(letter),
            _ if hidden(letter) => out.extend(letter.escape_unicode()),
            _ => out.push(letter),
        }
    }
    out
}

/// Whether a character would be invisible or change how its neighbours show.
fn hidden(letter: char) -> bool {
    letter.is_control()
        || matches!(letter, '\u{200e}' | '\u{200f}' | '\u{202a}'..='\u{202e}' | '\u{2066}'..='\u{2069}')
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Source of truth: the references of the HTML standard, by hand.
    #[test]
    fn nothing_of_a_text_can_act() {
        assert_eq!(
            escape("<script>alert('x' & \"y\")</script>"),
            "&lt;script&gt;alert(&#39;x&#39; &amp; &quot;y&quot;)&lt;/script&gt;"
        );
        assert_eq!(escape("a\u{0}b\u{202e}c\r\n"), "a\\u{0}b\\u{202e}c\\u{d}\n");
        assert_eq!(escape("Å µ ² 漢"), "Å µ ² 漢");
    }
}
