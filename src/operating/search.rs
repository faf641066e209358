//! Which single source would change a diode's state: follows every source of its part, and tells what was found.

use super::assemble::{Owner, Setting};
use super::case::state;
use super::evaluate::Solved;
use super::excerpt::Excerpt;
use super::flip::{Way, follow};
use super::result::Flip;
use super::speaker::apart;
use crate::circuit::{ElementId, State};
use crate::complementarity::{Law, Network};

/// How far a source is followed: ten times its value, both ways.
const FURTHEST: f64 = 10.0;
/// Most sources that are followed.
const MOST_SOURCES: usize = 32;
/// Most work of one search: solves times branches.
const MOST_WORK: usize = 10_000_000;

/// What following the sources gave.
#[derive(Default)]
pub(crate) struct Search {
    pub flips: Vec<Flip>,
    followed: usize,
    is_cut_off: bool,
}

impl Search {
    pub fn sentence(&self, state: State) -> String {
        let tail = if self.is_cut_off { " The search was cut off: there may be nearer values." } else { "" };
        let list: Vec<String> = self.flips.iter().take(4).map(Flip::words).collect();
        match (list.is_empty(), self.followed) {
            (true, 0) if self.is_cut_off => {
                "Its part is too large to follow what single sources would change.".into()
            }
            (true, 0) => "Its part has no source that is not at zero, so there is none to follow.".into(),
            (true, _) if self.is_cut_off => {
                format!("No single source was seen to change the state from {}.{tail}", state.word())
            }
            (true, _) => "No single source changes the state within ten times its value.".into(),
            (false, _) => format!("One source alone changes the state: {}.{tail}", list.join("; ")),
        }
    }
}

impl Flip {
    /// `V1 from 5 V to 700 mV makes it block`.
    fn words(&self) -> String {
        let unit = if self.is_current { "A" } else { "V" };
        let becomes = match self.state {
            State::Conducting => "makes it conduct",
            State::Blocking => "makes it block",
            State::Breakdown => "makes it break down",
            State::Open => "leaves it open",
            State::NotEvaluated => "leaves no consistent state",
        };
        let (from, to) = apart(self.from, self.to, unit);
        format!("{} from {from} to {to} {becomes}", self.source)
    }
}

/// Follows every source of the diode's part, both ways to ten times its value.
pub(crate) fn flips(setting: &Setting<'_>, solved: &Solved, element: ElementId) -> Search {
    let mut search = Search::default();
    let junction = solved.assembly.branch[element.index()];
    let Some(excerpt) = Excerpt::around(&solved.assembly.network, &solved.outcome, junction) else {
        return search;
    };
    let Some(target) = excerpt.number(junction) else { return search };
    let all = sources(&excerpt.network);
    let budget = MOST_WORK / excerpt.network.branches.len().max(1);
    let each = budget / (2 * all.len().clamp(1, MOST_SOURCES));
    for (number, from, is_current) in all {
        let Some(source) = name(setting, solved, excerpt.original[number as usize]) else { continue };
        if search.followed == MOST_SOURCES || each < 4 {
            search.is_cut_off = true;
            break;
        }
        search.followed += 1;
        for limit in [FURTHEST * from, -FURTHEST * from] {
            match follow(&excerpt.network, target, number, from, limit, each) {
                Way::Never => {}
                Way::Lost => search.is_cut_off = true,
                Way::Changes { at, place, nearest } => {
                    search.is_cut_off |= !nearest;
                    let state = state(place);
                    search.flips.push(Flip { source: source.clone(), is_current, from, to: at, state });
                }
            }
        }
    }
    let distance = |f: &Flip| ((f.to - f.from) / f.from).abs();
    search.flips.sort_by(|a, b| distance(a).total_cmp(&distance(b)));
    search
}

/// Sources that are not zero, with their values.
fn sources(network: &Network) -> Vec<(u32, f64, bool)> {
    let value = |law: &Law| match law {
        Law::Voltage(level) => Some((level.value, false)),
        Law::Current(level) => Some((level.value, true)),
        _ => None,
    };
    let branches = network.branches.iter().enumerate();
    let sources = branches.filter_map(|(n, b)| value(&b.law).map(|(value, kind)| (n as u32, value, kind)));
    sources.filter(|s| s.1 != 0.0 && s.1.is_finite()).collect()
}

fn name(setting: &Setting<'_>, solved: &Solved, branch: u32) -> Option<String> {
    match *solved.assembly.owner.get(branch as usize)? {
        Owner::Element(id) => {
            setting.plan.sources.binary_search(&id).ok().map(|_| setting.circuit.element_name(id))
        }
        Owner::Supply(n) => Some(setting.circuit.node_name(setting.plan.supplies.get(n)?.node)),
    }
}
