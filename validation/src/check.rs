//! One check: a number of ours beside a number from elsewhere, how far they may differ and why so far.

use epiloom_solver::math::elementary::log10;

/// How far a number may be from its reference.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Tolerance {
    /// A share of the reference.
    Relative(f64),
    /// In the unit of the number.
    Absolute(f64),
    /// Not above the reference.
    AtMost,
    /// Not below the reference.
    AtLeast,
}

/// Where a reference is from. Only what stands in a source that was looked at is called published.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Source {
    /// In a paper, standard or textbook that was looked at.
    Published(&'static str),
    /// Worked out by another program: tool and digits, and the script in `reference/` where there is one.
    Computed(&'static str),
    /// A closed form or an identity that algebra gives from the model's own equations.
    Algebra(&'static str),
    /// In the literature, as remembered.
    Memory(&'static str),
    /// A fact of the trade: common practice, no source.
    Trade(&'static str),
}

impl std::fmt::Display for Source {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        match self {
            Source::Published(text) => write!(f, "published: {text}"),
            Source::Computed(text) => write!(f, "computed: {text}"),
            Source::Algebra(text) => write!(f, "algebra: {text}"),
            Source::Memory(text) => write!(f, "from memory: {text}"),
            Source::Trade("") => write!(f, "common practice, no source"),
            Source::Trade(text) => write!(f, "common practice, no source: {text}"),
        }
    }
}

/// One check.
#[derive(Clone, Debug)]
pub struct Check {
    /// The topic that it belongs to.
    pub topic: &'static str,
    /// What is compared, with its unit.
    pub what: String,
    /// Where the reference is from.
    pub source: Source,
    /// The reference.
    pub reference: f64,
    /// Our number.
    pub ours: f64,
    /// How far apart they may be.
    pub tolerance: Tolerance,
    /// Why so far.
    pub reason: &'static str,
}

impl Check {
    /// How far ours is from the reference, in the tolerance's own measure.
    pub fn difference(&self) -> f64 {
        let apart = (self.ours - self.reference).abs();
        match self.tolerance {
            Tolerance::Relative(_) if apart == 0.0 => 0.0,
            Tolerance::Relative(_) => apart / self.reference.abs(),
            Tolerance::Absolute(_) => apart,
            // How far on the wrong side; a number that is none is on it.
            Tolerance::AtMost if self.ours <= self.reference => 0.0,
            Tolerance::AtLeast if self.ours >= self.reference => 0.0,
            Tolerance::AtMost | Tolerance::AtLeast => apart,
        }
    }

    /// The largest difference allowed, in the same measure.
    pub fn allowed(&self) -> f64 {
        match self.tolerance {
            Tolerance::Relative(t) | Tolerance::Absolute(t) => t,
            Tolerance::AtMost | Tolerance::AtLeast => 0.0,
        }
    }

    /// Whether the check holds; a number that is not finite never does.
    pub fn passes(&self) -> bool {
        self.difference() <= self.allowed()
    }

    /// Significant digits that the tolerance resolves, and one more.
    pub fn digits(&self) -> usize {
        let size = self.reference.abs();
        let relative = match self.tolerance {
            Tolerance::Relative(t) => t,
            Tolerance::Absolute(t) if size > 0.0 => t / size,
            Tolerance::Absolute(_) => return 2,
            Tolerance::AtMost | Tolerance::AtLeast => return 4,
        };
        ((-log10(relative)).ceil() + 1.0).clamp(2.0, 14.0) as usize
    }
}

/// The checks of one topic against one source, as they are collected.
pub struct Checks {
    topic: &'static str,
    source: Source,
    list: Vec<Check>,
}

impl Checks {
    /// No checks yet.
    pub fn new(topic: &'static str, source: Source) -> Self {
        Checks { topic, source, list: Vec::new() }
    }

    /// From here on, another source.
    pub fn source(&mut self, source: Source) -> &mut Self {
        self.source = source;
        self
    }

    /// One number with its tolerance.
    pub fn add(
        &mut self,
        what: impl Into<String>,
        reference: f64,
        ours: f64,
        tolerance: Tolerance,
        reason: &'static str,
    ) {
        let (topic, source, what) = (self.topic, self.source, what.into());
        self.list.push(Check { topic, what, source, reference, ours, tolerance, reason });
    }

    /// One number to a share of the reference.
    pub fn relative(
        &mut self,
        what: impl Into<String>,
        reference: f64,
        ours: f64,
        share: f64,
        reason: &'static str,
    ) {
        self.add(what, reference, ours, Tolerance::Relative(share), reason);
    }

    /// One number to a difference in its own unit.
    pub fn absolute(
        &mut self,
        what: impl Into<String>,
        reference: f64,
        ours: f64,
        difference: f64,
        reason: &'static str,
    ) {
        self.add(what, reference, ours, Tolerance::Absolute(difference), reason);
    }

    /// One number that may not be above the reference.
    pub fn at_most(&mut self, what: impl Into<String>, reference: f64, ours: f64, reason: &'static str) {
        self.add(what, reference, ours, Tolerance::AtMost, reason);
    }

    /// One number that may not be below the reference.
    pub fn at_least(&mut self, what: impl Into<String>, reference: f64, ours: f64, reason: &'static str) {
        self.add(what, reference, ours, Tolerance::AtLeast, reason);
    }

    /// Many numbers of a kind under one tolerance: the one that is furthest off stands for all. `parts` are what it is,
    /// the reference and ours.
    pub fn worst(
        &mut self,
        what: &str,
        parts: &[(String, f64, f64)],
        tolerance: Tolerance,
        reason: &'static str,
    ) {
        let measured: Vec<Check> = parts
            .iter()
            .map(|(part, reference, ours)| Check {
                topic: self.topic,
                what: format!("{what}: worst of {}, {part}", parts.len()),
                source: self.source,
                reference: *reference,
                ours: *ours,
                tolerance,
                reason,
            })
            .collect();
        // A number that is not finite is the worst of all.
        let rank = |c: &Check| if c.difference().is_finite() { c.difference() } else { f64::INFINITY };
        if let Some(worst) = measured.into_iter().reduce(|a, b| if rank(&b) > rank(&a) { b } else { a }) {
            self.list.push(worst);
        }
    }

    /// All of them.
    pub fn done(self) -> Vec<Check> {
        self.list
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn check(reference: f64, ours: f64, tolerance: Tolerance) -> Check {
        Check {
            topic: "t",
            what: "w".into(),
            source: Source::Trade(""),
            reference,
            ours,
            tolerance,
            reason: "r",
        }
    }

    /// Truth: arithmetic by hand. A comparison that let NaN or infinity through would hide a broken solver.
    #[test]
    fn a_check_passes_within_its_tolerance_alone() {
        use Tolerance::*;
        assert!(check(2.0, 2.0002, Relative(1.1e-4)).passes());
        assert!(!check(2.0, 2.0002, Relative(0.9e-4)).passes());
        assert!(check(-2.0, -2.1, Absolute(0.11)).passes());
        assert!(!check(-2.0, 2.0, Relative(0.5)).passes());
        assert!(check(0.0, 0.0, Relative(1e-9)).passes());
        assert!(!check(0.0, 1e-30, Relative(1e-9)).passes());
        for broken in [f64::NAN, f64::INFINITY] {
            assert!(!check(1.0, broken, Relative(1.0)).passes());
            assert!(!check(1.0, broken, Absolute(1.0)).passes());
        }
        assert_eq!(check(3.0, 3.0, Relative(1e-6)).digits(), 7);
        assert!(check(2.0, 2.0, AtMost).passes() && check(2.0, 1.0, AtMost).passes());
        assert!(check(2.0, 2.0, AtLeast).passes() && check(2.0, 3.0, AtLeast).passes());
        assert!(!check(2.0, 2.1, AtMost).passes() && !check(2.0, 1.9, AtLeast).passes());
        assert!(!check(2.0, f64::NAN, AtMost).passes() && !check(2.0, f64::NAN, AtLeast).passes());
    }

    /// Truth: by hand; a number that is not finite outranks every other.
    #[test]
    fn the_worst_stands_for_all() {
        let mut checks = Checks::new("t", Source::Trade(""));
        let part = |name: &str, ours: f64| (name.to_string(), 1.0, ours);
        checks.worst("a", &[part("x", 1.1), part("y", 1.3), part("z", 1.2)], Tolerance::Relative(0.5), "r");
        checks.worst(
            "b",
            &[part("x", 1.1), part("y", f64::NAN), part("z", 9.0)],
            Tolerance::Relative(0.5),
            "r",
        );
        let list = checks.done();
        assert_eq!(list[0].what, "a: worst of 3, y");
        assert!(list[0].passes());
        assert_eq!(list[1].what, "b: worst of 3, y");
        assert!(!list[1].passes());
    }
}
