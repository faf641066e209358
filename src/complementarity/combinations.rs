//! Every set of states of a part's junctions that agrees with its linear rest, tried combination by combination,
//! block by block. What each combination looks like is `ports`'s; one without full rank is `continuum`'s.

use super::outcome::Place;
use super::ports::{Ports, Trial};
use nalgebra::{DMatrix, DVector};

/// Work spent on the combinations of one block, in multiplications.
const WORK: u64 = 50_000_000;
/// Combinations without full rank tried at most: each costs many times an ordinary one.
const MOST_SINGULAR: usize = 300;
/// Combinations up to which all are tried whatever the block is like.
const FEW: u64 = 16;
/// Share of the largest eigenvalue that is rounding.
const ROUNDING: f64 = 1e-11;
/// Sets kept at most while blocks are put together.
const MOST_KEPT: usize = 64;

impl Ports {
    fn choices(&self, k: usize) -> u64 {
        if self.laws[k].reverse.is_some() { 3 } else { 2 }
    }

    /// Number of combinations of states in some junctions.
    fn combinations(&self, block: &[usize]) -> u64 {
        block.iter().fold(1u64, |n, &k| n.saturating_mul(self.choices(k)))
    }

    /// Consistent sets, and whether all combinations were tried. Junctions are taken in blocks that only listen to
    /// earlier ones, so that combinations multiply within a block alone.
    pub(super) fn consistent(&self) -> (Vec<Trial>, bool) {
        let count = self.laws.len();
        let mut sets = vec![Trial::start(count)];
        let mut complete = true;
        let blocks = self.blocks();
        for block in &blocks {
            let mut more = Vec::new();
            for set in &sets {
                complete &= self.extend(set, block, &mut more);
                complete &= more.len() <= MOST_KEPT;
                more.truncate(MOST_KEPT);
            }
            sets = more;
        }
        (sets, complete)
    }

    /// Every way in which a block's junctions can join a set of earlier ones.
    fn extend(&self, set: &Trial, block: &[usize], more: &mut Vec<Trial>) -> bool {
        let all = self.combinations(block);
        if all > FEW
            && let Some(one) = self.only(set, block)
        {
            more.push(one);
            return true;
        }
        // the work of one combination is a dense solve
        let most = (WORK / (block.len() as u64 + 1).pow(3)).max(1);
        let mut found: Vec<Trial> = Vec::new();
        let mut singular = 0;
        for number in 0..all.min(most) {
            if singular > MOST_SINGULAR {
                return self.give_up(set, block, found, more);
            }
            let mut rest = number;
            let mut places = set.places.clone();
            for &k in block {
                let choice = rest % self.choices(k);
                rest /= self.choices(k);
                places[k] = [Place::Blocking, Place::Conducting, Place::Breakdown][choice as usize];
            }
            if let Some(trial) = self.attempt(set, block, &places, &mut singular) {
                self.keep(&mut found, trial);
            }
        }
        if all > most {
            return self.give_up(set, block, found, more);
        }
        more.append(&mut found);
        true
    }

    /// The one way, where there cannot be another: a rest that only takes power in (v·i never falls as `a` moves) beside
    /// junctions that do the same has a convex set of solutions (Minty, Duke Math. J. 29, 1962), so a solution in
    /// which every inequality is strict and the equations have full rank is alone.
    fn only(&self, set: &Trial, block: &[usize]) -> Option<Trial> {
        if !self.takes_power(block) {
            return None;
        }
        let mut one = self.pivot(set, block).filter(|one| self.is_strict(one, block))?;
        one.open.splice(0..0, set.open.iter().cloned());
        Some(one)
    }

    fn takes_power(&self, block: &[usize]) -> bool {
        let pick =
            |m: &DMatrix<f64>| DMatrix::from_fn(block.len(), block.len(), |r, c| m[(block[r], block[c])]);
        let (v, i) = (pick(&self.v_of_a), pick(&self.i_of_a));
        let taken = -(v.transpose() * &i + i.transpose() * &v);
        let shares = taken.symmetric_eigenvalues();
        shares.min() >= -ROUNDING * shares.amax()
    }

    /// Not all combinations were tried: what was found stands, or what assumed states find.
    fn give_up(&self, set: &Trial, block: &[usize], mut found: Vec<Trial>, more: &mut Vec<Trial>) -> bool {
        if found.is_empty() {
            found.extend(self.pivot(set, block));
        }
        more.append(&mut found);
        false
    }

    /// One set by assumed states, where there are too many combinations to try: all that fail change, then the first
    /// that fails (Murty 1974).
    fn pivot(&self, set: &Trial, block: &[usize]) -> Option<Trial> {
        for start in [Place::Conducting, Place::Blocking] {
            let mut places = set.places.clone();
            block.iter().for_each(|&k| places[k] = start);
            for round in 0..20 + 4 * block.len() {
                let a = self.solve_block(set, block, &places)?;
                let (v, i) = self.at(&a);
                let (volts, amperes) = self.room(&v, &i);
                let wrong: Vec<(usize, Place)> = block
                    .iter()
                    .filter_map(|&k| self.better(k, places[k], v[k], i[k], volts, amperes).map(|p| (k, p)))
                    .collect();
                if wrong.is_empty() {
                    return self.judged(a, block, &places);
                }
                let one = if round < 20 { wrong.len() } else { 1 };
                wrong.iter().take(one).for_each(|&(k, place)| places[k] = place);
            }
        }
        None
    }

