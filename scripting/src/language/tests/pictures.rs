//! Pictures from scripts: where they may go, and what is said of wrong wishes.

use super::*;
use crate::language::PictureRefused;

/// A sink that keeps pictures.
#[derive(Default)]
struct Album {
    pictures: Vec<(String, Vec<u8>)>,
}

impl Sink for Album {
    fn snapshot(&mut self, _: Snapshot) -> Result<(), String> {
        Ok(())
    }
    fn picture(&mut self, name: &str, bytes: &[u8]) -> Result<(), PictureRefused> {
        self.pictures.push((name.to_string(), bytes.to_vec()));
        Ok(())
    }
}

const BAR: &str = "let gaas = material(\"GaAs\", #{ electron_lifetime: 1.ns, hole_lifetime: 1.ns });\n\
    let bar = stack(\"bar\", [layer(\"n\", gaas, 100.nm, donors(1e18.per_cm3)), layer(\"p\", gaas, 1.um, acceptors(1e17.per_cm3))]);\n\
    let state = bar.equilibrium();\n";

/// Source of truth: the specification; a picture is handed over whole, named as asked, and none while checking.
#[test]
fn a_script_draws_what_it_solved() {
    let text = format!(
        "{BAR}picture(\"bands.svg\", state);\npicture(\"n.png\", state, #{{ chart: \"carriers\", width: 60.mm, y_range: [1, 1e20] }});\n\
         picture(\"t.pdf\", [#{{ a: 1, b: 2 }}, #{{ a: 2, b: 5 }}], #{{ x: \"a\", y: \"b\", chart: \"lines\" }});"
    );
    let mut album = Album::default();
    let outcome = run(&script(&text), RunOptions::default(), &mut album);
    assert!(outcome.errors.is_empty(), "{}", shown(&text, &outcome.errors));
    let names: Vec<&str> = album.pictures.iter().map(|(name, _)| name.as_str()).collect();
    assert_eq!(names, ["bands.svg", "n.png", "t.pdf"]);
    assert!(album.pictures[0].1.starts_with(b"<svg") && album.pictures[1].1.starts_with(b"\x89PNG"));
    let mut none = Album::default();
    run(&script(&text), RunOptions { check_only: true, ..RunOptions::default() }, &mut none);
    assert!(none.pictures.is_empty());
}

/// Source of truth: the rule that a picture lies below the output folder, and the specified codes.
#[test]
fn wrong_pictures_are_told_at_their_place() {
    for line in [
        "picture(\"../bands.svg\", state); // ~ E407",
        "picture(\"/tmp/bands.svg\", state); // ~ E407",
        "picture(\"a\\\\b.svg\", state); // ~ E407",
        "picture(\"bands.gif\", state); // ~ E416",
        "picture(\"bands\", state); // ~ E416",
        "picture(\"b.svg\", state, #{ chart: \"band\" }); // ~ E416",
        "picture(\"b.svg\", state, #{ chart: \"jv\" }); // ~ E416",
    ] {
        fails(&format!("{BAR}{line}"));
    }
    let near = fails(&format!("{BAR}picture(\"b.svg\", state, #{{ chart: \"band\" }}); // ~ E416"));
    assert!(near.help.as_deref().is_some_and(|help| help.contains("did you mean `bands`?")), "{near:?}");
}
