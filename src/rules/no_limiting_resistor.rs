//! Current around a loop of sources and diodes that nothing limits but the diodes' own series resistance.

use super::{Check, Evidence, Group, Rule, in_cases, list};
use crate::circuit::{Behaviour, ElementId, NodeId, State};
use crate::finding::{Finding, Severity, quantity};
use crate::operating::{Case, DiodeResult, Operating, Solution};
use petgraph::algo::kosaraju_scc;
use petgraph::graph::{DiGraph, NodeIndex};
use petgraph::unionfind::UnionFind;
use std::collections::BTreeMap;

pub const RULE: Rule = Rule {
    name: "no-limiting-resistor",
    group: Group::Orientation,
    severity: Severity::Warning,
    also: None,
    summary: "a source drives its current straight through diodes, with nothing but their own resistance to limit it",
    why: "Around the loop there is no load: the source stands across the diodes, and the few ohms of leads and \
          junctions take what their drops leave over. Real parts would not survive it.",
    remedy: "Put the series resistor in, or turn the diode round that lies forward across the source.",
    source: Some(
        "A directed loop of sources and conducting diodes has no load in it: G. J. Minty, Monotone networks, Proc. R. \
         Soc. Lond. A 257 (1960) 194-212",
    ),
    failing: "tide gauge buoy: hatch lamp\n\
              V5 v5 0 5\n\
              D1 v5 0 DWHITE\n\
              .model DWHITE D(IS=1e-26 N=2 RS=2)\n",
    passing: "tide gauge buoy: hatch lamp\n\
              V5 v5 0 5\n\
              R1 v5 lamp 150\n\
              D1 lamp 0 DWHITE\n\
              .model DWHITE D(IS=1e-26 N=2 RS=2)\n",
    check: Check::States(check),
};

/// What the diodes' own resistances take must be more than rounding of a drop.
const LEFT_OVER: f64 = 1.0;
/// Up to here a resistance is a lead, a fuse or a winding.
const LEAD: f64 = 5.0;
/// From here on a current through leads alone is a short circuit.
const SHORT: f64 = 3.0;

/// Diodes of one loop and the conditions in which it is closed.
struct Loop {
    current: f64,
    cases: Vec<usize>,
    leads: Vec<ElementId>,
}

fn check(evidence: &Evidence<'_>, operating: &Operating) -> Vec<Finding> {
    let mut loops: BTreeMap<Vec<ElementId>, Loop> = BTreeMap::new();
    for (number, case) in operating.cases.iter().enumerate() {
        for leads in [false, true] {
            for (diodes, current, leads) in closed(evidence, operating, case, leads) {
                let one = loops.entry(diodes).or_insert(Loop { current, cases: Vec::new(), leads });
                one.current = one.current.max(current);
                if one.cases.last() != Some(&number) {
                    one.cases.push(number);
                }
            }
        }
    }
    loops.iter().filter_map(|(diodes, one)| judge(evidence, operating, diodes, one)).collect()
}

/// Loops that are closed in a condition: their diodes, the greatest current, the leads among them.
fn closed(
    evidence: &Evidence<'_>,
    operating: &Operating,
    case: &Case,
    with_leads: bool,
) -> Vec<(Vec<ElementId>, f64, Vec<ElementId>)> {
    let Some(solution) = case.solutions.first() else { return Vec::new() };
    let is_timed = |d: &DiodeResult| case.instant && operating.left_to_time.binary_search(&d.element).is_ok();
    let carrying: Vec<&DiodeResult> = solution.diodes.iter().filter(|d| carries(d) && !is_timed(d)).collect();
    if carrying.is_empty() {
        return Vec::new();
    }
    let (sets, leads) = stiff(evidence, case, solution, with_leads);
    let is_short = |diodes: &[&DiodeResult]| {
        let amps = |d: &&DiodeResult| d.current.known().unwrap_or(0.0).abs();
        let most = diodes.iter().map(amps).fold(0.0, f64::max);
        let left_over: f64 = diodes.iter().map(|d| amps(d) * d.series).sum();
        (if with_leads { most >= SHORT } else { left_over >= LEFT_OVER }).then_some(most)
    };
    let loops = round_loops(evidence, &carrying, &sets).into_iter().filter_map(|diodes| {
        let most = is_short(&diodes)?;
        let mut ids: Vec<ElementId> = diodes.iter().map(|d| d.element).collect();
        ids.sort();
        ids.dedup();
        Some((ids, most, leads.clone()))
    });
    loops.collect()
}

fn carries(diode: &DiodeResult) -> bool {
    matches!(diode.state, State::Conducting | State::Breakdown)
        && diode.current.known().is_some_and(|i| i.abs() > 1e-3)
}

