//! Parts with controlled laws or negative resistances: small dense systems, every consistent set of states.

use super::network::Network;
use super::outcome::{Interval, Place, Reason, Verdict};
use super::rails::Rails;
use super::solve::Answer;

/// One consistent set of a part.
pub(super) struct Set {
    potentials: Vec<(u32, f64)>,
    currents: Vec<(u32, f64)>,
    places: Vec<(u32, Place)>,
}

impl Set {
    pub(super) fn fill(&self, potentials: &mut [f64], currents: &mut [f64]) {
        for &(n, v) in &self.potentials {
            potentials[n as usize] = v;
        }
        for &(n, v) in &self.currents {
            currents[n as usize] = v;
        }
    }
    pub(super) fn fill_open(
        &self,
        _room: &mut [Interval],
        _ranges: &mut [Option<Interval>],
        places: &mut [Place],
    ) -> (bool, bool) {
        for &(n, p) in &self.places {
            places[n as usize] = p;
        }
        (false, false)
    }
}

pub(super) fn solve(_network: &Network, _rails: &Rails, answer: &mut Answer) {
    answer.verdict = Verdict::Unverified;
    answer.reasons.push(Reason::Residual { relative: 1.0 });
}
