//! The answer: a verdict for each independent part, and every quantity known, open or unknown.

/// How well the laws determine a part. Ordered from the least to the most serious; a whole takes the most
/// serious of its parts'.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub enum Verdict {
    /// One solution.
    Unique,
    /// All voltages known, some current splits open.
    Shared,
    /// All currents known, some voltages open.
    Floating,
    /// Both.
    SharedFloating,
    /// Holds a law that is not known.
    Partial,
    /// More than one consistent set.
    Several,
    /// Contradiction.
    None,
    /// A result that does not check in double precision.
    Unverified,
}

impl Verdict {
    /// The word used in every output.
    pub fn word(self) -> &'static str {
        match self {
            Verdict::Unique => "unique",
            Verdict::Shared => "shared",
            Verdict::Floating => "floating",
            Verdict::SharedFloating => "shared+floating",
            Verdict::Partial => "partial",
            Verdict::Several => "several",
            Verdict::None => "none",
            Verdict::Unverified => "unverified",
        }
    }
}

/// A feasible interval; infinite ends are unbounded.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Interval {
    /// Least value, or −∞.
    pub low: f64,
    /// Greatest value, or +∞.
    pub high: f64,
}

/// A voltage or a current.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Quantity {
    /// Determined.
    Known(f64),
    /// The laws leave it open between two ends.
    Open(Interval),
    /// Not evaluated.
    Unknown,
}

impl Quantity {
    /// The value, where determined.
    pub fn known(self) -> Option<f64> {
        match self {
            Quantity::Known(value) => Some(value),
            _ => None,
        }
    }
    /// The interval, where open.
    pub fn interval(self) -> Option<Interval> {
        match self {
            Quantity::Open(interval) => Some(interval),
            _ => None,
        }
    }
}

/// Where a junction stands. `Open`: both directions are possible. `Unknown`: not evaluated.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Place {
    /// i > 0 in some solution of the set, never < 0.
    Conducting,
    /// i = 0 in all.
    Blocking,
    /// i < 0 in some, never > 0.
    Breakdown,
    /// Both signs occur.
    Open,
    /// Not evaluated.
    Unknown,
}

/// Why a part has no solution, or cannot be trusted, as branch and node numbers.
#[derive(Debug, Clone, PartialEq)]
pub enum Reason {
    /// A closed walk of branches of no resistance whose voltages do not sum to zero: unlimited current (`gap` > 0
    /// is the voltage left over along the walk), or sources that contradict each other (no junction among them).
    Loop { branches: Vec<u32>, gap: f64 },
    /// Sources push `excess` into a set of nodes (> 0) or draw it out (< 0), and the branches that lead out of the set
    /// carry nothing that way.
    CutSet { branches: Vec<u32>, nodes: Vec<u32>, excess: f64 },
    /// Branches whose law is not known.
    Unknown { branches: Vec<u32> },
    /// Nothing in the graph makes it so, but the numbers do: controlled laws without a unique answer, a search that was
    /// cut off, a part too large to factor.
    Dependent { text: String },
}

/// One independent part.
#[derive(Debug, Clone, PartialEq)]
pub struct Part {
    /// Its verdict.
    pub verdict: Verdict,
    /// What makes it so, where the verdict is not `Unique`: also the loop or the cut that leaves it open.
    pub reasons: Vec<Reason>,
    /// Its branches (voltage sources that hold boundary nodes belong to no part).
    pub branches: Vec<u32>,
    /// Its nodes; boundaries (held by sources to the reference) belong to no part.
    pub nodes: Vec<u32>,
    /// More solutions exist than were listed.
    pub truncated: bool,
}

/// One consistent set of everything.
#[derive(Debug, Clone, PartialEq)]
pub struct Solution {
    /// Potential of each node; node 0 is `Known(0.0)`.
    pub potentials: Vec<Quantity>,
    /// Voltage across each branch, known even where both its potentials are open but move together.
    pub voltages: Vec<Quantity>,
    /// Current of each branch.
    pub currents: Vec<Quantity>,
    /// Place of each branch; `Blocking` for those that are no junction (ignore it).
    pub places: Vec<Place>,
    /// One representative solution, for substitution: potentials and currents that satisfy every law of the
    /// evaluated parts. NaN where not evaluated.
    pub sample: (Vec<f64>, Vec<f64>),
}

/// What a junction sees of the rest of the network, the others keeping their places.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct View {
    /// Voltage it would see if it carried nothing.
    pub open_circuit: f64,
    /// Resistance it sees, its own series resistance included.
    pub resistance: f64,
}

/// The whole answer.
#[derive(Debug, Clone, PartialEq)]
pub struct Outcome {
    /// The most serious verdict of the parts.
    pub verdict: Verdict,
    /// The independent parts.
    pub parts: Vec<Part>,
    /// Every consistent set, at most 16; empty only where nothing could be solved.
    pub solutions: Vec<Solution>,
    /// More than 16.
    pub truncated: bool,
    /// Factorizations done.
    pub solves: usize,
}
