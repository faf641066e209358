//! What each junction sees of the rest while all others keep their places, and how far the uncertainty of each
//! spreads to the others: one solve of the adjoint for each.

use super::double_double::Dd;
use super::exact::Solve;
use super::excite::{Excite, GeneralSpreads, Spread};
use super::forest::NONE;
use super::network::{Law, Network};
use super::outcome::{Place, Quantity, Solution, View};
use super::parts::{Builder, Built, Kind, Piece, split};
use super::passive::{Point, State};
use super::rails::Rails;

/// What is asked about a solution.
pub struct Questions<'a> {
    /// Junctions by branch number.
    pub junctions: &'a [u32],
    /// Whether their spreads are wanted beside their views.
    pub spreads: bool,
    /// Pairs of nodes whose difference is asked about.
    pub pairs: &'a [(u32, u32)],
    /// How uncertain each junction is, given what it sees: volts of its level where it carries current, amperes that
    /// it leaks where it blocks and the others move what it sees by so many volts.
    pub doubt: &'a dyn Fn(u32, Option<View>, f64) -> f64,
}

/// The answers, in the order of the questions.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Looks {
    /// `None` where what it sees is not finite (fed by current sources only, floating, open) or its part was not
    /// evaluated.
    pub views: Vec<Option<View>>,
    /// Of the current where it carries some (amperes), of the voltage where it blocks (volts).
    pub spreads: Vec<Option<Spread>>,
    /// Of the voltage between two nodes of one part.
    pub pairs: Vec<Option<Spread>>,
}

impl Network {
    /// What each of `junctions` (branch numbers) sees in `solution`.
    pub fn views(&self, solution: &Solution, junctions: &[u32]) -> Vec<Option<View>> {
        self.look(solution, &Questions { junctions, spreads: false, pairs: &[], doubt: &|_, _, _| 0.0 }).views
    }

    /// Views, and how far the uncertainty of all junctions spreads, to first order.
    pub fn look(&self, solution: &Solution, questions: &Questions<'_>) -> Looks {
        let rails = Rails::new(self);
        let mut builder = Builder::new(self, &rails);
        let mut desk = Desk {
            network: self,
            rails: &rails,
            solution,
            questions,
            wanted: vec![false; self.branches.len()],
            views: vec![None; self.branches.len()],
            spreads: vec![None; self.branches.len()],
            pairs: vec![None; questions.pairs.len()],
        };
        for &n in questions.junctions {
            desk.wanted[n as usize] = true;
        }
        for piece in split(self, &rails) {
            if desk.concerns(&piece) {
                match piece.kind {
                    Kind::Passive => desk.passive(&mut builder, &piece),
                    Kind::General => desk.general(&piece),
                    Kind::Unknown => {}
                }
            }
        }
        let pick = |n: &u32| desk.views[*n as usize];
        let spread = |n: &u32| desk.spreads[*n as usize];
        Looks {
            views: questions.junctions.iter().map(pick).collect(),
            spreads: questions.junctions.iter().map(spread).collect(),
            pairs: desk.pairs,
        }
    }
}

/// Questions and answers while the parts are gone through.
struct Desk<'a> {
    network: &'a Network,
    rails: &'a Rails,
    solution: &'a Solution,
    questions: &'a Questions<'a>,
    wanted: Vec<bool>,
    views: Vec<Option<View>>,
    spreads: Vec<Option<Spread>>,
    pairs: Vec<Option<Spread>>,
}

