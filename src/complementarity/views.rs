//! What each junction sees of the rest while all others keep their places: one solve of the adjoint for each.

use super::double_double::Dd;
use super::exact::Solve;
use super::forest::NONE;
use super::network::{Law, Network};
use super::outcome::{Place, Quantity, Solution, View};
use super::parts::{Builder, Built, Kind, Piece, split};
use super::passive::{Point, State};
use super::rails::Rails;

impl Network {
    /// What each of `junctions` (branch numbers) sees in `solution`: `None` where that is not finite (fed by
    /// current sources only, floating, open) or its part was not evaluated.
    pub fn views(&self, solution: &Solution, junctions: &[u32]) -> Vec<Option<View>> {
        let rails = Rails::new(self);
        let mut builder = Builder::new(self, &rails);
        let mut wanted = vec![false; self.branches.len()];
        for &n in junctions {
            wanted[n as usize] = true;
        }
        let mut views = vec![None; self.branches.len()];
        for piece in split(self, &rails).iter().filter(|p| p.branches.iter().any(|&n| wanted[n as usize])) {
            match piece.kind {
                Kind::Passive => passive(self, &rails, &mut builder, piece, solution, &wanted, &mut views),
                Kind::General => super::general::views(self, &rails, piece, solution, &wanted, &mut views),
                Kind::Unknown => {}
            }
        }
        junctions.iter().map(|&n| views[n as usize]).collect()
    }
}

fn passive(
    network: &Network,
    rails: &Rails,
    builder: &mut Builder<'_>,
    piece: &Piece,
    solution: &Solution,
    wanted: &[bool],
    views: &mut [Option<View>],
) {
    let built = builder.build(piece);
    let Some(guide) = guide(rails, piece, &built, solution) else { return };
    let mut solve = Solve::new(&built.part, &guide);
    solve.run();
    let mut tie_node = vec![NONE; built.diodes.len()];
    for (node, &tie) in solve.forest.up.iter().enumerate().filter(|(_, tie)| **tie != NONE) {
        tie_node[solve.tie_diode[tie as usize] as usize] = node as u32;
    }
    for (k, &branch) in built.diodes.iter().enumerate().filter(|(_, b)| wanted[**b as usize]) {
        let Law::Junction(junction) = network.branches[branch as usize].law else { continue };
        let diode = &built.part.diodes[k];
        views[branch as usize] = match diode.level(guide.states[k]) {
            None => blocking(&mut solve, diode, solution.voltages[branch as usize]),
            Some(level) => {
                let Quantity::Known(i) = solution.currents[branch as usize] else { continue };
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
