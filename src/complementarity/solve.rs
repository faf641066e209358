//! From a network to all its solutions: ties, parts, each part on its own, and everything put together again.

use super::assemble::Assembly;
use super::existence::{Obstacle, obstacle};
use super::network::{Law, Network};
use super::outcome::{Outcome, Part, Reason, Verdict};
use super::parts::{Builder, Built, Kind, Piece, split};
use super::passive::{Passive, Point};
use super::rails::Rails;
use super::{interior, pivoting, settle};

/// What was found of one part.
pub(super) struct Answer {
    pub(super) piece: Piece,
    pub(super) verdict: Verdict,
    pub(super) reasons: Vec<Reason>,
    /// Consistent sets; empty where it has none or was not evaluated.
    pub(super) found: Vec<Found>,
    pub(super) truncated: bool,
    pub(super) solves: usize,
}

/// One consistent set of a part.
pub(super) enum Found {
    /// Of a passive part; `tied` where currents may be open.
    Passive { built: Built, point: Point, tied: bool },
    /// Of any other: a value for each of the part's nodes and branches.
    General(super::general::Set),
}

impl Network {
    /// All solutions. Never fails: the verdict says what could not be done.
    pub fn solve(&self) -> Outcome {
        let rails = Rails::new(self);
        let mut builder = Builder::new(self, &rails);
        let answers =
            split(self, &rails).into_iter().map(|p| answer(self, &rails, &mut builder, p)).collect();
        Assembly::new(self, &rails, answers).outcome()
    }
}

fn answer(network: &Network, rails: &Rails, builder: &mut Builder<'_>, piece: Piece) -> Answer {
    let mut answer = Answer {
        verdict: Verdict::Unique,
        reasons: Vec::new(),
        found: Vec::new(),
        truncated: false,
        solves: 0,
        piece,
    };
    if answer.piece.tainted {
        answer.verdict = Verdict::None;
        return answer;
    }
    match answer.piece.kind {
        Kind::Unknown => {
            let unknown = |n: &u32| network.branches[*n as usize].law == Law::Unknown;
            answer.verdict = Verdict::Partial;
            let branches = answer.piece.branches.iter().copied().filter(unknown).collect();
            answer.reasons.push(Reason::Unknown { branches });
        }
        Kind::Passive => {
            let built = builder.build(&answer.piece);
            passive(network, rails, built, &mut answer);
        }
        Kind::General => super::general::solve(network, rails, &mut answer),
    }
    answer
}

/// A passive part: existence from the graph, states by pivoting, else along the interior path, then exactly.
fn passive(network: &Network, rails: &Rails, built: Built, answer: &mut Answer) {
    if let Some(obstacle) = obstacle(&built.part) {
        answer.verdict = Verdict::None;
        answer.reasons.push(explain(network, rails, &built, &answer.piece, &obstacle));
        return;
    }
    let Some((point, tied, holds)) = states(&built.part, &mut answer.solves) else {
        answer.verdict = Verdict::Unverified;
        let text = "this part is so large and so densely joined that its equations do not fit in memory";
        answer.reasons.push(Reason::Dependent { text: text.into() });
        return;
    };
    if holds {
        answer.found.push(Found::Passive { built, point, tied });
    } else {
        answer.verdict = Verdict::Unverified;
        let text = format!(
            "assumed states were solved for and mended {} times, and some assumption still failed",
            answer.solves
        );
        answer.reasons.push(Reason::Dependent { text });
    }
}

/// A point, whether currents in it may be open, and whether every assumption holds; `None` where the part is too
/// large.
fn states(part: &Passive, solves: &mut usize) -> Option<(Point, bool, bool)> {
    if part.diodes.is_empty() && part.resistors.is_empty() {
        let potentials = vec![super::double_double::Dd::ZERO; part.nodes];
        return Some((Point { potentials, currents: Vec::new(), states: Vec::new() }, false, true));
    }
    let mut system = pivoting::pattern(part);
    if system.too_large {
        return None;
    }
    if let Some(guide) = pivoting::propose(part, &mut system) {
        let settled = settle::settle(part, guide);
        *solves += settled.factorizations;
        if settled.holds {
            *solves += system.factorizations;
            return Some((settled.point, settled.tied, true));
        }
    }
    let guide = interior::propose(part, &mut system);
    let settled = settle::settle(part, guide);
    *solves += settled.factorizations + system.factorizations;
    Some((settled.point, settled.tied, settled.holds))
}

/// The obstacle in branches and nodes of the network.
fn explain(network: &Network, rails: &Rails, built: &Built, piece: &Piece, obstacle: &Obstacle) -> Reason {
    match obstacle {
        Obstacle::Loop { diodes, gap } => {
            Reason::Loop { branches: whole_loop(network, rails, built, diodes), gap: *gap }
        }
        Obstacle::Cut { inside, excess } => cut(network, rails, piece, inside, *excess),
    }
}

/// Diodes of a loop with the ties between them, in order.
fn whole_loop(network: &Network, rails: &Rails, built: &Built, diodes: &[(u32, bool)]) -> Vec<u32> {
    let ends = |&(n, reverse): &(u32, bool)| {
        let number = built.diodes[n as usize];
        let b = &network.branches[number as usize];
        if reverse { (number, b.to, b.from) } else { (number, b.from, b.to) }
    };
    let mut branches = Vec::new();
    for (k, diode) in diodes.iter().enumerate() {
        let (number, _, leaves) = ends(diode);
        let (_, enters, _) = ends(&diodes[(k + 1) % diodes.len()]);
        branches.push(number);
        let walk = rails.forest.walk(&rails.ties, leaves, enters);
        branches.extend(walk.into_iter().map(|(tie, _)| rails.branch[tie as usize]));
    }
    branches
}

fn cut(network: &Network, rails: &Rails, piece: &Piece, inside: &[bool], excess: f64) -> Reason {
    let mut within = vec![false; rails.forest.groups];
    for (n, &g) in piece.groups.iter().enumerate() {
        within[g as usize] = inside[n + 1];
    }
    let is_in = |node: u32| within[rails.forest.group[node as usize] as usize];
    let crossing = |b: &super::network::Branch| is_in(b.from) != is_in(b.to);
    let numbered = network.branches.iter().enumerate();
    let branches = numbered.filter(|(_, b)| crossing(b)).map(|(n, _)| n as u32).collect();
    let nodes = (1..network.nodes).filter(|&n| is_in(n)).collect();
    Reason::CutSet { branches, nodes, excess }
}

impl Answer {
    pub(super) fn part(&self, rails: &Rails) -> Part {
        Part {
            verdict: self.verdict,
            reasons: self.reasons.clone(),
            branches: self.piece.branches.clone(),
            nodes: self.piece.groups.iter().flat_map(|&g| rails.nodes_of(g)).copied().collect(),
            truncated: self.truncated,
        }
    }
}
