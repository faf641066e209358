//! A lamp or a Zener diode that takes more than any of its kind survives.

use super::support::by_diode;
use super::{Check, Evidence, Group, Rule};
use crate::circuit::ElementId;
use crate::finding::{Finding, Severity, quantity};
use crate::operating::Operating;
use crate::swing::Swing;

pub const RULE: Rule = Rule {
    name: "overburdened-diode",
    group: Group::States,
    severity: Severity::Warning,
    also: None,
    summary: "a lamp or a Zener diode dissipates more than any of its kind survives",
    why: "Nothing near it limits its current to what such a diode stands: a resistor in series is missing, or it is joined \
          to the supply or to the winding itself.",
    remedy: "Put the resistor in, or look at the nodes of the diode. A part that is made for so much takes a note: \
             `*@ rating D1 p=50`.",
    source: Some(
        "Lamps of up to some watts and Zener diodes of up to 5 W are common; common practice, no standard",
    ),
    failing: "tide gauge buoy: running lamp behind the wave generator\n\
              V1 ac 0 SIN(0 15 50)\n\
              R1 ac a 500m\n\
              D2 a raw DREC\n\
              C1 raw 0 1000u\n\
              D1 raw 0 DRED\n\
              .tran 50u 200m\n\
              .model DREC D(RS=40m)\n\
              .model DRED D(IS=1e-18 N=2 RS=1)\n",
    passing: "tide gauge buoy: running lamp\n\
              VBUS bus 0 15\n\
              RLAMP bus lamp 1k3\n\
              D1 lamp 0 DRED\n\
              .model DRED D(IS=1e-18 N=2 RS=1)\n",
    check: Check::Time(check),
};

/// Watts of a lamp, and of a Zener diode, beyond which it is a part of a special kind.
const LAMP: f64 = 12.0;
const ZENER: f64 = 20.0;
/// Beyond this, in volts, a breakdown voltage is a limit.
const MOST: f64 = 60.0;
/// Junctions that drop less are rectifiers of another kind.
const SILICON: f64 = 0.35;

fn check(evidence: &Evidence<'_>, operating: &Operating, swing: &Swing) -> Vec<Finding> {
    let diodes = by_diode(operating);
    let judged = diodes.iter().filter_map(|(id, results)| {
        let at_rest = results.iter().filter_map(|(_, d)| d.power);
        let time = swing.diode(*id).and_then(|d| d.over_time.as_ref());
        let over_time = time.filter(|_| swing.window > 0.0).map(|t| t.energy / swing.window);
        let watts = at_rest.map(f64::abs).chain(over_time).fold(0.0, f64::max);
        judge(evidence, operating, *id, watts)
    });
    judged.collect()
}

fn judge(evidence: &Evidence<'_>, operating: &Operating, id: ElementId, watts: f64) -> Option<Finding> {
    let seen = evidence.standing(operating).diode(id)?;
    let is_zener = seen.drop >= SILICON && seen.breakdown.is_some_and(|bv| bv <= MOST);
    let (most, kind) = match (seen.is_led(), is_zener) {
        (true, _) => (LAMP, "a lamp"),
        (false, true) => (ZENER, "a Zener diode"),
        _ => return None,
    };
    if watts <= most || evidence.ratings().contains_key(&id) || evidence.is_told_near(id) {
        return None;
    }
    let message = format!("{} takes {}, more than {kind} stands", evidence.name(id), quantity(watts, "W"));
    let mut finding = evidence.about(&RULE, id, message).label("nothing near it limits its current");
    evidence.name_nodes(&mut finding, &[id]);
    Some(finding.help(format!("{} {}", RULE.why, RULE.remedy)))
}
