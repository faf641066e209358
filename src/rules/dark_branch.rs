//! A branch of resistors and diodes between two rails whose diodes point against the voltage, or need more than there is.

use super::{Check, Evidence, Group, Rule, Seen, list, turn_round};
use crate::circuit::{Behaviour, ElementId, NodeId, State};
use crate::finding::{Finding, Severity, quantity};
use crate::operating::Operating;
use rustc_hash::FxHashSet;

pub const RULE: Rule = Rule {
    name: "dark-branch",
    group: Group::Orientation,
    severity: Severity::Warning,
    also: None,
    summary: "a branch between two supplies never carries current: its diodes lie the wrong way round or need more voltage",
    why: "The branch has nothing but these elements in series, and in every condition the voltage across it is one \
          that its diodes do not pass, so an indicator in it never lights and a sensor in it never works.",
    remedy: "Turn the diode (or the source) round; where the voltage is too small, take fewer diodes in series.",
    source: None,
    failing: "tide gauge buoy: charge indicator\n\
              VSOLAR panel 0 18\n\
              R1 panel lamp 2k2\n\
              D1 0 lamp DGREEN\n\
              .model DGREEN D(IS=1e-20 N=2)\n",
    passing: "tide gauge buoy: charge indicator\n\
              VSOLAR panel 0 18\n\
              R1 panel lamp 2k2\n\
              D1 lamp 0 DGREEN\n\
              .model DGREEN D(IS=1e-20 N=2)\n",
    check: Check::States(check),
};

/// Ohms through which a leakage is measured.
const LEAKAGE: f64 = 10_000.0;
/// Less than this across a branch is no supply.
const SUPPLY: f64 = 1.0;

/// The branch that a diode lies in, from the rail that its anode leads to, to the other.
struct Branch {
    diodes: Vec<ElementId>,
    others: Vec<ElementId>,
    anode_end: NodeId,
    cathode_end: NodeId,
}

fn check(evidence: &Evidence<'_>, operating: &Operating) -> Vec<Finding> {
    let mut known: FxHashSet<ElementId> = FxHashSet::default();
    let mut findings = Vec::new();
    for (id, element) in evidence.circuit.elements() {
        if !matches!(element.behaviour, Behaviour::Diode { .. }) || known.contains(&id) {
            continue;
        }
        let Some(branch) = branch(evidence, id) else { continue };
        known.extend(&branch.diodes);
        findings.extend(judge(evidence, operating, &branch));
    }
    findings
}

fn passes(behaviour: &Behaviour) -> bool {
    matches!(
        behaviour,
        Behaviour::Resistor(_)
            | Behaviour::Inductor { .. }
            | Behaviour::Diode { .. }
            | Behaviour::Transistor { .. }
            | Behaviour::VoltageSwitch { .. }
            | Behaviour::CurrentSwitch { .. }
    )
}

fn branch(evidence: &Evidence<'_>, id: ElementId) -> Option<Branch> {
    let circuit = evidence.circuit;
    let (touching, rails) = (&evidence.wiring.touching, &evidence.wiring.rails);
    let side = |pin: usize| touching.walk(circuit, rails, circuit.node(id, pin), id, passes);
    let (before, after) = (side(0), side(1));
    if before.end == after.end {
        return None;
    }
    let mut all = before.passed.clone();
    all.push(id);
    all.extend(&after.passed);
    let is_diode = |id: &ElementId| matches!(circuit.element(*id).behaviour, Behaviour::Diode { .. });
    let (mut diodes, others): (Vec<ElementId>, Vec<ElementId>) = all.into_iter().partition(is_diode);
    diodes.sort();
    // beside so great a resistance a diode that blocks is there for its leakage
    let ohms: f64 = before.ohms + after.ohms;
    let has_resistor = ohms < LEAKAGE
        && others.iter().any(|&id| matches!(circuit.element(id).behaviour, Behaviour::Resistor(_)));
    has_resistor.then_some(Branch { diodes, others, anode_end: before.end, cathode_end: after.end })
}

fn judge(evidence: &Evidence<'_>, operating: &Operating, branch: &Branch) -> Option<Finding> {
    let standing = evidence.standing(operating);
    let seen: Vec<&Seen> = branch.diodes.iter().filter_map(|&id| standing.diode(id)).collect();
    let lights = seen.iter().all(|d| d.is_led());
    // a plain diode between two supplies may be a clamp that waits for its signal
    if !lights && branch.anode_end != NodeId::GROUND && branch.cathode_end != NodeId::GROUND {
        return None;
    }
    let is_timed = |node: NodeId| operating.nodes_left_to_time.binary_search(&node).is_ok();
    let volts = |node: NodeId| match evidence.wiring.rails.is_rail(node) {
        true => standing.rail(node),
        // anything else may clamp there; a light does not
        false => standing.node(node).filter(|_| lights && !is_timed(node)),
    };
    if lights && let Some(finding) = backwards_over_time(evidence, operating, branch, &seen) {
        return Some(finding);
    }
    // what comes in through a capacitor no source's value tells; the time pass may
    let moves = |id: &ElementId| {
        operating.left_to_time.binary_search(id).is_ok()
            && !standing.diode(*id).is_some_and(|d| d.is_always(State::Blocking))
    };
    if branch.diodes.iter().any(moves) {
        return None;
    }
    let (above, below) = (volts(branch.anode_end)?, volts(branch.cathode_end)?);
    let most = above.1 - below.0;
    if seen.len() != branch.diodes.len()
        || seen.iter().any(|d| d.clamps_near(most))
        || are_opposed(evidence, branch)
    {
        return None;
    }
    if branch.diodes.iter().any(|&id| evidence.is_told_near(id)) {
        return None;
    }
    let (message, label) = told(evidence, branch, &seen, most)?;
    let first = *branch.diodes.first()?;
    let finding = named(evidence, branch, evidence.about(&RULE, first, message).label(label));
    let single = branch.diodes.len() == 1 && most < 0.0;
    Some(if single { turn_round(evidence, first, finding) } else { finding })
}

