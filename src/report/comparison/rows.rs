//! What differs, put together over the conditions: one row for each flip and for each quantity that moves.

use crate::circuit::State;
use crate::finding::{Finding, compact, list, quantity};
use crate::operating::Verdict;
use crate::review::{Comparison, Move, Record, WiringChange};

/// Conditions named in one row.
const NAMES: usize = 3;

/// Diodes named in one row.
const DIODES: usize = 4;

/// A flip, the diodes that do it alike, and the conditions in which it shows.
pub(super) struct Flip<'a> {
    diodes: Vec<&'a str>,
    pub old: String,
    pub new: String,
    pub cases: Vec<&'a str>,
    pub why: &'a str,
}

pub(super) fn flips(comparison: &Comparison) -> Vec<Flip<'_>> {
    let mut flips: Vec<Flip<'_>> = Vec::new();
    let mut known = std::collections::BTreeMap::new();
    for change in &comparison.states {
        let key = (&change.diode, change.old, change.new);
        let at = *known.entry(key).or_insert(flips.len());
        match flips.get_mut(at) {
            Some(flip) => flip.cases.push(&change.case),
            None => flips.push(Flip {
                diodes: vec![&change.diode],
                old: state(change.old, change.old_current),
                new: state(change.new, change.new_current),
                cases: vec![&change.case],
                why: &change.why,
            }),
        }
    }
    alike(flips.into_iter())
}

/// Diodes that flip alike for the same reason stand together: those of many instances mostly do.
fn alike<'a>(flips: impl Iterator<Item = Flip<'a>>) -> Vec<Flip<'a>> {
    let mut rows: Vec<Flip<'a>> = Vec::new();
    let mut known = std::collections::BTreeMap::new();
    for flip in flips {
        let name = flip.diodes.first().copied().unwrap_or("");
        let why = flip.why.replace(&format!(" {name} "), " it ");
        let at =
            *known.entry((flip.old.clone(), flip.new.clone(), flip.cases.clone(), why)).or_insert(rows.len());
        match rows.get_mut(at) {
            Some(row) => row.diodes.extend(flip.diodes),
            None => rows.push(flip),
        }
    }
    rows
}

impl Flip<'_> {
    /// `D1`, `X1:D1, X2:D1 and 6 more`
    pub fn names(&self) -> String {
        list(&self.diodes, DIODES)
    }
}

/// `conducting 4.3 mA`, `blocking`
fn state(state: Option<State>, current: Option<f64>) -> String {
    match (state, current) {
        (None, _) => "one of several states".into(),
        (Some(state @ (State::Conducting | State::Breakdown)), Some(current)) => {
            format!("{} {}", state.word(), quantity(current.abs(), "A"))
        }
        (Some(state), _) => state.word().to_owned(),
    }
}

/// A current or voltage that moves, in the condition in which it moves most.
pub(super) struct Moved<'a> {
    pub name: &'a str,
    pub what: &'static str,
    pub unit: &'static str,
    pub old: f64,
    pub new: f64,
    pub cases: Vec<&'a str>,
}

/// The largest changes first.
pub(super) fn moves(comparison: &Comparison) -> Vec<Moved<'_>> {
    let mut rows: Vec<Moved<'_>> = Vec::new();
    let currents = comparison.currents.iter().map(|m| (m, "current", "A"));
    let voltages = comparison.voltages.iter().map(|m| (m, "voltage", "V"));
    let mut known = std::collections::BTreeMap::new();
    for (change, what, unit) in currents.chain(voltages) {
        let at = *known.entry((what, change.name.as_str())).or_insert(rows.len());
        if at == rows.len() {
            let Move { name, case, old, new } = change;
            rows.push(Moved { name, what, unit, old: *old, new: *new, cases: vec![case] });
        } else if let Some(row) = rows.get_mut(at) {
            // the condition of the largest change stands first and gives the numbers
            if share(change.old, change.new) > share(row.old, row.new) {
                (row.old, row.new) = (change.old, change.new);
                row.cases.insert(0, &change.case);
            } else {
                row.cases.push(&change.case);
            }
        }
    }
    rows.sort_by(|a, b| share(b.old, b.new).total_cmp(&share(a.old, a.new)));
    rows
}

fn share(old: f64, new: f64) -> f64 {
    (old - new).abs() / old.abs().max(new.abs())
}

impl Moved<'_> {
    /// `+12 %`, `× 3.2`, `÷ 3.6`, `reversed`
    pub fn change(&self) -> String {
        let ratio = self.new / self.old;
        if self.old == 0.0 {
            return "from nothing".into();
        }
        if self.new == 0.0 {
            return "to nothing".into();
        }
        if ratio < 0.0 {
            return "reversed".into();
        }
        if ratio >= 2.0 {
            return format!("× {}", compact(ratio, ""));
        }
        if ratio < 0.5 {
            return format!("÷ {}", compact(1.0 / ratio, ""));
        }
        format!("{:+.0} %", 100.0 * (ratio - 1.0))
    }
}

/// `nominal, VIN=9 and 3 more`
pub(super) fn conditions(cases: &[&str]) -> String {
    if cases.len() <= NAMES {
        return cases.join(", ");
    }
    format!("{} and {} more", cases[..NAMES - 1].join(", "), cases.len() - NAMES + 1)
}

/// The findings of a record, errors first.
pub(super) fn worst_first(record: &Record) -> Vec<&Finding> {
    let mut findings: Vec<&Finding> = record.findings.iter().collect();
    findings.sort_by_key(|f| std::cmp::Reverse(f.severity));
    findings
}

/// `D1 is turned round; …`, `R7: was R1`
pub(super) fn wiring(comparison: &Comparison) -> Vec<String> {
    let line = |change: &WiringChange| {
        let colon = if change.what.starts_with("is ") { "" } else { ":" };
        format!("{}{colon} {}", change.element, change.what)
    };
    comparison.wiring.iter().map(line).collect()
}

/// `nominal: unique, now none`
pub(super) fn verdicts(comparison: &Comparison) -> Vec<String> {
    let word = Verdict::word;
    let line = |change: &crate::review::VerdictChange| match (change.old, change.new) {
        (Some(old), Some(new)) => format!("condition {}: {} → {}", change.case, word(old), word(new)),
        (None, Some(new)) => format!("condition {} is new: {}", change.case, word(new)),
        (Some(_), None) => format!("condition {} is no longer examined", change.case),
        (None, None) => change.case.clone(),
    };
    comparison.verdicts.iter().map(line).collect()
}

/// `D1: trust good → poor (nominal)`
pub(super) fn trust(comparison: &Comparison) -> Vec<String> {
    let mut rows: Vec<(String, Vec<&str>)> = Vec::new();
    let mut known = std::collections::BTreeMap::new();
    for change in &comparison.trust {
        let at = *known.entry((&change.diode, change.old, change.new)).or_insert(rows.len());
        match rows.get_mut(at) {
            Some((_, cases)) => cases.push(&change.case),
            None => {
                let words = (change.old.word(), change.new.word());
                let head = format!("{}: trust {} → {}", change.diode, words.0, words.1);
                rows.push((head, vec![&change.case]));
            }
        }
    }
    rows.into_iter().map(|(head, cases)| format!("{head} ({})", conditions(&cases))).collect()
}
