//! Diodes whose state could not be found because the model of something around them is not known.

use super::{Check, Evidence, Group, Rule, in_cases, list};
use crate::circuit::ElementId;
use crate::finding::{Finding, Severity};
use crate::operating::{Case, Operating, Verdict};
use std::collections::{BTreeMap, BTreeSet};

pub const RULE: Rule = Rule {
    name: "not-evaluated",
    group: Group::States,
    severity: Severity::Note,
    also: None,
    summary: "diodes could not be evaluated, since what is around them is not known to the model",
    why: "An element whose law is not known (a transistor, an unknown part, a value that could not be read) leaves \
          everything it couples to undetermined. Their wiring is checked all the same.",
    remedy: "Say how a transistor or switch stands (`*@ hold Q1 on`), hold a supply node that the netlist does \
             not feed (`*@ supply +5V 5`), or give the missing model.",
    source: None,
    failing: "tide gauge buoy: siren driver\n\
              VCC vcc 0 5\n\
              R1 vcc a 1k\n\
              D1 a b DSW\n\
              XIC b vcc 0 SIREN\n\
              .model DSW D(IS=2.5n N=1.75)\n\
              .subckt SIREN p v g\n\
              B1 p g I=V(v)/1000\n\
              R1 v g 1meg\n\
              .ends\n",
    passing: "tide gauge buoy: siren driver\n\
              VCC vcc 0 5\n\
              R1 vcc a 1k\n\
              D1 a b DSW\n\
              R2 b 0 1k\n\
              .model DSW D(IS=2.5n N=1.75)\n",
    check: Check::States(check),
};

/// Diodes with one reason, and the conditions in which it holds for the first of them.
#[derive(Default)]
struct Lot {
    diodes: BTreeSet<ElementId>,
    cases: Vec<usize>,
}

fn check(evidence: &Evidence<'_>, operating: &Operating) -> Vec<Finding> {
    let mut groups: BTreeMap<String, Lot> = BTreeMap::new();
    for (number, case) in operating.cases.iter().enumerate() {
        // a part without a solution, or with one that does not check, is told as such
        for diode in case.solutions.first().into_iter().flat_map(|s| &s.diodes).filter(|d| d.unmodelled) {
            let why = diode.not_evaluated.as_deref().unwrap_or_default();
            let group = groups.entry(why.to_owned()).or_default();
            if group.cases.last() != Some(&number) {
                group.cases.push(number);
            }
            group.diodes.insert(diode.element);
        }
    }
    let told = groups.iter().filter_map(|(why, g)| judge(evidence, operating, why, g));
    let mut findings: Vec<Finding> = told.collect();
    if findings.is_empty() {
        findings.extend(nothing(evidence, operating));
    }
    findings.sort_by_key(|f| f.span);
    findings
}

/// A circuit without a diode to name, of which nothing at all was solved in any condition; where something could not
/// be read, that has been told.
fn nothing(evidence: &Evidence<'_>, operating: &Operating) -> Option<Finding> {
    let is_blank = |case: &Case| case.verdict == Verdict::Partial && case.solves == 0;
    if operating.cases.is_empty() || !operating.cases.iter().all(is_blank) {
        return None;
    }
    let causes = &operating.cases.first()?.causes;
    let cause = causes.iter().find(|c| c.verdict == Verdict::Partial && !c.elements.is_empty())?;
    let first = *cause.elements.iter().min()?;
    let was_read = |id: &ElementId| !b"RCLVID".contains(&evidence.circuit.element(*id).letter);
    if evidence.circuit.incomplete || !cause.elements.iter().all(was_read) {
        return None;
    }
    let message = format!("nothing of this circuit could be evaluated: {}", cause.text);
    Some(evidence.about(&RULE, first, message).label("not modelled").help(RULE.remedy))
}

fn judge(evidence: &Evidence<'_>, operating: &Operating, why: &str, group: &Lot) -> Option<Finding> {
    let first = *group.diodes.first()?;
    let names: Vec<String> = group.diodes.iter().map(|&id| evidence.name(id)).collect();
    let verb = if names.len() == 1 { "is" } else { "are" };
    let mut message = format!("{} {verb} not evaluated", list(&names));
    if !why.is_empty() {
        message.push_str(&format!(": {why}"));
    }
    message.push_str(&in_cases(operating, &group.cases));
    let mut finding = evidence.about(&RULE, first, message).label("state not evaluated");
    finding.subjects.extend(names.into_iter().skip(1));
    Some(finding.help(RULE.remedy))
}
