//! Defects of a layer.

use epiloom_solver::device::{Defect, DefectKind, Edge, Profile, Spread};
use rhai::Dynamic;

use crate::diagnostics::codes;
use crate::language::device_value::{DefectValue, ProfileValue};
use crate::language::dimension::Dimension;
use crate::language::fault::{Fault, Faults, Place};
use crate::language::quantity::Quantity;
use crate::language::value::{Options, array, quantity, take, text};
use crate::language::vocabulary::{Answer, OptionRow, function, topic};

topic! {
    "Defects",
    "A layer takes any number of defects besides the level that its lifetimes stand for: `#{ defects: [defect(..), ..] }`. Each \
     recombines by Shockley, Read and Hall, is filled as far as the carriers of both bands make it, and its charge bends the \
     bands. The ledger has a line for each.";

    Function "defect" {
        forms: ["defect(\"name\", #{ options })"],
        doc: "States in the gap: sharp, spread normally about an energy, or in a tail that falls off from it into the gap. Carriers \
              are captured with cross-section times thermal velocity, sqrt(8 kT / pi m) of the mass of the density of states. A donor is \
              positive when empty, an acceptor negative when filled; of neutral ones the charge is not counted.",
        options: &[
            OptionRow { key: "kind", takes: "a text: \"donor\", \"acceptor\" or \"neutral\"", doc: "What charge the states carry." },
            OptionRow { key: "density", takes: "a density, or `graded(..)`", doc: "Density of all the states together." },
            OptionRow { key: "below_conduction_band", takes: "an energy", doc: "Depth of the level below the conduction-band edge; of a distribution its middle, of a tail its beginning." },
            OptionRow { key: "above_valence_band", takes: "an energy", doc: "Height of the level above the valence-band edge, instead of `below_conduction_band`." },
            OptionRow { key: "distribution", takes: "a text: \"level\", \"gaussian\" or \"exponential\"", doc: "Spread in energy; \"level\" unless given." },
            OptionRow { key: "width", takes: "an energy", doc: "Standard deviation of a Gaussian distribution; energy over which a tail falls by e, away from the band edge." },
            OptionRow { key: "electron_cross_section", takes: "an area", doc: "Cross-section for the capture of electrons." },
            OptionRow { key: "hole_cross_section", takes: "an area", doc: "Cross-section for the capture of holes." },
        ],
        example: "let trap = defect(\"EL2\", #{ kind: \"donor\", density: 1e15.per_cm3, below_conduction_band: 0.75.eV,\n    electron_cross_section: 1e-16.cm2, hole_cross_section: 2e-18.cm2 });\nlet base = layer(\"base\", material(\"GaAs\"), 3.um, acceptors(1e17.per_cm3), #{ defects: [trap] });",
        register: |engine, session| {
            engine.register_type_with_name::<DefectValue>("defect");
            function(engine, session, "defect", 2..=2, |_, arguments| build(arguments));
        },
    }
}

const KEYS: [&str; 8] = [
    "kind",
    "density",
    "below_conduction_band",
    "above_valence_band",
    "distribution",
    "width",
    "electron_cross_section",
    "hole_cross_section",
];

/// The defects of an option or a property.
pub fn defects(value: &Dynamic) -> Result<Vec<Defect<Quantity>>, Fault> {
    let list = array(value, "`defects`")?;
    list.iter()
        .map(|each| {
            take::<DefectValue>(each, "an entry of `defects`", "a defect, such as defect(\"EL2\", #{ .. })")
        })
        .map(|each| each.map(|value| value.0))
        .collect()
}

