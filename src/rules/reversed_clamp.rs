//! Clamp diodes between a node and two rails: one of them the wrong way round, or the rails in the wrong order.

use super::{Check, Evidence, Group, Regions, Rule, turn_round};
use crate::circuit::{Behaviour, ElementId, NodeId, State};
use crate::finding::{Finding, Severity, quantity};
use crate::operating::Operating;
use crate::topology::is_lead;

pub const RULE: Rule = Rule {
    name: "reversed-clamp",
    group: Group::Orientation,
    severity: Severity::Warning,
    also: None,
    summary: "of two clamp diodes at one node one lies the wrong way round, or its rail or its signal has the wrong sign",
    why: "A node is clamped between two rails by a diode from the lower one and a diode to the higher one. Any other \
          way the first of them to conduct holds the node at its rail whatever the signal is, and the second never acts.",
    remedy: "Give the diode at the lower rail its anode there, and the one at the higher rail its cathode; look at the \
             sign of the source that is named.",
    source: None,
    failing: "tide gauge buoy: pressure cell input\n\
              V33 vdd 0 3.3\n\
              RLDO vdd 0 1k\n\
              VCELL cell 0 2.05\n\
              R1 cell pin 2k2\n\
              D1 pin vdd DSW\n\
              D2 pin 0 DSW\n\
              .model DSW D(IS=2.5n N=1.75)\n",
    passing: "tide gauge buoy: pressure cell input\n\
              V33 vdd 0 3.3\n\
              RLDO vdd 0 1k\n\
              VCELL cell 0 2.05\n\
              R1 cell pin 2k2\n\
              D1 pin vdd DSW\n\
              D2 0 pin DSW\n\
              .model DSW D(IS=2.5n N=1.75)\n",
    check: Check::States(check),
};

/// A diode between the node and a rail.
#[derive(Clone, Copy)]
struct Arm {
    diode: ElementId,
    rail: NodeId,
    low: f64,
    high: f64,
}

/// What is wrong at a node.
struct Wrong {
    /// The diode to look at first, and the other one.
    diodes: [Arm; 2],
    message: String,
    turn: bool,
    /// The rail or signal whose sign is in doubt.
    doubtful: Vec<NodeId>,
}

fn check(evidence: &Evidence<'_>, operating: &Operating) -> Vec<Finding> {
    let circuit = evidence.circuit;
    let mut findings = Vec::new();
    let mut regions: Option<Regions> = None;
    for n in 1..circuit.nodes.len() {
        let node = NodeId::new(n);
        if evidence.wiring.touching.at(node).len() < 3 || evidence.wiring.rails.is_rail(node) {
            continue;
        }
        let (into, out) = (arms(evidence, operating, node, 1), arms(evidence, operating, node, 0));
        if into.len() + out.len() < 2 {
            continue;
        }
        // a lamp and its guard, the one by way of what measures its current, lie between one and the same potential
        let mut levels = into.iter().chain(&out).map(|a| (a.low, a.high));
        let first = levels.next();
        if levels.all(|level| Some(level) == first) {
            continue;
        }
        let regions = regions.get_or_insert_with(|| Regions::of(evidence, |id| at_rail(evidence, id)));
        if !regions.is_unfed(regions.region(node)) {
            let wrong = same_way(evidence, operating, node, &into, &out)
                .or_else(|| wrong_order(evidence, node, &into, &out))
                .or_else(|| below(evidence, operating, node, &into, &out));
            findings.extend(wrong.map(|w| tell(evidence, node, &w)));
        }
    }
    findings
}

/// One end of the diode is a rail: what such diodes feed is no signal.
fn at_rail(evidence: &Evidence<'_>, id: ElementId) -> bool {
    evidence.circuit.pins(id).iter().any(|p| evidence.wiring.rails.is_rail(p.node))
}

/// Plain diodes between the node (at `pin`) and rails, in order.
fn arms(evidence: &Evidence<'_>, operating: &Operating, node: NodeId, pin: u32) -> Vec<Arm> {
    let standing = evidence.standing(operating);
    let touches = evidence.wiring.touching.at(node).iter().filter(|t| t.pin == pin);
    let arm = |diode: ElementId| {
        let is_diode = matches!(evidence.circuit.element(diode).behaviour, Behaviour::Diode { .. });
        let rail = evidence.circuit.node(diode, 1 - pin as usize);
        let (low, high) = standing.rail(rail).filter(|_| is_diode)?;
        let seen = standing.diode(diode)?;
        let plain = !seen.is_led()
            && !seen.breakdown.is_some_and(|bv| bv <= 1.5 * low.abs().max(high.abs()).max(5.0));
        plain.then_some(Arm { diode, rail, low, high })
    };
    touches.filter_map(|t| arm(t.element)).collect()
}

