//! kneewise as a user of the library calls it: text in, states out.

use kneewise::analysis::{Analysis, analyse};
use kneewise::config::{Options, SecondOpinion};
use kneewise::operating::{Case, Solution};
use kneewise::text::Memory;
use std::path::Path;

/// The whole pipeline over a netlist, states alone.
pub fn states(netlist: &str) -> Analysis {
    with(netlist, SecondOpinion::Nowhere)
}

/// The same with trust and the second opinion.
pub fn trusted(netlist: &str) -> Analysis {
    with(netlist, SecondOpinion::Usual)
}

fn with(netlist: &str, opinion: SecondOpinion) -> Analysis {
    let mut files = Memory::with("network.cir", netlist.as_bytes());
    let options = Options { states: true, opinion, ..Options::default() };
    analyse(&mut files, Path::new("network.cir"), &options).expect("the netlist is in memory")
}

/// The nominal case.
pub fn nominal(analysis: &Analysis) -> Result<&Case, String> {
    let operating = analysis.operating.as_ref().ok_or("no operating point was computed")?;
    let case = operating.cases.first().ok_or("no case was computed")?;
    if case.name == "nominal" { Ok(case) } else { Err(format!("the first case is `{}`", case.name)) }
}

/// Results of a solution by the names a reader sees.
pub struct Named<'a> {
    analysis: &'a Analysis,
    solution: &'a Solution,
}

impl<'a> Named<'a> {
    pub fn new(analysis: &'a Analysis, solution: &'a Solution) -> Self {
        Named { analysis, solution }
    }

    pub fn diode(&self, name: &str) -> Result<&'a kneewise::operating::DiodeResult, String> {
        let circuit = &self.analysis.circuit;
        let mut found = self.solution.diodes.iter().filter(|d| circuit.element_name(d.element) == name);
        only(found.next(), found.next(), name)
    }

    pub fn node(&self, name: &str) -> Result<&'a kneewise::operating::NodeResult, String> {
        let circuit = &self.analysis.circuit;
        let mut found = self.solution.nodes.iter().filter(|n| circuit.node_name(n.node) == name);
        only(found.next(), found.next(), name)
    }

    pub fn branch(&self, name: &str) -> Result<&'a kneewise::operating::BranchResult, String> {
        let circuit = &self.analysis.circuit;
        let mut found = self.solution.branches.iter().filter(|b| circuit.element_name(b.element) == name);
        only(found.next(), found.next(), name)
    }
}

fn only<T>(first: Option<T>, second: Option<T>, name: &str) -> Result<T, String> {
    match (first, second) {
        (Some(one), None) => Ok(one),
        (None, _) => Err(format!("{name} is missing from the results")),
        (Some(_), Some(_)) => Err(format!("{name} stands twice in the results")),
    }
}