/// One of these words out of an option; `None` where it is absent.
fn word<T: Copy>(options: &Options, key: &str, words: &[(&'static str, T)]) -> Result<Option<T>, Fault> {
    let at = |fault: Fault| fault.at(Place::Option(key.to_string()));
    let Some(value) = options.get(key) else { return Ok(None) };
    let given = text(value, &format!("`{key}`")).map_err(at)?;
    let found = words.iter().find(|(word, _)| *word == given).map(|(_, found)| *found);
    let known = words.iter().map(|(word, _)| *word);
    found.map(Some).ok_or_else(|| {
        at(Fault::new(codes::WRONG_CHOICE, format!("`{key}` cannot be \"{given}\""))
            .candidates(&given, known))
    })
}

fn build(arguments: &mut [&mut Dynamic]) -> Answer {
    let name = text(arguments[0], "the name of a defect").map_err(|f| f.at(Place::Argument(0)))?;
    let options = Options::new(arguments[1], "`defect`", KEYS).map_err(Faults)?;
    let lacks = |what: &str| {
        Fault::new(codes::DEFECT, format!("defect `{name}` needs {what}")).at(Place::Argument(1))
    };
    let of = |key: &str| format!("`{key}` of defect `{name}`");
    let number = |key: &str, dimension| options.quantity(key, &of(key), dimension);
    let kinds =
        [("donor", DefectKind::Donor), ("acceptor", DefectKind::Acceptor), ("neutral", DefectKind::Neutral)];
    let kind = word(&options, "kind", &kinds)?
        .ok_or_else(|| lacks("its `kind`: \"donor\", \"acceptor\" or \"neutral\""))?;
    let density = match options.get("density") {
        None => return Err(lacks("its `density`").into()),
        Some(given) => match given.read_lock::<ProfileValue>() {
            Some(profile) => densities(&profile.0, &name)?,
            None => Profile::Constant(
                quantity(given, &of("density"), Dimension::DENSITY)
                    .map_err(|f| f.at(Place::Option("density".to_string())))?,
            ),
        },
    };
    let below = number("below_conduction_band", Dimension::ENERGY)?;
    let above = number("above_valence_band", Dimension::ENERGY)?;
    let (edge, energy) = match (below, above) {
        (Some(below), None) => (Edge::Conduction, below),
        (None, Some(above)) => (Edge::Valence, above),
        (Some(_), Some(_)) => {
            return Err(Fault::new(codes::DEFECT, format!("defect `{name}` has its energy twice"))
                .help("give below_conduction_band or above_valence_band")
                .at(Place::Key("above_valence_band".to_string()))
                .into());
        }
        (None, None) => {
            return Err(lacks("its energy: `below_conduction_band` or `above_valence_band`").into());
        }
    };
    let distributions = [("level", 0), ("gaussian", 1), ("exponential", 2)];
    let distribution = word(&options, "distribution", &distributions)?.unwrap_or(0);
    let width = number("width", Dimension::ENERGY)?;
    let spread = match (distribution, width) {
        (0, None) => Spread::Level,
        (0, Some(_)) => {
            return Err(Fault::new(
                codes::DEFECT,
                format!("defect `{name}` is a sharp level and has no `width`"),
            )
            .help("give distribution: \"gaussian\" or \"exponential\" with it")
            .at(Place::Key("width".to_string()))
            .into());
        }
        (_, None) => return Err(lacks("the `width` of its distribution").into()),
        (1, Some(width)) => Spread::Gaussian(width),
        (_, Some(width)) => Spread::Exponential(width),
    };
    let area = |key: &str| {
        number(key, Dimension::AREA)?.ok_or_else(|| lacks(&format!("its `{key}`, an area such as 1e-15.cm2")))
    };
    Ok(Dynamic::from(DefectValue(Defect {
        kind,
        edge,
        energy,
        spread,
        density,
        electron_cross_section: area("electron_cross_section")?,
        hole_cross_section: area("hole_cross_section")?,
        name,
    })))
}

/// A profile whose values are densities.
fn densities(profile: &Profile<Quantity>, name: &str) -> Result<Profile<Quantity>, Fault> {
    let values: Vec<&Quantity> = match profile {
        Profile::Constant(value) => vec![value],
        Profile::Linear { front, rear } | Profile::Exponential { front, rear } => vec![front, rear],
        Profile::Erfc { surface, background, .. } => vec![surface, background],
        Profile::Table { values, .. } => values.iter().collect(),
    };
    if values.iter().all(|value| value.dimension == Dimension::DENSITY) {
        return Ok(profile.clone());
    }
    Err(Fault::new(codes::WRONG_DIMENSION, format!("the profile of defect `{name}` must be of densities"))
        .at(Place::Option("density".to_string())))
}

/// A defect in words: "donor, 1e15 cm^-3, 0.75 eV below the conduction band, ..".
pub fn defect_words(defect: &Defect<Quantity>, density: &str) -> String {
    let kind = match defect.kind {
        DefectKind::Donor => "donor",
        DefectKind::Acceptor => "acceptor",
        DefectKind::Neutral => "neutral",
    };
    let edge = match defect.edge {
        Edge::Conduction => "below the conduction band",
        Edge::Valence => "above the valence band",
    };
    let spread = match &defect.spread {
        Spread::Level => String::new(),
        Spread::Gaussian(width) => format!(", gaussian of width {width}"),
        Spread::Exponential(width) => format!(", exponential of width {width}"),
    };
    format!(
        "{kind}, {density}, {} {edge}{spread}, cross-sections {} for electrons, {} for holes",
        defect.energy, defect.electron_cross_section, defect.hole_cross_section
    )
}
