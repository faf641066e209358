//! The conditions: what the sources are, and how each group of conditions that end alike ends.

use super::super::paint::{Ink, Page, clean, wrap};
use super::{WIDTH, all_conditions, paragraph, some_of};
use crate::circuit::Circuit;
use crate::finding::{interval, quantity};
use crate::operating::{Case, Interval, Operating, Solution, Verdict};

/// Sources named in the line of a condition.
const SOURCES_SHOWN: usize = 8;
/// Open quantities listed for a condition.
const OPEN_SHOWN: usize = 12;

/// `nominal: V1 = 12 V, 27 °C; then V1=9, V1=16`
pub(super) fn write(page: &mut Page, circuit: &Circuit, operating: &Operating) {
    let Some((first, others)) = operating.cases.split_first() else { return };
    page.ink(Ink::Strong, &clean(&first.name)).plain(": ").plain(&facts(circuit, first)).end();
    if !others.is_empty() {
        let names: Vec<&str> = others.iter().map(|c| c.name.as_str()).collect();
        paragraph(page, "", &format!("and further {}", some_of(&names)));
    }
}

/// Conditions that end alike: one verdict for the same causes.
pub(super) struct Group<'a> {
    cases: Vec<&'a Case>,
    pub(super) causes: Vec<&'a str>,
}

pub(super) fn groups(operating: &Operating) -> Vec<Group<'_>> {
    let mut groups: Vec<Group<'_>> = Vec::new();
    for case in &operating.cases {
        let mut causes: Vec<&str> = Vec::new();
        for cause in &case.causes {
            if !causes.contains(&cause.text.as_str()) {
                causes.push(&cause.text);
            }
        }
        match groups.iter_mut().find(|g| g.verdict() == case.verdict && g.causes == causes) {
            Some(group) => group.cases.push(case),
            None => groups.push(Group { cases: vec![case], causes }),
        }
    }
    groups
}

impl Group<'_> {
    pub(super) fn verdict(&self) -> Verdict {
        self.cases.first().map_or(Verdict::Unverified, |c| c.verdict)
    }

    /// The verdict, where it holds, what it means, its causes, and what is open.
    pub(super) fn write(&self, page: &mut Page, circuit: &Circuit, all: usize) {
        let Some(first) = self.cases.first() else { return };
        let names: Vec<&str> = self.cases.iter().map(|c| c.name.as_str()).collect();
        let place = match self.cases.len() {
            _ if all == 1 => String::new(),
            count if count == all => format!(" in {}", all_conditions(all)),
            _ => format!(" in {}", some_of(&names)),
        };
        let word = self.verdict().word();
        let sentence = format!("{word}{place}: {}", self.meaning());
        for (n, line) in wrap(&sentence, page.room(WIDTH)).iter().enumerate() {
            match line.strip_prefix(word).filter(|_| n == 0) {
                Some(rest) => page.ink(self.ink(), word).plain(rest).end(),
                None => page.plain(line).end(),
            };
        }
        for cause in &self.causes {
            paragraph(page, "  ", cause);
        }
        for solution in &first.solutions {
            open_quantities(page, circuit, solution);
        }
    }

    fn ink(&self) -> Ink {
        match self.verdict() {
            Verdict::Unique => Ink::Live,
            Verdict::None if self.is_left_to_time() => Ink::Warning,
            Verdict::None | Verdict::Unverified => Ink::Error,
            _ => Ink::Warning,
        }
    }

    /// Whether every cause is one that an instant cannot judge.
    fn is_left_to_time(&self) -> bool {
        let all = self.cases.iter().flat_map(|c| &c.causes);
        let mut none = all.filter(|c| c.verdict == Verdict::None).peekable();
        none.peek().is_some() && none.all(|c| c.left_to_time)
    }

    /// What the verdict means here.
    fn meaning(&self) -> String {
        let worst = self.cases.iter().map(|c| c.residual.relative).fold(0.0, f64::max);
        let sets = self.cases.iter().map(|c| c.solutions.len()).max().unwrap_or(0);
        match self.verdict() {
            Verdict::Unique if worst == 0.0 => {
                "one set of states and no other; it satisfies the circuit laws exactly".into()
            }
            Verdict::Unique => format!(
                "one set of states and no other; put back into the circuit laws, it misses none by more than \
                 {worst:.0e} of the largest term"
            ),
            Verdict::Shared => "every voltage is settled; how some currents divide is open".into(),
            Verdict::Floating => "every current is settled; some potentials are open".into(),
            Verdict::SharedFloating => "how some currents divide and some potentials are open".into(),
            Verdict::Several if self.cases.iter().any(|c| c.truncated) => {
                format!("more than {sets} sets of states satisfy the circuit laws")
            }
            Verdict::Several => format!("{sets} sets of states satisfy the circuit laws"),
            Verdict::Partial => "parts of the circuit could not be evaluated".into(),
            Verdict::None if self.is_left_to_time() => {
                "taken by itself, such a moment sees an inductor as a short circuit, so it judges nothing here"
                    .into()
            }
            Verdict::None => "no set of states satisfies the circuit laws".into(),
            Verdict::Unverified => {
                "the result does not satisfy the circuit laws closely enough to be shown".into()
            }
        }
    }
}

/// `V1 = 12 V, node +5V = 5 V, 27 °C`
fn facts(circuit: &Circuit, case: &Case) -> String {
    let sources = case.sources.iter().map(|&(id, value)| {
        let unit = if circuit.element(id).letter == b'I' { "A" } else { "V" };
        format!("{} = {}", circuit.element_name(id), quantity(value, unit))
    });
    let supplies = case
        .supplies
        .iter()
        .map(|&(node, volts)| format!("node {} = {}", circuit.node_name(node), quantity(volts, "V")));
    let mut facts: Vec<String> = sources.chain(supplies).collect();
    let more = facts.len().saturating_sub(SOURCES_SHOWN);
    if more > 0 {
        facts.truncate(SOURCES_SHOWN);
        facts.push(format!("{more} more sources"));
    }
    facts.push(format!("{} °C", case.temperature));
    clean(&facts.join(", "))
}

/// The nodes and branches whose value is open.
fn open_quantities(page: &mut Page, circuit: &Circuit, solution: &Solution) {
    let nodes = solution.nodes.iter().filter_map(|n| {
        n.voltage.interval().map(|i| (format!("node {}", circuit.node_name(n.node)), i, "V"))
    });
    let branches = solution.branches.iter().filter_map(|b| {
        b.current.interval().map(|i| (format!("current of {}", circuit.element_name(b.element)), i, "A"))
    });
    let open: Vec<_> = nodes.chain(branches).collect();
    for (name, Interval { low, high }, unit) in open.iter().take(OPEN_SHOWN) {
        let text = format!("  open: {}  {}", clean(name), interval(*low, *high, unit));
        page.ink(Ink::Warning, &text).end();
    }
    if open.len() > OPEN_SHOWN {
        page.plain(&format!("  and {} more open", open.len() - OPEN_SHOWN)).end();
    }
}
