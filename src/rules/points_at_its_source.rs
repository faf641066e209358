//! Where several supplies meet through diodes: a diode that points at its own source, or a source of the wrong sign.

use super::{Check, Evidence, Group, Regions, Rule, behind, turn_round};
use crate::circuit::{Behaviour, ElementId, NodeId};
use crate::finding::{Finding, Severity, quantity};
use crate::operating::Operating;
use crate::topology::Walk;

pub const RULE: Rule = Rule {
    name: "points-at-its-source",
    group: Group::Orientation,
    severity: Severity::Warning,
    also: None,
    summary: "where diodes join supplies on one node, one of them cannot let its supply through",
    why: "The node is fed through diodes only. One of them has its cathode at the positive end of its source (or its \
          source has the wrong sign), so that source can never feed the node, and the others may drive current into it.",
    remedy: "Turn that diode round so that it points the way the others do, or turn its source.",
    source: None,
    failing: "tide gauge buoy: panel or battery\n\
              VPANEL sun 0 18\n\
              RPANEL sun panel 2.2\n\
              D1 panel bus DSCH\n\
              VBATT cell 0 12.6\n\
              RBATT cell batt 80m\n\
              D2 bus batt DSCH\n\
              RLOAD bus 0 47\n\
              .model DSCH D(IS=1u N=1.05)\n",
    passing: "tide gauge buoy: panel or battery\n\
              VPANEL sun 0 18\n\
              RPANEL sun panel 2.2\n\
              D1 panel bus DSCH\n\
              VBATT cell 0 12.6\n\
              RBATT cell batt 80m\n\
              D2 batt bus DSCH\n\
              RLOAD bus 0 47\n\
              .model DSCH D(IS=1u N=1.05)\n",
    check: Check::States(check),
};

/// A diode at the node and the rail behind it.
struct Feed {
    diode: ElementId,
    /// The pin at the node.
    pin: usize,
    walk: Walk,
    low: f64,
    high: f64,
}

/// Less is no supply.
const SUPPLY: f64 = 0.5;

fn check(evidence: &Evidence<'_>, operating: &Operating) -> Vec<Finding> {
    let circuit = evidence.circuit;
    let mut regions: Option<Regions> = None;
    let mut findings = Vec::new();
    for n in 1..circuit.nodes.len() {
        let node = NodeId::new(n);
        let diodes = evidence.wiring.touching.at(node).iter();
        let is_diode = |id: ElementId| matches!(circuit.element(id).behaviour, Behaviour::Diode { .. });
        if evidence.wiring.rails.is_rail(node) || diodes.filter(|t| is_diode(t.element)).count() < 2 {
            continue;
        }
        // a node to which a signal is coupled is switched by what its diodes are biased with
        if is_coupled(evidence, node) {
            continue;
        }
        let regions = regions.get_or_insert_with(|| Regions::of(evidence, |_| true));
        if regions.is_unfed(regions.region(node)) {
            findings.extend(judge(evidence, node, &feeds(evidence, operating, node)));
        }
    }
    findings
}

/// A capacitor leads to the node from what is neither ground nor a steady rail.
pub fn is_coupled(evidence: &Evidence<'_>, node: NodeId) -> bool {
    let circuit = evidence.circuit;
    let rails = &evidence.wiring.rails;
    let moves = |id: ElementId| matches!(&circuit.element(id).behaviour, Behaviour::VoltageSource(s) if s.shape.is_some());
    evidence.wiring.touching.at(node).iter().any(|t| {
        let far = circuit.node(t.element, 1 - t.pin.min(1) as usize);
        matches!(circuit.element(t.element).behaviour, Behaviour::Capacitor { .. })
            && (!rails.is_rail(far) || rails.source(far).is_some_and(moves))
    })
}

