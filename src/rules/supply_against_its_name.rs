//! A node whose name says what it stands at, held by a source that says otherwise.

use super::{Check, Evidence, Group, Rule, turn_round};
use crate::circuit::{Behaviour, ElementId, ModelKind, NodeId};
use crate::finding::{Finding, Severity, quantity};
use crate::operating::Operating;
use crate::topology::dc_value;

pub const RULE: Rule = Rule {
    name: "supply-against-its-name",
    group: Group::Orientation,
    severity: Severity::Warning,
    also: None,
    summary: "a supply stands at another polarity, or at another power of ten, than its name says",
    why: "Everybody who joins a part to such a node trusts its name. A source whose nodes are swapped, or whose unit \
          slipped, turns it into its opposite.",
    remedy: "Swap the nodes of the source, correct its value, or give the node another name.",
    source: Some("Supply names: VCC and VDD above ground, VEE below, `3V3` for 3.3 V; common practice"),
    failing: "tide gauge buoy: pull-up of the float switch\n\
              VS 0 vcc 5\n\
              R1 vcc float 10k\n\
              R2 float 0 100k\n",
    passing: "tide gauge buoy: pull-up of the float switch\n\
              VS 3V3 0 3.3\n\
              VN -5V 0 -5\n\
              R1 3V3 float 10k\n\
              R2 float -5V 100k\n",
    check: Check::States(check),
};

/// Less than this, in volts, has no polarity worth a word.
const SOME: f64 = 0.1;

/// A name and a voltage this many times apart have no tolerance between them but a slip of the unit.
const SLIP: f64 = 100.0;

fn check(evidence: &Evidence<'_>, operating: &Operating) -> Vec<Finding> {
    let nodes = (1..evidence.circuit.nodes.len()).map(NodeId::new);
    let mirrored = is_mirrored(evidence);
    nodes.filter_map(|node| judge(evidence, operating, node, mirrored)).collect()
}

/// Only PNP and P-channel transistors: there VCC and VDD stand below ground by custom.
fn is_mirrored(evidence: &Evidence<'_>) -> bool {
    let circuit = evidence.circuit;
    let mut kinds = circuit.elements().filter_map(|(_, element)| match element.behaviour {
        Behaviour::Transistor { model: Some(model) } => Some(circuit.model(model).kind),
        _ => None,
    });
    let is_p = |kind| matches!(kind, ModelKind::Pnp | ModelKind::Pmos | ModelKind::Pjf);
    kinds.next().is_some_and(|first| is_p(first) && kinds.all(is_p))
}

/// What a name says.
#[derive(Debug, Clone, Copy, PartialEq)]
struct Said {
    /// 1 above ground, −1 below.
    sign: f64,
    /// Volts, as a magnitude, where it gives them.
    volts: Option<f64>,
}

/// What the last part of a node's name says.
fn said(name: &str) -> Option<Said> {
    let own = name.rsplit([':', '/']).next().unwrap_or(name).to_ascii_uppercase();
    let words: Vec<&str> = own.split(['_', '.', '-']).filter(|w| !w.is_empty()).collect();
    if words.iter().any(|w| SIGNALS.iter().any(|s| w.starts_with(s))) {
        return None;
    }
    let is_turned = own.starts_with('-') || own.ends_with('-') || words.iter().any(|w| TURNED.contains(w));
    let is_below = is_turned || words.iter().any(|w| is_word(w, "VEE"));
    if let Some(volts) = words.iter().copied().find_map(in_volts) {
        return Some(Said { sign: if is_below { -1.0 } else { 1.0 }, volts: Some(volts) });
    }
    let above = ["VCC", "VDD", "AVCC", "AVDD", "DVDD"].iter().any(|s| words.iter().any(|w| is_word(w, s)));
    match (above, is_below) {
        _ if is_turned => None,
        (true, _) => Some(Said { sign: 1.0, volts: None }),
        (_, true) => Some(Said { sign: -1.0, volts: None }),
        _ => None,
    }
}

/// Names of supplies that nobody gives to one below ground.
const SUPPLIES: [&str; 14] = [
    "BAT", "BATT", "VBAT", "VBATT", "BATTERY", "VBUS", "VIN", "VREF", "VSUP", "SUPPLY", "SUN", "PANEL",
    "USB", "CELL",
];
/// Words that turn what a supply's name says.
const TURNED: [&str; 5] = ["N", "M", "NEG", "MINUS", "VSS"];
/// Beginnings of words that make of a supply's name that of a signal about it.
const SIGNALS: [&str; 20] = [
    "EN", "PG", "OK", "GOOD", "SENS", "SNS", "MON", "SHUNT", "FB", "ADC", "DIV", "FLT", "FAULT", "CTRL",
    "DET", "ON", "PWRGD", "RTN", "REF", "LOW",
];

/// The word itself, a number or the usual letters after it.
fn is_word(word: &str, name: &str) -> bool {
    let rest = word.strip_prefix(name);
    rest.is_some_and(|r| r.bytes().all(|b| b.is_ascii_digit()) || ["A", "D", "IO", "Q"].contains(&r))
}