impl Desk<'_> {
    fn concerns(&self, piece: &Piece) -> bool {
        let group = |n: u32| self.rails.forest.group[n as usize];
        let holds = |n: u32| group(n) != 0 && piece.groups.binary_search(&group(n)).is_ok();
        piece.branches.iter().any(|&n| self.wanted[n as usize])
            || self.questions.pairs.iter().any(|&(p, q)| holds(p) || holds(q))
    }

    fn passive(&mut self, builder: &mut Builder<'_>, piece: &Piece) {
        let built = builder.build(piece);
        let Some(guide) = guide(self.rails, piece, &built, self.solution) else { return };
        let mut solve = Solve::new(&built.part, &guide);
        solve.run();
        let mut tie_node = vec![NONE; built.diodes.len()];
        for (node, &tie) in solve.forest.up.iter().enumerate().filter(|(_, tie)| **tie != NONE) {
            tie_node[solve.tie_diode[tie as usize] as usize] = node as u32;
        }
        for (k, &branch) in built.diodes.iter().enumerate().filter(|(_, b)| self.wanted[**b as usize]) {
            let Law::Junction(junction) = self.network.branches[branch as usize].law else { continue };
            let diode = &built.part.diodes[k];
            self.views[branch as usize] = match diode.level(guide.states[k]) {
                None => blocking(&mut solve, diode, self.solution.voltages[branch as usize]),
                Some(level) => {
                    let Quantity::Known(i) = self.solution.currents[branch as usize] else { continue };
                    let response = if junction.series > 0.0 {
                        solve.link_response(diode)
                    } else if tie_node[k] != NONE {
                        solve.response(tie_node[k])
                    } else {
                        0.0
                    };
                    let resistance = 1.0 / response;
                    let open_circuit = level + i * resistance;
                    open_circuit.is_finite().then_some(View { open_circuit, resistance })
                }
            };
        }
        let asks_pairs = !self.questions.pairs.is_empty();
        if self.questions.spreads || asks_pairs {
            self.passive_spreads(piece, &built, &mut solve);
        }
    }

    fn passive_spreads(&mut self, piece: &Piece, built: &Built, solve: &mut Solve<'_>) {
        let views = &self.views;
        let doubt = |k: usize, more: f64| {
            let branch = built.diodes[k];
            (self.questions.doubt)(branch, views[branch as usize], more)
        };
        let mut excite = Excite::new(solve, (0..built.diodes.len()).map(|k| doubt(k, 0.0)).collect());
        // what blocks first: the others may bring it nearer to its knee, and then it leaks more
        for blocks in [true, false] {
            for (k, &branch) in built.diodes.iter().enumerate() {
                let is_wanted = self.questions.spreads && self.wanted[branch as usize];
                if is_wanted && excite.blocks(k) == blocks {
                    self.spreads[branch as usize] = excite.junction(k).map(|s| s.numbered(&built.diodes));
                }
            }
            for (k, &branch) in built.diodes.iter().enumerate().filter(|_| blocks) {
                if let (true, Some(spread)) = (excite.blocks(k), &self.spreads[branch as usize]) {
                    excite.doubts[k] = doubt(k, spread.others());
                }
            }
        }
        for (n, &(p, q)) in self.questions.pairs.iter().enumerate() {
            let local = |node: u32| match self.rails.forest.group[node as usize] {
                0 => Some(0),
                g => piece.groups.binary_search(&g).ok().map(|at| at as u32 + 1),
            };
            let spread = match (local(p), local(q)) {
                (Some(0), Some(0)) | (None, None) => None,
                (Some(p), Some(q)) => excite.between(p, q),
                // the other node is another part's: each contributes what it does against the reference
                (Some(n), None) | (None, Some(n)) if n != 0 => excite.between(n, 0),
                _ => None,
            };
            if let Some(spread) = spread {
                let spread = spread.numbered(&built.diodes);
                self.pairs[n] = Some(self.pairs[n].map_or(spread, |other: Spread| other.and(spread)));
            }
        }
    }

    fn general(&mut self, piece: &Piece) {
        let (network, rails) = (self.network, self.rails);
        super::general::views(network, rails, piece, self.solution, &self.wanted, &mut self.views);
        if self.questions.spreads || !self.questions.pairs.is_empty() {
            let ask = GeneralSpreads {
                network,
                rails,
                piece,
                solution: self.solution,
                doubt: &|b, more| (self.questions.doubt)(b, self.views[b as usize], more),
            };
            for (branch, spread) in ask.junctions() {
                if self.wanted[branch as usize] && self.questions.spreads {
                    self.spreads[branch as usize] = Some(spread);
                }
            }
            for (n, spread) in ask.pairs(self.questions.pairs) {
                self.pairs[n] = Some(self.pairs[n].map_or(spread, |other: Spread| other.and(spread)));
            }
        }
    }
}

/// A blocking junction sees its own voltage, through the resistance between its nodes.
fn blocking(solve: &mut Solve<'_>, d: &super::passive::Diode, v: Quantity) -> Option<View> {
    let open_circuit = v.known()?;
    let resistance = solve.between(d.p, d.q)? + d.series;
    Some(View { open_circuit, resistance })
}

/// The point of a solution, in the numbers of the part; `None` where it was not evaluated.
fn guide(rails: &Rails, piece: &Piece, built: &Built, solution: &Solution) -> Option<Point> {
    let mut potentials = vec![Dd::ZERO];
    for &group in &piece.groups {
        let node = *rails.nodes_of(group).first()? as usize;
        let u = solution.sample.0[node];
        if u.is_nan() {
            return None;
        }
        potentials.push(Dd::from(u) - rails.forest.offset[node]);
    }
    let mut states = Vec::with_capacity(built.diodes.len());
    let mut currents = Vec::with_capacity(built.diodes.len());
    for &branch in &built.diodes {
        let i = solution.sample.1[branch as usize];
        currents.push(i);
        states.push(match solution.places[branch as usize] {
            Place::Unknown => return None,
            Place::Blocking => State::Blocking,
            _ if i > 0.0 => State::Forward,
            _ if i < 0.0 => State::Reverse,
            _ => State::Blocking,
        });
    }
    Some(Point { potentials, currents, states })
}