/// Both lead away from the node, or both to it, and the rails are such that one of them never acts. Two inputs of a gate
/// look alike, but none of them is ground, and their levels have one sign.
fn same_way(
    evidence: &Evidence<'_>,
    operating: &Operating,
    node: NodeId,
    into: &[Arm],
    out: &[Arm],
) -> Option<Wrong> {
    let standing = evidence.standing(operating);
    let apart = |a: &Arm, b: &Arm| a.high + 1.0 <= b.low;
    let is_ground = |a: &Arm| a.rail == NodeId::GROUND;
    let signs = |a: &Arm, b: &Arm| a.high < 0.0 && b.low > 0.0;
    for arms in [out, into] {
        for lower in arms {
            for upper in arms {
                let surge = [lower, upper]
                    .iter()
                    .any(|a| standing.diode(a.diode).is_some_and(|d| d.clamps_near(upper.high - lower.low)));
                let rails = !surge
                    && apart(lower, upper)
                    && (is_ground(lower) || is_ground(upper) || signs(lower, upper));
                if !rails {
                    continue;
                }
                let away = std::ptr::eq(arms, out);
                let (wrong, idle) = if away { (*lower, *upper) } else { (*upper, *lower) };
                // an antiparallel partner makes the first a limiter of its own
                let partners = if away { into } else { out };
                if partners.iter().any(|p| p.rail == wrong.rail) {
                    continue;
                }
                let message = format!(
                    "{} leads {} and holds `{}` at {} it, so {} ({} `{}`, {}) can never act",
                    evidence.name(wrong.diode),
                    if away {
                        format!("from `{}` to `{}`", evidence.node(node), evidence.node(wrong.rail))
                    } else {
                        format!("from `{}` to `{}`", evidence.node(wrong.rail), evidence.node(node))
                    },
                    evidence.node(node),
                    if away { "no more than a drop above" } else { "no less than a drop below" },
                    evidence.name(idle.diode),
                    if away { "to" } else { "from" },
                    evidence.node(idle.rail),
                    quantity(if away { idle.low } else { idle.high }, "V")
                );
                return Some(Wrong { diodes: [wrong, idle], message, turn: true, doubtful: Vec::new() });
            }
        }
    }
    None
}

/// The diodes point as they should, but the rail that is to be the lower one is not.
fn wrong_order(evidence: &Evidence<'_>, node: NodeId, into: &[Arm], out: &[Arm]) -> Option<Wrong> {
    for from in into {
        for to in out {
            let crossed = from.low > to.high - 0.2 && from.rail != to.rail;
            let is_signal = |rail: NodeId| leads_to(evidence, node).contains(&rail);
            if !crossed || is_signal(from.rail) || is_signal(to.rail) {
                continue;
            }
            let message = format!(
                "`{}` is clamped between `{}` at {} and `{}` at {}: the rail that {} comes from must be the lower one",
                evidence.node(node),
                evidence.node(from.rail),
                quantity(from.low, "V"),
                evidence.node(to.rail),
                quantity(to.high, "V"),
                evidence.name(from.diode)
            );
            let doubtful = vec![from.rail, to.rail];
            return Some(Wrong { diodes: [*from, *to], message, turn: false, doubtful });
        }
    }
    None
}

/// Rails that resistors lead to from the node.
fn leads_to(evidence: &Evidence<'_>, node: NodeId) -> Vec<NodeId> {
    let circuit = evidence.circuit;
    let (touching, rails) = (&evidence.wiring.touching, &evidence.wiring.rails);
    let resistors = touching.direct(circuit, node).filter(|t| is_lead(&circuit.element(t.element).behaviour));
    let end = |t: crate::topology::Touch| {
        let far = circuit.node(t.element, 1 - t.pin.min(1) as usize);
        touching.walk(circuit, rails, far, t.element, is_lead).end
    };
    resistors.map(end).filter(|&end| rails.is_rail(end)).collect()
}

/// The signal lies below the lower rail in every condition, so the lower clamp conducts all the time.
fn below(
    evidence: &Evidence<'_>,
    operating: &Operating,
    node: NodeId,
    into: &[Arm],
    out: &[Arm],
) -> Option<Wrong> {
    let standing = evidence.standing(operating);
    let from =
        into.first().filter(|a| standing.diode(a.diode).is_some_and(|d| d.is_always(State::Conducting)))?;
    let to = out.first().filter(|to| to.low > from.high)?;
    let signal = leads_to(evidence, node)
        .into_iter()
        .find(|&rail| standing.rail(rail).is_some_and(|(_, high)| high < from.low) && rail != from.rail)?;
    let volts = standing.rail(signal)?.1;
    let message = format!(
        "{} conducts in every condition: the signal `{}` stands at {}, below the lower rail `{}` of `{}`",
        evidence.name(from.diode),
        evidence.node(signal),
        quantity(volts, "V"),
        evidence.node(from.rail),
        evidence.node(node)
    );
    Some(Wrong { diodes: [*from, *to], message, turn: false, doubtful: vec![signal] })
}

fn tell(evidence: &Evidence<'_>, node: NodeId, wrong: &Wrong) -> Finding {
    let [main, other] = wrong.diodes;
    let mut finding = evidence.about(&RULE, main.diode, wrong.message.clone());
    finding.label = if wrong.turn { "lies the wrong way round".into() } else { "one of the clamps".into() };
    finding =
        finding.also(evidence.statement(other.diode), "the other clamp").about(evidence.name(other.diode));
    for &rail in &wrong.doubtful {
        if let Some(source) = evidence.wiring.rails.source(rail) {
            finding = finding.also(evidence.statement(source), format!("holds `{}`", evidence.node(rail)));
            finding.subjects.extend([evidence.name(source), evidence.node(rail)]);
        }
    }
    finding.subjects.push(evidence.node(node));
    evidence.name_nodes(&mut finding, &[main.diode, other.diode]);
    let finding = finding.help(format!("{} {}", RULE.why, RULE.remedy));
    if wrong.turn { turn_round(evidence, main.diode, finding) } else { finding }
}
