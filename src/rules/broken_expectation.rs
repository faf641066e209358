//! An `expect` note that the circuit does not meet.

use super::{
    About, Check, Claim, Evidence, Found, Group, Outcome, Regions, Rivals, Rule, claims, expected, in_cases,
};
use crate::circuit::{Behaviour, ElementId, NodeId};
use crate::finding::{Finding, Severity};
use crate::operating::Operating;

pub const RULE: Rule = Rule {
    name: "broken-expectation",
    group: Group::Notes,
    severity: Severity::Error,
    also: None,
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
    let rivals = Rivals::of(&claims);
    let mut regions = None;
    for claim in claims.iter().filter(|c| !c.wanted.over_time) {
        if let Outcome::Broken(found) = claim.judge(evidence, operating, &rivals) {
            let regions = regions.get_or_insert_with(|| Regions::of(evidence, |_| false));
            findings.push(finding(evidence, operating, regions, claim, &found));
        }
    }
    findings
}

/// More sources around than this explain nothing.
const FEW: usize = 4;

/// The sources that hold the nodes around it: one of them is often what changed.
fn feeding(evidence: &Evidence<'_>, regions: &Regions, about: About) -> Vec<ElementId> {
    let rails = &evidence.wiring.rails;
    let nodes: Vec<NodeId> = match about {
        About::Diode(id) => evidence.circuit.pins(id).iter().map(|p| p.node).collect(),
        About::Node(node) => vec![node],
    };
    let mut sources: Vec<ElementId> = Vec::new();
    for node in nodes {
        let is_source =
            |id: ElementId| matches!(evidence.circuit.element(id).behaviour, Behaviour::CurrentSource(_));
        let touches = evidence.wiring.touching.at(node).iter();
        sources.extend(touches.map(|t| t.element).filter(|&id| node != NodeId::GROUND && is_source(id)));
        match rails.is_rail(node) {
            true => sources.extend(rails.source(node)),
            false => {
                let borders = regions.borders(regions.region(node));
                sources.extend(borders.iter().filter_map(|&rail| rails.source(rail)));
            }
        }
    }
    sources.sort();
    sources.dedup();
    if sources.len() > FEW { Vec::new() } else { sources }
}

fn finding(
    evidence: &Evidence<'_>,
    operating: &Operating,
    regions: &Regions,
    claim: &Claim<'_>,
    found: &[Found],
) -> Finding {
    let subject = claim.subject(evidence);
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
    // whoever looks at a node finds what is expected there
    match claim.about {
        About::Diode(id) => evidence.name_nodes(&mut finding, &[id]),
        About::Node(node) => finding.subjects.push(evidence.node(node)),
    }
    for source in feeding(evidence, regions, claim.about) {
        finding = finding.also(evidence.statement(source), "drives it").about(evidence.name(source));
        evidence.name_nodes(&mut finding, &[source]);
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
