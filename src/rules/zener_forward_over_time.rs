//! A Zener diode behind a rectifier that conducts forward instead of breaking down: what the states cannot judge.

use super::zener_forward::{LAMP, MARGIN, MOST, RECTIFIER};
use super::{Check, Evidence, Group, Rule, behind, turn_round};
use crate::circuit::{Behaviour, ElementId, NodeId};
use crate::finding::{Finding, Severity, quantity};
use crate::operating::Operating;
use crate::swing::Swing;

pub const RULE: Rule = Rule {
    name: "zener-forward-over-time",
    group: Group::Time,
    severity: Severity::Warning,
    also: None,
    summary: "a Zener diode conducts forward over the whole period where its feed would let it break down",
    why: "Its feed always has the same polarity and rises well above the breakdown voltage, but the diode conducts forward \
          and holds the node at less than a volt.",
    remedy: "Turn it round: a Zener diode has its cathode at the positive end.",
    source: None,
    failing: "tide gauge buoy: reference behind the wave generator\n\
              V1 ac 0 SIN(0 18 12)\n\
              R1 ac a 4\n\
              D1 a raw DRECT\n\
              C1 raw 0 4700u\n\
              R2 raw ref 680\n\
              D2 ref 0 DZ6\n\
              R3 ref 0 10k\n\
              .tran 200u 3\n\
              .model DRECT D(IS=2.6n N=1.9)\n\
              .model DZ6 D(IS=1n N=1.3 BV=6.2)\n\
              *@ drop DRECT 0.8\n\
              *@ drop DZ6 0.7\n",
    passing: "tide gauge buoy: reference behind the wave generator\n\
              V1 ac 0 SIN(0 18 12)\n\
              R1 ac a 4\n\
              D1 a raw DRECT\n\
              C1 raw 0 4700u\n\
              R2 raw ref 680\n\
              D2 0 ref DZ6\n\
              R3 ref 0 10k\n\
              .tran 200u 3\n\
              .model DRECT D(IS=2.6n N=1.9)\n\
              .model DZ6 D(IS=1n N=1.3 BV=6.2)\n\
              *@ drop DRECT 0.8\n\
              *@ drop DZ6 0.7\n",
    check: Check::Time(check),
};

/// So much of its greatest value the feed may swing to the other side.
const BACK: f64 = 0.05;
/// A diode that conducts for less of the period clips something.
const LASTING: f64 = 0.2;

fn check(evidence: &Evidence<'_>, operating: &Operating, swing: &Swing) -> Vec<Finding> {
    let timed = swing.diodes.iter().map(|d| d.element);
    timed.filter_map(|id| judge(evidence, operating, swing, id)).collect()
}

fn judge(evidence: &Evidence<'_>, operating: &Operating, swing: &Swing, id: ElementId) -> Option<Finding> {
    let circuit = evidence.circuit;
    let Behaviour::Diode { model: Some(model), .. } = circuit.element(id).behaviour else { return None };
    let breakdown = circuit.model(model).parameter("bv")?.number.abs();
    let time = swing.diode(id)?.over_time.as_ref()?;
    let forward = time.breakdown_intervals.is_empty() && time.conducting_share > LASTING;
    let is_led = evidence.standing(operating).diode(id).is_some_and(|s| s.drop >= LAMP);
    if !forward || breakdown > MOST || is_led {
        return None;
    }
    let rails = &evidence.wiring.rails;
    let free = [0, 1].into_iter().find(|&pin| !rails.is_rail(circuit.node(id, pin)))?;
    if !rails.is_rail(circuit.node(id, 1 - free)) {
        return None;
    }
    let feed = feed(evidence, swing, id, free)?;
    let (low, high) = if free == 0 { (feed.1, feed.2) } else { (-feed.2, -feed.1) };
    let margin = if breakdown > RECTIFIER { 1.0 } else { MARGIN };
    if high < margin * breakdown || low < -BACK * high {
        return None;
    }
    let name = evidence.name(id);
    let message = format!(
        "{name} breaks down at {} but conducts forward all the time: `{}` behind it stands between {} and {}",
        quantity(breakdown, "V"),
        evidence.node(feed.0),
        quantity(feed.1, "V"),
        quantity(feed.2, "V")
    );
    let mut finding =
        evidence.about(&RULE, id, message).label("forward across its feed").about(evidence.node(feed.0));
    evidence.name_nodes(&mut finding, &[id]);
    Some(turn_round(evidence, id, finding.help(format!("{} {}", RULE.why, RULE.remedy))))
}

/// The node from which a resistor feeds the diode, with its least and greatest volts.
fn feed(evidence: &Evidence<'_>, swing: &Swing, id: ElementId, pin: usize) -> Option<(NodeId, f64, f64)> {
    let circuit = evidence.circuit;
    let node = circuit.node(id, pin);
    let alone = behind(evidence, id, pin);
    let resistors = evidence.wiring.touching.at(node).iter().filter(|t| {
        t.element != id && matches!(circuit.element(t.element).behaviour, Behaviour::Resistor(_))
    });
    let far = resistors.map(|t| circuit.node(t.element, 1 - t.pin.min(1) as usize));
    let ends = far.chain((!alone.passed.is_empty()).then_some(alone.end)).filter(|&n| n != NodeId::GROUND);
    let levels = ends.filter_map(|n| swing.node(n)?.over_time.map(|l| (n, l.min, l.max)));
    levels.max_by(|a, b| a.1.abs().max(a.2.abs()).total_cmp(&b.1.abs().max(b.2.abs())))
}