    /// The place that a junction should have instead, if its assumption fails.
    fn better(&self, k: usize, place: Place, v: f64, i: f64, volts: f64, amperes: f64) -> Option<Place> {
        let law = &self.laws[k];
        let inner = v - law.series * i;
        match place {
            Place::Conducting if i < -amperes => Some(Place::Blocking),
            Place::Breakdown if i > amperes => Some(Place::Blocking),
            Place::Blocking if inner > law.forward.value + volts => Some(Place::Conducting),
            Place::Blocking if law.reverse.is_some_and(|r| inner < -r.value - volts) => {
                Some(Place::Breakdown)
            }
            _ => None,
        }
    }

    /// Junctions that listen to each other, each block after those that it listens to.
    fn blocks(&self) -> Vec<Vec<usize>> {
        let count = self.laws.len();
        let mut graph = petgraph::graph::DiGraph::<(), (), u32>::with_capacity(count, count * count);
        let nodes: Vec<_> = (0..count).map(|_| graph.add_node(())).collect();
        for j in 0..count {
            let largest = self.v_of_a.row(j).amax();
            for k in (0..count).filter(|&k| k != j) {
                if self.v_of_a[(j, k)].abs() > 1e-12 * largest {
                    graph.add_edge(nodes[k], nodes[j], ());
                }
            }
        }
        // listed so that what is listened to comes last
        let mut blocks: Vec<Vec<usize>> = petgraph::algo::kosaraju_scc(&graph)
            .into_iter()
            .map(|block| block.into_iter().map(|n| n.index()).collect())
            .collect();
        blocks.iter_mut().for_each(|b: &mut Vec<usize>| b.sort_unstable());
        blocks.reverse();
        blocks
    }

    /// Keeps a set that is not one of those found.
    fn keep(&self, found: &mut Vec<Trial>, trial: Trial) {
        let inside = |point: &Trial, set: &Trial| match &set.open[..] {
            [] => self.same(&point.currents, &set.currents),
            [(direction, room), ..] => {
                let away = &point.currents - &set.currents;
                let t = away.dot(direction) / direction.norm_squared();
                let reach = 1e-7 * (1.0 + t.abs());
                self.same(&point.currents, &(&set.currents + direction * t))
                    && t >= room.low - reach
                    && t <= room.high + reach
            }
        };
        if found.iter().any(|other| inside(&trial, other)) {
            return;
        }
        found.retain(|other| !(other.open.is_empty() && inside(other, &trial)));
        found.push(trial);
    }

    fn same(&self, a: &DVector<f64>, b: &DVector<f64>) -> bool {
        let size = a.amax().max(b.amax()).max(self.size() * 1e-3);
        (a - b).amax() <= 1e-8 * size
    }

    fn attempt(&self, set: &Trial, block: &[usize], places: &[Place], singular: &mut usize) -> Option<Trial> {
        let mut trial = match self.solve_block(set, block, places) {
            Some(a) => self.judged(a, block, places)?,
            None => {
                *singular += 1;
                let (matrix, right) = self.block_rows(set, block, places);
                self.continuum(&set.currents, &matrix, &right, block, places)?
            }
        };
        trial.open.splice(0..0, set.open.iter().cloned());
        Some(trial)
    }

    /// Whether every inequality holds with room to spare.
    fn is_strict(&self, trial: &Trial, block: &[usize]) -> bool {
        let (v, i) = self.at(&trial.currents);
        let (volts, amperes) = self.room(&v, &i);
        block.iter().all(|&k| {
            let law = &self.laws[k];
            let inner = v[k] - law.series * i[k];
            match trial.places[k] {
                Place::Conducting => i[k] > amperes,
                Place::Breakdown => i[k] < -amperes,
                _ => {
                    inner < law.forward.value - volts && law.reverse.is_none_or(|r| inner > -r.value + volts)
                }
            }
        })
    }

    /// The set, if every inequality holds.
    pub(super) fn judged(&self, a: DVector<f64>, block: &[usize], places: &[Place]) -> Option<Trial> {
        let (v, i) = self.at(&a);
        let (volts, amperes) = self.room(&v, &i);
        let mut found = places.to_vec();
        for &k in block {
            let (law, place) = (&self.laws[k], &places[k]);
            let inner = v[k] - law.series * i[k];
            let reverse = law.reverse.map_or(f64::INFINITY, |r| r.value);
            let holds = match place {
                Place::Conducting => i[k] >= -amperes,
                Place::Breakdown => i[k] <= amperes,
                _ => inner <= law.forward.value + volts && inner >= -reverse - volts,
            };
            if !holds || !inner.is_finite() {
                return None;
            }
            found[k] = if i[k].abs() <= amperes { Place::Blocking } else { *place };
        }
        Some(Trial { currents: a, places: found, open: Vec::new() })
    }
}