/// What a source's own name says of its first node, where its other one is ground: `VCC`; `V24` where it gives 24 V.
fn said_by(evidence: &Evidence<'_>, source: ElementId, node: NodeId, volts: f64) -> Option<Said> {
    let circuit = evidence.circuit;
    let ends = [circuit.node(source, 0), circuit.node(source, 1)];
    if !ends.contains(&node) || !ends.contains(&NodeId::GROUND) {
        return None;
    }
    let name = evidence.name(source);
    let own = name.rsplit(':').next().unwrap_or(&name);
    let node = evidence.node(node);
    let node = node.rsplit([':', '/']).next().unwrap_or(&node);
    // V2 may be the second source; V2 at `v2`, or V24, is a voltage
    let is_pair = own.eq_ignore_ascii_case(node);
    if node.to_ascii_uppercase().split(['_', '.', '-']).any(|w| TURNED.contains(&w)) {
        return None;
    }
    // written as a positive source with its positive end at ground
    let is_turned = ends[0] == NodeId::GROUND
        && matches!(&circuit.element(source).behaviour, Behaviour::VoltageSource(s) if s.shape.is_none() && dc_value(s).0 > 0.0);
    if is_turned && SUPPLIES.iter().any(|s| node.eq_ignore_ascii_case(s)) {
        return Some(Said { sign: 1.0, volts: None });
    }
    let counts = |word: &str| {
        let digits = word.strip_prefix(['V', 'v'])?;
        let is_number = digits.bytes().all(|b| b.is_ascii_digit()) && (is_pair || digits.len() > 1);
        let value: f64 = digits.parse().ok().filter(|_| is_number)?;
        // V33 may be 3.3 V
        let fits = |v: f64| v >= 2.0 && (v - volts).abs() <= 0.05 * volts;
        (fits(value) || fits(value / 10.0)).then_some(Said { sign: 1.0, volts: None })
    };
    said(own).filter(|s| s.volts.is_none()).or_else(|| counts(own)).or_else(|| counts(node))
}

/// `5V`, `+12V`, `3V3`, `-5V0`: the magnitude. `V5` may be the fifth node as well and says nothing.
fn in_volts(word: &str) -> Option<f64> {
    let digits = word.strip_prefix(['+', '-']).unwrap_or(word);
    let (whole, part) = digits.split_once('V')?;
    let is_number = |s: &str| s.bytes().all(|b| b.is_ascii_digit());
    if whole.is_empty() || whole.len() > 4 || part.len() > 2 || !is_number(whole) || !is_number(part) {
        return None;
    }
    format!("{whole}.{part}0").parse().ok().filter(|v: &f64| *v > 0.0)
}

fn judge(evidence: &Evidence<'_>, operating: &Operating, node: NodeId, mirrored: bool) -> Option<Finding> {
    let source = evidence.wiring.rails.source(node)?;
    let (low, high) = evidence.standing(operating).rail(node)?;
    let name = evidence.node(node);
    let said = said(&name).or_else(|| said_by(evidence, source, node, low.abs().max(high.abs())))?;
    if mirrored && said.volts.is_none() {
        return None;
    }
    let is_opposite = if said.sign > 0.0 { high < -SOME } else { low > SOME };
    let most = low.abs().max(high.abs());
    let slipped = |volts: f64| most > 0.0 && (most > SLIP * volts || most * SLIP < volts);
    let is_slip = said.volts.is_some_and(slipped) && moves_not(evidence, source);
    let stands = if said.sign > 0.0 { high } else { low };
    let message = match is_opposite {
        true => format!(
            "`{name}` is a supply {} ground by its name or its source's, but {} holds it at {}",
            if said.sign > 0.0 { "above" } else { "below" },
            evidence.name(source),
            quantity(stands, "V")
        ),
        false if is_slip => format!(
            "`{name}` stands at {}, which is no {} supply: {} holds it",
            quantity(stands, "V"),
            quantity(said.sign * said.volts?, "V"),
            evidence.name(source)
        ),
        false => return None,
    };
    let mut finding = evidence.about(&RULE, source, message).label("holds it").about(&name);
    evidence.name_nodes(&mut finding, &[source]);
    let finding = finding.help(format!("{} {}", RULE.why, RULE.remedy));
    let is_alone = [0, 1].iter().any(|&pin| evidence.circuit.node(source, pin) == NodeId::GROUND);
    Some(if is_opposite && is_alone { turn_round(evidence, source, finding) } else { finding })
}

fn moves_not(evidence: &Evidence<'_>, source: ElementId) -> bool {
    matches!(&evidence.circuit.element(source).behaviour, Behaviour::VoltageSource(s) if s.shape.is_none())
}

#[cfg(test)]
mod tests {
    use super::*;

    // names as boards carry them, common practice
    #[test]
    fn names_say_polarity_and_volts_or_nothing() {
        let plain = |sign| Some(Said { sign, volts: None });
        let full = |sign, volts| Some(Said { sign, volts: Some(volts) });
        for (name, wanted) in [
            ("vcc", plain(1.0)),
            ("X1:VDDA", plain(1.0)),
            ("vee", plain(-1.0)),
            ("-vcc", None),
            ("+12V", full(1.0, 12.0)),
            ("/PWR/3V3", full(1.0, 3.3)),
            ("VCC_1V8", full(1.0, 1.8)),
            ("-5V", full(-1.0, 5.0)),
            ("5V_NEG", full(-1.0, 5.0)),
            ("12V_N", full(-1.0, 12.0)),
            ("VEE_5V", full(-1.0, 5.0)),
            ("VEEPROM", None),
            ("48V_EN", None),
            ("12V_SENSE", None),
            ("v5", None),
            ("vin", None),
            ("12", None),
            ("0V", None),
        ] {
            assert_eq!(said(name), wanted, "{name}");
        }
    }
}
