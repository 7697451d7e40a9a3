//! Tests of diagnostics: places, looks, near names, the catalogue.

use super::*;

/// Source of truth: the example of a message in the project's house style, to the character.
#[test]
fn a_fault_shows_line_caret_and_help() {
    let text = "let gaas = material(\"GaAs\");\nlet t = 150;\n    layer(\"emitter\", gaas, (t - 200).nm, donors(2e18.per_cm3)),\n";
    let source = SourceText::new("cell.rhai", text);
    let fault =
        Diagnostic::new(codes::THICKNESS_NOT_POSITIVE, "thickness of layer `emitter` must be positive")
            .label(Span::at(text, 3, 28, Some(12)), "this is -50 nm")
            .help("leave the layer out of the stack when it is not there");
    let expected = "\
error[E210]: thickness of layer `emitter` must be positive
 --> cell.rhai:3:28
  |
3 |     layer(\"emitter\", gaas, (t - 200).nm, donors(2e18.per_cm3)),
  |                            ^^^^^^^^^^^^ this is -50 nm
  |
  = help: leave the layer out of the stack when it is not there
";
    assert_eq!(render(&fault, Some(&source), Look::plain()), expected);
}

/// Source of truth: counting characters by hand; no tolerance.
#[test]
fn places_count_characters_not_bytes() {
    let text = "// µm\r\nlet grüße = 30.nm + 2e-18.per_cm3;\n\"a \\\" b\" `x`";
    let at = |line, column, length| {
        let span = Span::at(text, line, column, length);
        &text[span.start..span.end]
    };
    assert_eq!(at(2, 5, None), "grüße");
    assert_eq!(at(2, 13, None), "30.nm");
    assert_eq!(at(2, 21, None), "2e-18.per_cm3");
    assert_eq!(at(2, 19, None), "+");
    assert_eq!(at(2, 5, Some(3)), "grü");
    assert_eq!(at(3, 1, None), "\"a \\\" b\"");
    assert_eq!(at(3, 10, None), "`x`");
    assert_eq!(at(1, 99, None), "", "beyond the line is its end, before the line feed");
    assert_eq!(at(99, 1, None), "", "beyond the text is its end");
    assert_eq!(SourceText::new("s", text).position(Span::at(text, 2, 13, None).start), (2, 13));
}

/// Source of truth: a place from anywhere must never break the rendering (totality).
#[test]
fn any_place_renders() {
    for text in ["", "x", "ü", "let a = \"ü\";\n\n\tb\r\n", "\u{1b}[31mred"] {
        let source = SourceText::new("s.rhai", text);
        for start in 0..text.len() + 3 {
            for end in 0..text.len() + 3 {
                let fault = Diagnostic::new(codes::SYNTAX, "m")
                    .label(Span { start, end }, "here")
                    .label(Span::new(0, start), "");
                let drawn = render(&fault, Some(&source), Look { colour: false, width: 40 });
                assert!(drawn.starts_with("error[E100]: m\n --> s.rhai:"), "{drawn}");
                assert!(!drawn.contains('\u{1b}'), "control characters are shown, not sent");
            }
        }
        for (line, column) in [(0, 0), (1, 0), (2, 0), (3, 7), (usize::MAX, usize::MAX)] {
            let span = Span::at(text, line, column, None);
            assert!(span.start <= span.end && span.end <= text.len());
        }
    }
}

/// Source of truth: the statement that foreign text never reaches the terminal raw.
#[test]
fn control_characters_of_messages_are_written_out() {
    let fault =
        Diagnostic::new(codes::UNKNOWN_SNAPSHOT, "no snapshot `\u{1b}[2J`").note("a\u{7}b").help("c\rd");
    let drawn = render(&fault, Some(&SourceText::new("\u{1b}name", "")), Look::plain());
    assert!(drawn.chars().all(|c| c == '\n' || !c.is_control()), "{drawn:?}");
    assert!(render(&fault, None, Look { colour: true, width: 80 }).contains("\u{1b}["), "colours on request");
}

/// Source of truth: slips that people make, and words that must not be proposed for one another.
#[test]
fn near_names_are_proposed_and_far_ones_not() {
    let options = ["recombination_velocity", "electron_lifetime", "hole_lifetime", "x", "gap"];
    assert_eq!(suggest("recombination_velocty", options), Some("recombination_velocity"));
    assert_eq!(suggest("hole_lifetmie", options), Some("hole_lifetime"));
    assert_eq!(suggest("lifetime", options), Some("electron_lifetime"), "a part of a longer name");
    assert_eq!(suggest("Gap", options), Some("gap"));
    assert_eq!(suggest("permittivity", options), None);
    assert_eq!(suggest("y", options), None, "one letter is not near another");
    assert_eq!(suggest("gap", ["gap"]), None, "the name itself is no mend");
}

/// Source of truth: the catalogue's own promise: codes unique, in their family, each with a page that helps.
#[test]
fn every_code_has_a_page() {
    let mut seen = std::collections::BTreeSet::new();
    for entry in entries() {
        let code = entry.code.as_str();
        assert!(seen.insert(code), "{code} stands twice");
        let (family, digits) = code.split_at(1);
        assert!(
            ["E", "W"].contains(&family) && digits.len() == 3 && digits.bytes().all(|b| b.is_ascii_digit()),
            "{code}"
        );
        assert!(entry.explanation.len() > 60 && entry.explanation.ends_with('.'), "{code} is not explained");
        assert!(!entry.title.is_empty() && !entry.title.ends_with('.'), "{code}: a title is a phrase");
        assert!(!entry.example.is_empty(), "{code} has no example");
        assert_eq!(Code::find(&code.to_lowercase()), Some(entry.code));
        let drawn = render(&Diagnostic::new(entry.code, entry.title), None, Look::plain());
        let word = if family == "W" { "warning" } else { "error" };
        assert_eq!(drawn, format!("{word}[{code}]: {}\n", entry.title));
    }
    assert!(explain("E210").is_some_and(|entry| entry.code == codes::THICKNESS_NOT_POSITIVE));
    assert!(explain("E999").is_none());
}
