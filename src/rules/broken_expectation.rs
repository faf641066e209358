//! An `expect` note that the circuit does not meet.

use super::{About, Check, Claim, Evidence, Found, Outcome, Rule, claims, in_cases};
use crate::circuit::{Expectation, State};
use crate::finding::{Finding, Severity, interval};
use crate::operating::Operating;

pub const RULE: Rule = Rule {
    name: "broken-expectation",
    group: "notes",
    severity: Severity::Error,
    summary: "a diode or a node is not as an `expect` note says",
    why: "Somebody wrote down what this circuit must do, and as it stands it does something else.",
    remedy: "Mend the circuit, or, where the change was meant, the note.",
    source: None,
    failing: "tide gauge buoy: reverse protection\n\
              VBATT batt 0 12.6\n\
              D1 batt bus DSCHOT\n\
              R1 bus 0 120\n\
              *@ made-of DSCHOT schottky\n\
              *@ expect D1 blocking\n\
              .model DSCHOT D\n",
    passing: "tide gauge buoy: reverse protection\n\
              VBATT batt 0 12.6\n\
              D1 batt bus DSCHOT\n\
              R1 bus 0 120\n\
              *@ made-of DSCHOT schottky\n\
              *@ expect D1 conducting 50m..150m\n\
              *@ expect v(bus) 12..12.6\n\
              .model DSCHOT D\n",
    check: Check::States(check),
};

fn check(evidence: &Evidence<'_>, operating: &Operating) -> Vec<Finding> {
    let (claims, mut findings) = claims(evidence);
    for claim in &claims {
        if let Outcome::Broken(found) = claim.judge(evidence, operating, &claims) {
            findings.push(finding(evidence, operating, claim, &found));
        }
    }
    findings
}

fn finding(evidence: &Evidence<'_>, operating: &Operating, claim: &Claim<'_>, found: &[Found]) -> Finding {
    let subject = match claim.about {
        About::Diode(id) => evidence.name(id),
        About::Node(node) => format!("v({})", evidence.circuit.node_name(node)),
    };
    let expected = expected(claim.wanted);
    let is_named = claim.wanted.at.is_some();
    let found_words: Vec<String> = found.iter().map(|f| words(operating, f, is_named)).collect();
    let message = format!("{subject} should be {expected}, but is {}", found_words.join(", and "));
    let mut finding = evidence
        .at(&RULE, claim.note.scope, claim.note.span, message)
        .label(format!("expects {expected}"))
        .about(subject);
    if let About::Diode(id) = claim.about {
        let what = found.first().map_or("", |f| f.words.as_str());
        finding = finding.also(evidence.statement(id), what);
    }
    let why = found.first().map_or("", |f| f.why.as_str());
    finding.help(format!("{why} {}", RULE.remedy).trim().to_owned())
}

/// `blocking in condition VIN=9`; the condition is left out where the note names it.
fn words(operating: &Operating, found: &Found, is_named: bool) -> String {
    let place = match (operating.cases.len(), found.cases.as_slice()) {
        (1, _) => String::new(),
        _ if is_named => String::new(),
        (all, cases) if cases.len() == all => " in every condition".into(),
        (_, cases) => in_cases(operating, cases).replace([')', '('], ""),
    };
    format!("{}{place}", found.words)
}

/// `conducting 2 mA … 5 mA at VIN=9`
fn expected(wanted: &Expectation) -> String {
    let state = match wanted.state {
        Some(State::Breakdown) => "in breakdown",
        Some(state) => state.word(),
        None => "",
    };
    let unit = if wanted.is_voltage { "V" } else { "A" };
    let range = wanted.range.map(|(low, high)| interval(low, high, unit)).unwrap_or_default();
    let place = match (&wanted.at, wanted.some, wanted.over_time) {
        (Some(at), _, _) => format!("at {at}"),
        (_, true, _) => "in some condition".into(),
        (_, _, true) => "over time".into(),
        _ => String::new(),
    };
    [state, &range, &place].into_iter().filter(|part| !part.is_empty()).collect::<Vec<_>>().join(" ")
}
