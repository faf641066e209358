//! The same network with smooth monotone laws in place of its junctions' corners: one answer for each part, by
//! Newton's method started at the piecewise-linear answer. This file says what is asked and puts parts together;
//! `smooth_passive` and `smooth_general` solve one part.

use super::curve::Curve;
use super::network::{Law, Network};
use super::outcome::{Place, Solution};
use super::parts::{Builder, Kind, split};
use super::rails::{Rails, fixed};

/// What a junction obeys here.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Smoothness {
    /// A smooth law.
    Curve(Curve),
    /// Its own corners; its state is kept where that agrees, else changed.
    Corner,
    /// Its part is left alone.
    Leave,
}

/// The answer of all parts, by branch and node. NaN where it was not sought, not found, or where these laws leave it
/// open as far as double precision can tell.
#[derive(Debug, Clone, PartialEq)]
pub struct Smooth {
    /// Potential of each node.
    pub potentials: Vec<f64>,
    /// Voltage and current of each junction.
    pub junctions: Vec<(f64, f64)>,
    /// Junctions of each part in which Newton's method did not settle.
    pub failed: Vec<Vec<u32>>,
    /// Factorizations done.
    pub solves: usize,
}

const UNKNOWN: (f64, f64) = (f64::NAN, f64::NAN);

impl Network {
    /// Solves every part that holds a junction with a smooth law, started at `solution`. `laws` has one entry for
    /// each branch.
    pub fn smooth(&self, solution: &Solution, laws: &[Smoothness]) -> Smooth {
        let rails = Rails::new(self);
        let mut builder = Builder::new(self, &rails);
        let mut smooth = Smooth {
            potentials: self.boundaries(&rails),
            junctions: vec![UNKNOWN; self.branches.len()],
            failed: Vec::new(),
            solves: 0,
        };
        for piece in split(self, &rails) {
            let junctions: Vec<u32> =
                piece.branches.iter().copied().filter(|&n| self.is_junction(n)).collect();
            let all = |wanted: fn(&Smoothness) -> bool| junctions.iter().any(|&n| wanted(&laws[n as usize]));
            let is_unknown = |&n: &u32| solution.places[n as usize] == Place::Unknown;
            if !all(|l| matches!(l, Smoothness::Curve(_)))
                || all(|l| *l == Smoothness::Leave)
                || junctions.iter().any(is_unknown)
            {
                continue;
            }
            let settled = match piece.kind {
                Kind::Passive => {
                    let built = builder.build(&piece);
                    super::smooth_passive::solve(&rails, &piece, &built, solution, laws, &mut smooth)
                }
                Kind::General => {
                    super::smooth_general::solve(self, &rails, &piece, solution, laws, &mut smooth)
                }
                Kind::Unknown => true,
            };
            if !settled {
                smooth.failed.push(junctions);
            }
        }
        smooth
    }

    fn is_junction(&self, branch: u32) -> bool {
        matches!(self.branches[branch as usize].law, Law::Junction(_))
    }

    /// Potentials of nodes that sources hold against the reference; NaN elsewhere.
    fn boundaries(&self, rails: &Rails) -> Vec<f64> {
        let held = |n: usize| match rails.forest.group[n] {
            0 if !rails.tainted[n] => rails.forest.offset[n].round(),
            _ => f64::NAN,
        };
        let ties = self.branches.iter().any(|b| fixed(b.law).is_some());
        (0..self.nodes.max(1) as usize).map(|n| if ties || n == 0 { held(n) } else { f64::NAN }).collect()
    }
}
