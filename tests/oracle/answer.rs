//! What the enumeration finds, as plain data.

use super::Rat;

/// How well the laws determine the whole network.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub enum Verdict {
    /// One solution.
    Unique,
    /// Some currents open.
    Shared,
    /// Some voltages open.
    Floating,
    /// Both in one part.
    SharedFloating,
    /// More than one isolated solution.
    Several,
    /// No solution.
    None,
}

/// A state as the reports name it.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum StateWord {
    /// Current positive in some solution, negative in none.
    Conducting,
    /// Current zero in all.
    Blocking,
    /// Negative in some, positive in none.
    Breakdown,
    /// Both signs.
    Open,
}

/// All values that a quantity takes; `None` is unbounded.
#[derive(Debug, Clone, PartialEq)]
pub struct Range {
    /// Least.
    pub low: Option<Rat>,
    /// Greatest.
    pub high: Option<Rat>,
}

impl Range {
    /// The one value, where there is only one.
    pub fn single(&self) -> Option<&Rat> {
        if self.low == self.high { self.low.as_ref() } else { None }
    }

    /// The smallest range that holds both.
    pub fn widen(&mut self, other: &Range) {
        if let Some(low) = &self.low
            && other.low.as_ref().is_none_or(|l| l < low)
        {
            self.low.clone_from(&other.low);
        }
        if let Some(high) = &self.high
            && other.high.as_ref().is_none_or(|h| h > high)
        {
            self.high.clone_from(&other.high);
        }
    }

    /// The state of a diode whose current takes these values.
    pub fn state(&self) -> StateWord {
        let some_positive = self.high.as_ref().is_none_or(Rat::is_positive);
        let some_negative = self.low.as_ref().is_none_or(Rat::is_negative);
        match (some_positive, some_negative) {
            (true, true) => StateWord::Open,
            (true, false) => StateWord::Conducting,
            (false, true) => StateWord::Breakdown,
            (false, false) => StateWord::Blocking,
        }
    }

    /// The range of zero alone.
    pub fn zero() -> Self {
        Range { low: Some(Rat::zero()), high: Some(Rat::zero()) }
    }
}

/// One point of the solution set: potentials, then voltages, then currents.
pub type Point = Vec<Rat>;

/// The whole solution set.
#[derive(Debug, Clone, Default)]
pub struct Answer {
    /// Number of nodes, ground included.
    pub nodes: usize,
    /// Number of elements.
    pub elements: usize,
    /// Range of each potential, each element's voltage, each element's current; empty where there is no solution.
    pub ranges: Vec<Range>,
    /// All corners of all its polyhedra, each once.
    pub points: Vec<Point>,
    /// Some assignment leaves more than one point.
    pub continuum: bool,
}

impl Answer {
    /// Whether there is a solution.
    pub fn solvable(&self) -> bool {
        !self.ranges.is_empty()
    }

    /// Potentials a node takes.
    pub fn potential(&self, node: usize) -> &Range {
        &self.ranges[node]
    }

    /// Voltages across an element.
    pub fn voltage(&self, element: usize) -> &Range {
        &self.ranges[self.nodes + element]
    }

    /// Currents through an element.
    pub fn current(&self, element: usize) -> &Range {
        &self.ranges[self.nodes + self.elements + element]
    }

    /// Same quantities of one point.
    pub fn at<'a>(&self, point: &'a Point) -> (&'a [Rat], &'a [Rat], &'a [Rat]) {
        let (potentials, rest) = point.split_at(self.nodes);
        let (voltages, currents) = rest.split_at(self.elements);
        (potentials, voltages, currents)
    }
}
