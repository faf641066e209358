//! One independent part made of positive resistances, currents and junctions, its fixed voltages already folded
//! into groups of nodes: the monotone network whose solutions are sought. Group 0 is the reference.

use super::double_double::Dd;

/// v = u(p) − u(q) + delta, i = v/ohms.
#[derive(Debug, Clone, Copy)]
pub(super) struct Resistor {
    pub(super) p: u32,
    pub(super) q: u32,
    pub(super) delta: Dd,
    pub(super) ohms: f64,
}

/// A junction between groups; `reverse` is infinite where it never breaks down.
#[derive(Debug, Clone, Copy)]
pub(super) struct Diode {
    pub(super) p: u32,
    pub(super) q: u32,
    pub(super) delta: Dd,
    pub(super) forward: f64,
    pub(super) reverse: f64,
    pub(super) series: f64,
}

impl Diode {
    /// Inner voltage level that its state pins; `None` while blocking.
    pub(super) fn level(&self, state: State) -> Option<f64> {
        match state {
            State::Forward => Some(self.forward),
            State::Reverse => Some(-self.reverse),
            State::Blocking => None,
        }
    }

    /// Largest voltage that takes part in its law, for tolerances.
    pub(super) fn scale(&self, potentials: &[Dd]) -> f64 {
        potentials[self.p as usize].abs()
            + potentials[self.q as usize].abs()
            + self.delta.abs()
            + self.forward
    }
}

/// What is assumed of a junction.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum State {
    Forward,
    Blocking,
    Reverse,
}

/// The part.
#[derive(Debug, Clone, Default)]
pub(super) struct Passive {
    /// Groups, the reference included.
    pub(super) nodes: usize,
    pub(super) resistors: Vec<Resistor>,
    pub(super) diodes: Vec<Diode>,
    /// Current that sources push into each group.
    pub(super) injected: Vec<Dd>,
}

/// A point that satisfies every law of the part.
#[derive(Debug, Clone)]
pub(super) struct Point {
    pub(super) potentials: Vec<Dd>,
    /// Current of each diode.
    pub(super) currents: Vec<f64>,
    pub(super) states: Vec<State>,
}

/// Typical sizes of a part, to choose small numbers against.
#[derive(Debug, Clone, Copy)]
pub(super) struct Scales {
    /// Largest voltage level.
    pub(super) volts: f64,
    /// Greatest and least conductance.
    pub(super) most: f64,
    pub(super) least: f64,
    /// Largest current that sources push in.
    pub(super) pushed: f64,
}

impl Passive {
    /// Whether speed decides how it is solved.
    pub(super) fn is_large(&self) -> bool {
        self.nodes > 2000
    }

    pub(super) fn scales(&self) -> Scales {
        let series = self.diodes.iter().map(|d| d.series).filter(|&s| s > 0.0);
        let conductances = self.resistors.iter().map(|r| r.ohms).chain(series).map(|r| 1.0 / r);
        let (mut most, mut least) = (0.0f64, f64::INFINITY);
        for g in conductances.filter(|g| g.is_finite() && *g > 0.0) {
            (most, least) = (most.max(g), least.min(g));
        }
        let levels = self.resistors.iter().map(|r| r.delta.abs());
        let junctions = self.diodes.iter().map(|d| d.delta.abs().max(d.forward));
        let breakdowns = self.diodes.iter().map(|d| d.reverse).filter(|r| r.is_finite());
        let levels = levels.chain(junctions).chain(breakdowns).fold(0.0, f64::max);
        let pushed = self.injected.iter().skip(1).map(|i| i.abs()).fold(0.0, f64::max);
        if most == 0.0 {
            let typical = if pushed > 0.0 && levels > 0.0 { pushed / levels } else { 1.0 };
            (most, least) = (typical, typical);
        }
        let volts = levels.max(pushed / most);
        Scales { volts: if volts > 0.0 { volts } else { 1.0 }, most, least, pushed }
    }

    /// Current of a resistor; a difference at the last digits of double-double numbers is nothing.
    pub(super) fn current(&self, r: &Resistor, potentials: &[Dd], volts: f64) -> f64 {
        let (p, q) = (potentials[r.p as usize], potentials[r.q as usize]);
        let v = p - q + r.delta;
        if v.abs() <= 1e-22 * (p.abs() + q.abs() + r.delta.abs() + 1e-6 * volts) {
            0.0
        } else {
            v.over(r.ohms).round()
        }
    }

    /// v(p) − v(q) + delta of a diode, at its terminals.
    pub(super) fn across(&self, diode: &Diode, potentials: &[Dd]) -> Dd {
        potentials[diode.p as usize] - potentials[diode.q as usize] + diode.delta
    }

    /// The groups that nothing but sources and junctions of infinite reverse voltage could tie to group 0 are
    /// still tied here: one group of each island, to be pinned.
    pub(super) fn islands(&self) -> Vec<u32> {
        let mut sets = super::forest::Sets::new(self.nodes);
        for (p, q) in self.pairs() {
            sets.union(p, q);
        }
        (1..self.nodes as u32).filter(|&n| sets.find(n) == n).collect()
    }

    /// Ends of resistors, then of diodes.
    pub(super) fn pairs(&self) -> impl Iterator<Item = (u32, u32)> + '_ {
        let resistors = self.resistors.iter().map(|r| (r.p, r.q));
        resistors.chain(self.diodes.iter().map(|d| (d.p, d.q)))
    }
}
