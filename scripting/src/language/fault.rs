//! What can go wrong in a script, as it travels through the engine: a diagnostic whose place is still in words of the call.

use rhai::{Dynamic, EvalAltResult, Position};

use crate::diagnostics::{Code, suggest};

/// Which part of the calling expression is guilty; the span is found in the script text when the fault is reported.
#[derive(Clone, Debug, PartialEq)]
pub enum Place {
    /// The name that is called, the operator, or the property.
    Call,
    /// The argument of this index, counted as written between the brackets (the value of an assignment is 0).
    Argument(usize),
    /// The value of this key in an option map of the call.
    Option(String),
    /// This key itself in an option map of the call.
    Key(String),
    /// The call of this line and column, such as the layer that a fault of the whole stack is about.
    Elsewhere(usize, usize, Box<Place>),
}

/// One fault.
#[derive(Clone, Debug, PartialEq)]
pub struct Fault(Box<Details>);

/// What a fault says.
#[derive(Clone, Debug, PartialEq)]
pub struct Details {
    /// Its stable code.
    pub code: Code,
    /// What is wrong, a lower-case phrase.
    pub message: String,
    /// What stands at the guilty place.
    pub label: String,
    /// Facts that help to understand it.
    pub notes: Vec<String>,
    /// How to mend it, true and typeable.
    pub help: Option<String>,
    /// The guilty place.
    pub place: Place,
    /// Whether it only follows from a value that an earlier fault left unknown.
    pub of_unknown: bool,
}

impl std::ops::Deref for Fault {
    type Target = Details;
    fn deref(&self) -> &Details {
        &self.0
    }
}

impl std::ops::DerefMut for Fault {
    fn deref_mut(&mut self) -> &mut Details {
        &mut self.0
    }
}

impl Fault {
    /// What follows from a value that an earlier fault left unknown: reported by nobody.
    pub fn of_unknown() -> Self {
        let mut fault = Fault::new(crate::diagnostics::codes::WRONG_KIND, "a value that is not known");
        fault.of_unknown = true;
        fault
    }

    /// A fault at the call itself.
    pub fn new(code: Code, message: impl Into<String>) -> Self {
        Fault(Box::new(Details {
            code,
            message: message.into(),
            label: String::new(),
            notes: Vec::new(),
            help: None,
            place: Place::Call,
            of_unknown: false,
        }))
    }

    /// The same with these words at the guilty place.
    pub fn label(mut self, label: impl Into<String>) -> Self {
        self.label = label.into();
        self
    }

    /// The same with this way to mend it.
    pub fn help(mut self, help: impl Into<String>) -> Self {
        self.help = Some(help.into());
        self
    }

    /// The same with one more fact.
    pub fn note(mut self, note: impl Into<String>) -> Self {
        self.notes.push(note.into());
        self
    }

    /// The same at another place.
    pub fn at(mut self, place: Place) -> Self {
        self.place = place;
        self
    }

    /// The same at this place, unless it has been given one.
    pub fn at_if_unplaced(mut self, place: Place) -> Self {
        if self.place == Place::Call {
            self.place = place;
        }
        self
    }

    /// The same with the near name among the candidates as help, or with all of them.
    pub fn candidates<'a>(self, name: &str, candidates: impl IntoIterator<Item = &'a str> + Clone) -> Self {
        match suggest(name, candidates.clone()) {
            Some(near) => self.help(format!("did you mean `{near}`?")),
            None => {
                let all: Vec<String> = candidates.into_iter().map(|c| format!("`{c}`")).collect();
                if all.is_empty() { self } else { self.help(format!("there are: {}", all.join(", "))) }
            }
        }
    }
}

/// Several faults, as they travel in Rhai's run-time error.
#[derive(Clone, Debug)]
pub struct Faults(pub Vec<Fault>);

/// The result of what scripts call.
pub type Outcome<T> = Result<T, Box<EvalAltResult>>;

impl From<Fault> for Box<EvalAltResult> {
    fn from(fault: Fault) -> Self {
        Faults(vec![fault]).into()
    }
}

impl From<Faults> for Box<EvalAltResult> {
    fn from(faults: Faults) -> Self {
        Box::new(EvalAltResult::ErrorRuntime(Dynamic::from(faults), Position::NONE))
    }
}