/// The diodes at the node that have a rail other than ground behind them.
fn feeds(evidence: &Evidence<'_>, operating: &Operating, node: NodeId) -> Vec<Feed> {
    let circuit = evidence.circuit;
    let standing = evidence.standing(operating);
    let feed = |touch: &crate::topology::Touch| {
        let is_diode = matches!(circuit.element(touch.element).behaviour, Behaviour::Diode { .. });
        let pin = touch.pin as usize;
        if !is_diode {
            return None;
        }
        let walk = behind(evidence, touch.element, 1 - pin);
        let (low, high) = standing.rail(walk.end).filter(|_| walk.end != NodeId::GROUND)?;
        Some(Feed { diode: touch.element, pin, walk, low, high })
    };
    evidence.wiring.touching.at(node).iter().filter_map(feed).collect()
}

fn judge(evidence: &Evidence<'_>, node: NodeId, feeds: &[Feed]) -> Vec<Finding> {
    // seen so that the supply is positive: a diode that feeds has its cathode at the node
    let sides = [1.0, -1.0].map(|sign: f64| {
        let level = |f: &Feed| if sign > 0.0 { (f.low, f.high) } else { (-f.high, -f.low) };
        let feeding_pin = if sign > 0.0 { 1 } else { 0 };
        let best = feeds.iter().filter(|f| f.pin == feeding_pin && level(f).1 >= 0.0);
        let good = best.max_by(|a, b| level(a).1.total_cmp(&level(b).1));
        let others = |f: &Feed| {
            let own = f.diode;
            feeds.iter().filter(move |o| o.pin == feeding_pin && o.diode != own)
        };
        // a clamp lies straight at its rail, a battery that is charged behind a much greater resistance
        let is_charged = |f: &Feed| f.walk.ohms >= 10.0 && others(f).all(|o| f.walk.ohms > 5.0 * o.walk.ohms);
        let is_clamp = |f: &Feed| f.walk.passed.is_empty() && others(f).all(|o| !o.walk.passed.is_empty());
        let is_meant = |f: &Feed| others(f).count() >= 2 && (is_charged(f) || is_clamp(f));
        let turned: Vec<&Feed> =
            feeds.iter().filter(|f| f.pin != feeding_pin && level(f).0 > SUPPLY && !is_meant(f)).collect();
        let is_negative = |f: &&Feed| f.pin == feeding_pin && level(f).1 <= 0.0 && level(f).0 < -SUPPLY;
        let feeds_some = good.is_some_and(|g| level(g).1 > SUPPLY);
        let negative: Vec<&Feed> = feeds.iter().filter(is_negative).filter(|_| feeds_some).collect();
        (good, turned, negative)
    });
    let mut findings = Vec::new();
    for (good, turned, negative) in sides {
        let Some(good) = good else { continue };
        findings.extend(turned.iter().map(|f| tell(evidence, node, f, good, true)));
        findings.extend(negative.iter().map(|f| tell(evidence, node, f, good, false)));
        if !findings.is_empty() {
            break;
        }
    }
    findings
}

fn tell(evidence: &Evidence<'_>, node: NodeId, feed: &Feed, good: &Feed, turned: bool) -> Finding {
    let name = evidence.name(feed.diode);
    let (bus, rail) = (evidence.node(node), evidence.node(feed.walk.end));
    let volts = quantity(if feed.low.abs() > feed.high.abs() { feed.low } else { feed.high }, "V");
    let message = if turned {
        format!(
            "{name} points from `{bus}` to `{rail}` ({volts}), so that source can never feed `{bus}` as {} does",
            evidence.name(good.diode)
        )
    } else {
        format!(
            "`{rail}` stands at {volts} in every condition, so it can never feed `{bus}` through {name} beside {}",
            evidence.name(good.diode)
        )
    };
    let mut finding = evidence
        .about(&RULE, feed.diode, message)
        .label(if turned { "points at its source" } else { "never passes anything on" })
        .also(evidence.statement(good.diode), "feeds the same node")
        .about(evidence.name(good.diode));
    if let Some(source) = evidence.wiring.rails.source(feed.walk.end) {
        finding = finding.also(evidence.statement(source), "the source behind it");
        finding.subjects.extend([evidence.name(source), rail]);
    }
    evidence.name_nodes(&mut finding, &[feed.diode]);
    let finding = finding.help(format!("{} {}", RULE.why, RULE.remedy));
    if turned { turn_round(evidence, feed.diode, finding) } else { finding }
}
