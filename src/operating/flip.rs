//! Which value of one source changes a junction's place, every other source keeping its own: follows the solution
//! as the source moves. Between two changes everything is linear in the source, so two solves predict the next
//! change, and solves on both sides of it confirm it.

use crate::complementarity::{Branch, Law, Level, Network, Place, Quantity, Solution, Verdict};

/// Distance from a change at which its two sides are solved, as a share of the way.
const ASIDE: f64 = 1e-9;

/// What was found on the way to the limit.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) enum Way {
    /// The place stays.
    Never,
    /// It changes here; `Unknown` where nothing consistent is beyond. Where the solves ran out among changes of
    /// other junctions it may not be the `nearest` such value.
    Changes { at: f64, place: Place, nearest: bool },
    /// The solves ran out, and at the limit the place is what it was.
    Lost,
}

/// Solves kept back for a plain bisection, in case the way holds too many changes of other junctions.
const RESERVE: usize = 40;

/// Follows `junction` as the level of branch `source` goes from `from` to `limit`, with at most `budget` solves.
pub(crate) fn follow(
    network: &Network,
    junction: u32,
    source: u32,
    from: f64,
    limit: f64,
    budget: usize,
) -> Way {
    let mut walker = Walker {
        network: network.clone(),
        source: source as usize,
        budget,
        reserve: RESERVE.min(budget / 2),
        whole: limit - from,
    };
    walker.go(junction as usize, from, limit).unwrap_or(Way::Lost)
}

/// All places at one value of the source; `None` where nothing is consistent.
struct Stop {
    at: f64,
    solution: Option<Solution>,
}

impl Stop {
    fn place(&self, junction: usize) -> Place {
        self.solution.as_ref().and_then(|s| s.places.get(junction)).copied().unwrap_or(Place::Unknown)
    }

    fn agrees(&self, other: &Stop) -> bool {
        match (&self.solution, &other.solution) {
            (Some(a), Some(b)) => a.places == b.places,
            (None, None) => true,
            _ => false,
        }
    }
}

struct Walker {
    network: Network,
    source: usize,
    /// Solves that are left.
    budget: usize,
    /// Of these, kept back for now.
    reserve: usize,
    whole: f64,
}

impl Walker {
    /// Solves at one value; `None` where the budget is spent.
    fn stop(&mut self, at: f64) -> Option<Stop> {
        if self.budget <= self.reserve {
            return None;
        }
        self.budget -= 1;
        let level = Level { value: at, exact: false };
        let branch = self.network.branches.get_mut(self.source)?;
        match &mut branch.law {
            Law::Voltage(own) | Law::Current(own) => *own = level,
            _ => return None,
        }
        let mut outcome = self.network.solve();
        let stands = !matches!(outcome.verdict, Verdict::None | Verdict::Unverified | Verdict::Partial);
        let solution = if stands && !outcome.solutions.is_empty() {
            Some(outcome.solutions.swap_remove(0))
        } else {
            None
        };
        Some(Stop { at, solution })
    }

    fn go(&mut self, junction: usize, from: f64, limit: f64) -> Option<Way> {
        let mut here = self.stop(from)?;
        let start = here.place(junction);
        let far = self.stop(limit)?;
        let beyond = far.place(junction);
        if let Some(way) = self.walk(junction, &mut here, &far) {
            return Some(way);
        }
        self.reserve = 0;
        if beyond == start { None } else { self.halve(junction, start, here.at, far) }
    }

    /// From change to change; `None` where the budget is spent, `here` being as far as it came.
    fn walk(&mut self, junction: usize, here: &mut Stop, far: &Stop) -> Option<Way> {
        let start = here.place(junction);
        // the values for which one set of places holds are an interval
        while !here.agrees(far) {
            let at = self.next_change(here, far.at)?;
            let beyond = self.stop(at + ASIDE * self.whole)?;
            if beyond.place(junction) != start {
                return Some(Way::Changes { at, place: beyond.place(junction), nearest: true });
            }
            if (far.at - beyond.at) * self.whole <= 0.0 {
                break;
            }
            *here = beyond;
        }
        let place = far.place(junction);
        Some(if place == start { Way::Never } else { Way::Changes { at: far.at, place, nearest: true } })
    }

    /// Some value at which the place changes, between one where it has not and one where it has.
    fn halve(&mut self, junction: usize, start: Place, mut inside: f64, mut outside: Stop) -> Option<Way> {
        while (outside.at - inside).abs() > ASIDE * self.whole.abs() {
            let Some(middle) = self.stop(0.5 * (inside + outside.at)) else { break };
            if middle.place(junction) == start { inside = middle.at } else { outside = middle }
        }
        let at = 0.5 * (inside + outside.at);
        Some(Way::Changes { at, place: outside.place(junction), nearest: false })
    }

    /// The next value at which any place changes.
    fn next_change(&mut self, here: &Stop, limit: f64) -> Option<f64> {
        let mut step = limit - here.at;
        let mut outside = limit;
        let mut second = None;
        while step.abs() > ASIDE * self.whole.abs() {
            step /= 8.0;
            let stop = self.stop(here.at + step)?;
            if stop.agrees(here) {
                second = Some(stop);
                break;
            }
            outside = stop.at;
        }
        // no room at all: the change is where we stand
        let Some(second) = second else { return Some(here.at) };
        if let Some(predicted) = self.predict(here, &second, outside) {
            let before = self.stop(predicted - ASIDE * self.whole)?;
            let after = self.stop(predicted + ASIDE * self.whole)?;
            if before.agrees(here) && !after.agrees(here) {
                return Some(predicted);
            }
        }
        self.bisect(here, second.at, outside)
    }

    /// Where the first of the linear slacks runs out.
    fn predict(&self, here: &Stop, second: &Stop, outside: f64) -> Option<f64> {
        let (a, b) = (here.solution.as_ref()?, second.solution.as_ref()?);
        let mut nearest: Option<f64> = None;
        for (number, branch) in self.network.branches.iter().enumerate() {
            for (first, then) in slacks(branch, a, number).into_iter().zip(slacks(branch, b, number)) {
                let (Some(first), Some(then)) = (first, then) else { continue };
                let at = here.at + (second.at - here.at) * first / (first - then);
                let is_ahead = (at - second.at) * self.whole > 0.0 && (outside - at) * self.whole >= 0.0;
                if is_ahead && nearest.is_none_or(|n| (n - at) * self.whole > 0.0) {
                    nearest = Some(at);
                }
            }
        }
        nearest
    }

    fn bisect(&mut self, here: &Stop, mut inside: f64, mut outside: f64) -> Option<f64> {
        while (outside - inside).abs() > 0.1 * ASIDE * self.whole.abs() {
            let middle = 0.5 * (inside + outside);
            if self.stop(middle)?.agrees(here) { inside = middle } else { outside = middle }
        }
        Some(0.5 * (inside + outside))
    }
}

/// What a junction has left until its place changes: amperes while it carries, volts to each level while it blocks.
fn slacks(branch: &Branch, solution: &Solution, number: usize) -> [Option<f64>; 2] {
    let Law::Junction(junction) = branch.law else { return [None, None] };
    let current = solution.currents.get(number).copied().and_then(Quantity::known);
    let voltage = solution.voltages.get(number).copied().and_then(Quantity::known);
    match solution.places.get(number) {
        Some(Place::Conducting | Place::Breakdown) => [current, None],
        Some(Place::Blocking) => [
            voltage.map(|v| junction.forward.value - v),
            voltage.zip(junction.reverse).map(|(v, reverse)| v + reverse.value),
        ],
        _ => [None, None],
    }
}
