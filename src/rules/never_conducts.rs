//! A diode that no closed path lets conduct.

use super::{Check, Evidence, Rule, list};
use crate::circuit::ElementId;
use crate::finding::{Finding, Severity};
use crate::topology::Barred;
use rustc_hash::FxHashSet;

pub const RULE: Rule = Rule {
    name: "never-conducts",
    group: "orientation",
    severity: Severity::Warning,
    summary: "no closed path lets a diode conduct, whatever the values are",
    why: "A current needs a closed path. Every path through this diode ends, or meets another diode that only \
          passes the other way, so it never carries forward current.",
    remedy: "Turn the diode that points the wrong way round, or close the path.",
    source: Some(
        "A branch lies in a directed loop or in a directed cut, never in both: G. J. Minty, Monotone \
                  networks, Proc. R. Soc. Lond. A 257 (1960) 194-212",
    ),
    failing: "tide gauge buoy: isolated sensor supply\n\
              V1 prim 0 SIN(0 12 50)\n\
              R1 prim p 1\n\
              L1 p 0 100m\n\
              L2 s1 s2 100m\n\
              K1 L1 L2 0.98\n\
              RS s1 s2 10k\n\
              D1 s1 raw DRECT\n\
              C1 raw ret 470u\n\
              RLOAD raw ret 1k\n\
              .model DRECT D(IS=2.5n N=1.7)\n",
    passing: "tide gauge buoy: isolated sensor supply\n\
              V1 prim 0 SIN(0 12 50)\n\
              R1 prim p 1\n\
              L1 p 0 100m\n\
              L2 s1 0 100m\n\
              K1 L1 L2 0.98\n\
              RS s1 0 10k\n\
              D1 s1 raw DRECT\n\
              C1 raw 0 470u\n\
              RLOAD raw 0 1k\n\
              .model DRECT D(IS=2.5n N=1.7)\n",
    check: Check::Wiring(check),
};

fn check(evidence: &Evidence<'_>) -> Vec<Finding> {
    let opposed: FxHashSet<ElementId> =
        super::opposed_in_series::pairs(evidence).into_iter().flat_map(|p| p.diodes).collect();
    let is_cause =
        |b: &&Barred| !b.loose_end && !opposed.contains(&b.diode) && !is_shorted(evidence, b.diode);
    let mut barred: Vec<Barred> = evidence.wiring.one_way.barred.iter().filter(is_cause).copied().collect();
    // diodes between the same two parts share one cause
    barred.sort_by_key(|b| (b.components, b.diode));
    let mut findings: Vec<Finding> =
        barred.chunk_by(|a, b| a.components == b.components).map(|group| judge(evidence, group)).collect();
    findings.sort_by_key(|f| f.span);
    findings
}

fn is_shorted(evidence: &Evidence<'_>, id: ElementId) -> bool {
    evidence.circuit.node(id, 0) == evidence.circuit.node(id, 1)
}

fn judge(evidence: &Evidence<'_>, group: &[Barred]) -> Finding {
    let first = group[0];
    let names: Vec<String> = group.iter().map(|b| evidence.name(b.diode)).collect();
    let (anode, cathode) = (evidence.circuit.node(first.diode, 0), evidence.circuit.node(first.diode, 1));
    let reason = if first.dead_end {
        format!(
            "it is the only link from `{}` to `{}`, so no current can come back",
            evidence.node(anode),
            evidence.node(cathode)
        )
    } else if group.len() == 1 {
        format!(
            "every way back from `{}` to `{}` meets a diode that points against it",
            evidence.node(cathode),
            evidence.node(anode)
        )
    } else {
        "they all point the same way between two parts of the circuit, and nothing leads back".to_owned()
    };
    let message = format!("{} can never conduct: {reason}", list(&names));
    let mut finding = evidence.about(&RULE, first.diode, message).label("no closed path passes this way");
    for other in group.iter().skip(1).take(8) {
        finding = finding.also(evidence.statement(other.diode), "nor this way");
    }
    finding.subjects.extend(names.into_iter().skip(1));
    finding.help(format!("{} {}", RULE.why, RULE.remedy))
}
