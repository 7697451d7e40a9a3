//! Models of a material that are chosen by a word: one table for scripts, archive and Rust. The first word is the default.

macro_rules! choices {
    ($($variant:ident $key:literal [$($word:literal),+] $doc:literal;)*) => {
        /// A model that a script may choose for a material or a layer.
        #[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
        pub enum Choice {
            $(#[doc = $doc] $variant,)*
        }
        impl Choice {
            /// Every choice, in the order of the reference page.
            pub const ALL: &'static [Choice] = &[$(Choice::$variant,)*];
            /// The word for it in scripts and archives.
            pub fn key(self) -> &'static str {
                match self { $(Choice::$variant => $key,)* }
            }
            /// What may be chosen; the first is the default.
            pub fn words(self) -> &'static [&'static str] {
                match self { $(Choice::$variant => &[$($word),+],)* }
            }
            /// One sentence on what it is.
            pub fn description(self) -> &'static str {
                match self { $(Choice::$variant => $doc,)* }
            }
        }
    };
}

choices! {
    GapNarrowing "gap_narrowing" ["off", "jain"] "Narrowing of the gap by heavy doping: the library's coefficients for the layer's majority dopant, or none; off unless given.";
    Radiative "radiative_model" ["given", "absorption"] "Coefficient of radiative recombination: the library's or the script's number, or by detailed balance from how the material absorbs; `given` unless given.";
}

impl Choice {
    /// The choice of a script's word, if there is one.
    pub fn from_key(key: &str) -> Option<Choice> {
        Choice::ALL.iter().copied().find(|c| c.key() == key)
    }

    /// The word of this choice that a script wrote, if it is one.
    pub fn word(self, given: &str) -> Option<&'static str> {
        self.words().iter().copied().find(|word| *word == given)
    }
}