/// Nodes that sources and closed switches join without resistance, or with no more than that of leads, and the leads.
fn stiff(
    evidence: &Evidence<'_>,
    case: &Case,
    solution: &Solution,
    with_leads: bool,
) -> (UnionFind<u32>, Vec<ElementId>) {
    let circuit = evidence.circuit;
    let volts = |node: NodeId| match node {
        NodeId::GROUND => Some(0.0),
        _ => solution.nodes.get(node.index() - 1).and_then(|n| n.voltage.known()),
    };
    let closed_switch = |id: ElementId, far: usize| {
        let ends = (volts(circuit.node(id, 0)), volts(circuit.node(id, far)));
        matches!(ends, (Some(a), Some(b)) if (a - b).abs() < 1e-3)
    };
    let mut sets = UnionFind::<u32>::new(circuit.nodes.len().max(1));
    let mut leads = Vec::new();
    for (id, element) in circuit.elements() {
        let far = match &element.behaviour {
            Behaviour::VoltageSource(_)
            | Behaviour::VoltageByVoltage { .. }
            | Behaviour::VoltageByCurrent { .. } => 1,
            Behaviour::Resistor(ohms) if ohms.number == 0.0 => 1,
            Behaviour::Resistor(ohms) if with_leads && ohms.number > 0.0 && ohms.number <= LEAD => {
                leads.push(id);
                1
            }
            Behaviour::Transistor { .. } if closed_switch(id, 2) => 2,
            _ => continue,
        };
        sets.union(circuit.node(id, 0).0, circuit.node(id, far).0);
    }
    for (node, _) in &case.supplies {
        sets.union(node.0, 0);
    }
    (sets, leads)
}

/// The diodes of each directed loop that they form over joined nodes.
fn round_loops<'o>(
    evidence: &Evidence<'_>,
    carrying: &[&'o DiodeResult],
    sets: &UnionFind<u32>,
) -> Vec<Vec<&'o DiodeResult>> {
    let mut graph: DiGraph<(), usize> = DiGraph::new();
    let mut places: BTreeMap<u32, NodeIndex> = BTreeMap::new();
    for (n, diode) in carrying.iter().enumerate() {
        let mut place = |pin: usize| {
            let set = sets.find(evidence.circuit.node(diode.element, pin).0);
            *places.entry(set).or_insert_with(|| graph.add_node(()))
        };
        let (anode, cathode) = (place(0), place(1));
        match diode.state {
            State::Conducting => graph.add_edge(anode, cathode, n),
            _ => graph.add_edge(cathode, anode, n),
        };
    }
    let mut component = vec![0; graph.node_count()];
    for (number, members) in kosaraju_scc(&graph).iter().enumerate() {
        members.iter().for_each(|m| component[m.index()] = number);
    }
    let mut found: BTreeMap<usize, Vec<&DiodeResult>> = BTreeMap::new();
    for edge in graph.edge_indices() {
        if let Some((a, b)) = graph.edge_endpoints(edge)
            && component[a.index()] == component[b.index()]
        {
            found.entry(component[a.index()]).or_default().push(carrying[graph[edge]]);
        }
    }
    found.into_values().collect()
}

fn judge(
    evidence: &Evidence<'_>,
    operating: &Operating,
    diodes: &[ElementId],
    one: &Loop,
) -> Option<Finding> {
    let (&first, others) = diodes.split_first()?;
    // a lead that is told, such as a megohm read as a milliohm, is no lead
    if one.leads.iter().any(|&id| evidence.is_told_near(id)) {
        return None;
    }
    let names: Vec<String> = diodes.iter().map(|&id| evidence.name(id)).collect();
    let (verb, what) = if names.len() == 1 { ("lies", "its") } else { ("lie", "their") };
    let limit = if one.leads.is_empty() {
        format!("nothing but {what} own series resistance")
    } else {
        "nothing but leads".into()
    };
    let message = format!(
        "{} {verb} straight across a source: {limit} limits the current, which comes to {}{}",
        list(&names),
        quantity(one.current, "A"),
        in_cases(operating, &one.cases)
    );
    let mut finding = evidence.about(&RULE, first, message).label("carries it without a load");
    for &id in others.iter().take(6) {
        finding = finding.also(evidence.statement(id), "in the same loop");
    }
    finding.subjects.extend(names.into_iter().skip(1));
    let mut sources: Vec<(ElementId, NodeId)> = Vec::new();
    for &id in diodes {
        for pin in [0, 1] {
            let end = super::behind(evidence, id, pin).end;
            sources.extend(evidence.wiring.rails.source(end).map(|s| (s, end)));
        }
    }
    // a source behind leads: those that stand across the diodes' nodes in any way
    let rails = &evidence.wiring.rails;
    for lead in &one.leads {
        for pin in evidence.circuit.pins(*lead) {
            sources.extend(rails.source(pin.node).map(|s| (s, pin.node)));
        }
    }
    sources.sort();
    sources.dedup();
    sources.truncate(6);
    for (source, node) in sources {
        finding = finding.also(evidence.statement(source), "drives it");
        finding.subjects.extend([evidence.name(source), evidence.node(node)]);
    }
    evidence.name_nodes(&mut finding, diodes);
    Some(finding.help(format!("{} {}", RULE.why, RULE.remedy)))
}
