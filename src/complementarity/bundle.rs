//! Junctions side by side without series resistance act as one: the lowest level decides, and how those of that level
//! share its current is open. Only `equations` makes bundles, only `general` shares their currents out.

use super::network::{Junction, Law, Level, Network};
use super::outcome::Place;
use rustc_hash::FxHashMap;

/// Levels this close (relative) are one.
const SAME: f64 = 1e-12;

/// Junctions between the same nodes in the same direction; one alone is a bundle too.
pub(super) struct Bundle {
    /// What they are together.
    pub(super) law: Junction,
    /// Branches, in their order.
    pub(super) members: Vec<u32>,
    laws: Vec<Junction>,
}

/// The junctions among `branches`, in the order of the first of each bundle.
pub(super) fn bundles(network: &Network, branches: &[u32]) -> Vec<Bundle> {
    let mut bundles: Vec<Bundle> = Vec::new();
    let mut at: FxHashMap<(u32, u32), usize> = FxHashMap::default();
    for &n in branches {
        let b = &network.branches[n as usize];
        let Law::Junction(law) = b.law else { continue };
        let joins = (law.series == 0.0).then_some((b.from, b.to));
        match joins.and_then(|ends| at.get(&ends)) {
            Some(&k) => bundles[k].add(n, law),
            None => {
                at.extend(joins.map(|ends| (ends, bundles.len())));
                bundles.push(Bundle { law, members: vec![n], laws: vec![law] });
            }
        }
    }
    bundles
}

impl Bundle {
    fn add(&mut self, branch: u32, law: Junction) {
        let lower = |a: Level, b: Level| if b.value < a.value { b } else { a };
        self.law.forward = lower(self.law.forward, law.forward);
        self.law.reverse = match (self.law.reverse, law.reverse) {
            (Some(a), Some(b)) => Some(lower(a, b)),
            (a, b) => a.or(b),
        };
        self.members.push(branch);
        self.laws.push(law);
    }

    /// Members that carry the current where the bundle is in `place`.
    pub(super) fn carriers(&self, place: Place) -> Vec<u32> {
        let reaches = |own: Level, all: Level| own.value <= all.value * (1.0 + SAME);
        let carries = |law: &Junction| match place {
            Place::Conducting => reaches(law.forward, self.law.forward),
            Place::Breakdown => law.reverse.zip(self.law.reverse).is_some_and(|(own, all)| reaches(own, all)),
            _ => false,
        };
        self.members.iter().zip(&self.laws).filter(|(_, law)| carries(law)).map(|(&n, _)| n).collect()
    }
}