/// A lamp and its resistor between ground and what only the time pass knows: it blocks all the time, and not for want of
/// voltage.
fn backwards_over_time(
    evidence: &Evidence<'_>,
    operating: &Operating,
    branch: &Branch,
    seen: &[&Seen],
) -> Option<Finding> {
    let ends = [branch.anode_end, branch.cathode_end];
    let is_followed = |id: &ElementId| operating.left_to_time.binary_search(id).is_ok();
    let blocks = |d: &&Seen| d.is_always(State::Blocking) && d.least <= -1.0 && d.greatest <= 0.0;
    let [first] = branch.diodes.as_slice() else { return None };
    if !ends.contains(&NodeId::GROUND) || !is_followed(first) || !seen.iter().all(blocks) {
        return None;
    }
    let message = format!(
        "{} never lights: it blocks all the time, against up to {}",
        evidence.name(*first),
        quantity(-seen.first()?.least, "V")
    );
    let finding =
        named(evidence, branch, evidence.about(&RULE, *first, message).label("points the wrong way"));
    Some(turn_round(evidence, *first, finding))
}

/// The message and the label, where the greatest voltage across the branch keeps it dark.
fn told(
    evidence: &Evidence<'_>,
    branch: &Branch,
    seen: &[&Seen],
    most: f64,
) -> Option<(String, &'static str)> {
    let needed: f64 = seen.iter().map(|d| d.drop).sum();
    let names: Vec<String> = branch.diodes.iter().map(|&id| evidence.name(id)).collect();
    let ends = (evidence.node(branch.anode_end), evidence.node(branch.cathode_end));
    if most <= -SUPPLY {
        Some((
            format!(
                "{} never {}: {} anode leads to `{}`, which stands {} below `{}` at best",
                list(&names),
                if names.len() == 1 { "conducts" } else { "conduct" },
                if names.len() == 1 { "its" } else { "their" },
                ends.0,
                quantity(-most, "V"),
                ends.1
            ),
            "lies the wrong way round",
        ))
    } else if most > SUPPLY && most < needed && seen.iter().all(|d| d.is_led()) {
        Some((
            format!(
                "{} cannot light: together they need {}, and `{}` stands only {} above `{}`",
                list(&names),
                quantity(needed, "V"),
                ends.0,
                quantity(most, "V"),
                ends.1
            ),
            "needs more voltage than there is",
        ))
    } else {
        None
    }
}

/// With everything that belongs to the branch marked and named.
fn named(evidence: &Evidence<'_>, branch: &Branch, mut finding: Finding) -> Finding {
    for &id in branch.diodes.iter().skip(1).take(6) {
        finding = finding.also(evidence.statement(id), "in the same branch");
    }
    finding.subjects.extend(branch.diodes.iter().skip(1).map(|&id| evidence.name(id)));
    for rail in [branch.anode_end, branch.cathode_end] {
        if let Some(source) = evidence.wiring.rails.source(rail) {
            finding = finding.also(evidence.statement(source), format!("holds `{}`", evidence.node(rail)));
            finding.subjects.push(evidence.name(source));
        }
    }
    finding.subjects.extend(branch.others.iter().map(|&id| evidence.name(id)));
    evidence.name_nodes(&mut finding, &branch.diodes);
    evidence.name_nodes(&mut finding, &branch.others);
    finding.help(format!("{} {}", RULE.why, RULE.remedy))
}

/// Two of its diodes point against each other, which is told as such.
fn are_opposed(evidence: &Evidence<'_>, branch: &Branch) -> bool {
    let pins = |pin: usize| branch.diodes.iter().map(move |&id| evidence.circuit.node(id, pin));
    let mut ends: Vec<NodeId> = pins(0).collect();
    ends.sort();
    let mut others: Vec<NodeId> = pins(1).collect();
    others.sort();
    let twice = |list: &[NodeId]| list.windows(2).any(|w| w[0] == w[1]);
    twice(&ends) || twice(&others) || points_both_ways(evidence, branch)
}

/// With resistors between them, diodes of one branch may still point against each other: then one of them reaches the
/// other rail with its anode.
fn points_both_ways(evidence: &Evidence<'_>, branch: &Branch) -> bool {
    let circuit = evidence.circuit;
    let side = |id: ElementId| {
        evidence.wiring.touching.walk(circuit, &evidence.wiring.rails, circuit.node(id, 0), id, passes).end
    };
    branch.diodes.iter().any(|&id| side(id) != branch.anode_end)
}
