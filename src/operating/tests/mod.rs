//! Tests of the operating point on circuits read from text.

mod conditions;
mod drops;
mod evaluated;
mod flips;
mod proof;
mod switches;
mod words;

use super::assemble::Slots;
use super::condition::{Plan, plan};
use super::declared::declared;
use super::drop::{Diode, diodes};
use super::evaluate::{Text, evaluate};
use super::result::{Operating, Why};
use crate::circuit::directory::Directory;
use crate::circuit::{self, Circuit, ElementId, Reading, ScopeId};
use crate::config::Options;
use crate::finding::Finding;
use crate::text::Memory;
use std::path::Path;

/// A circuit from lines; the title is added.
fn read(lines: &str) -> Reading {
    let mut memory = Memory::with("a.cir", format!("title\n{lines}\n.end\n"));
    circuit::read(&mut memory, Path::new("a.cir"), &Options::default()).unwrap()
}

/// Everything up to the conditions.
struct Laid {
    circuit: Circuit,
    diodes: Vec<Diode>,
    plan: Plan,
    findings: Vec<Finding>,
}

impl Laid {
    fn out(lines: &str, options: &Options) -> Laid {
        let Reading { circuit, parsed, .. } = read(lines);
        let mut findings = Vec::new();
        let directory = Directory::of(&circuit);
        let diodes = diodes(&circuit, Some(&directory), options, &mut findings);
        let declared = declared(&circuit, Some(&parsed), Some(&directory), options, &mut findings);
        let plan = plan(&circuit, &declared, &mut findings);
        Laid { circuit, diodes, plan, findings }
    }

    fn names(&self) -> Vec<&str> {
        self.plan.conditions.iter().map(|c| c.name.as_str()).collect()
    }

    fn rules(&self) -> Vec<&str> {
        self.findings.iter().map(|f| f.rule).collect()
    }

    fn element(&self, name: &str) -> ElementId {
        Directory::of(&self.circuit).element(ScopeId::ROOT, name).unwrap()
    }

    fn slots(&self) -> Slots {
        Slots::of(&self.circuit, &self.plan, &self.diodes)
    }

    /// Value of a source in a condition.
    fn source(&self, condition: &str, name: &str) -> f64 {
        let condition = self.plan.conditions.iter().find(|c| c.name == condition).unwrap();
        let at = self.plan.sources.iter().position(|&id| id == self.element(name)).unwrap();
        condition.sources[at].value
    }
}

/// The whole operating point.
fn evaluated(lines: &str, options: &Options) -> (Operating, Circuit, Vec<Finding>) {
    let Reading { circuit, parsed, sources, .. } = read(lines);
    let text = Text { sources: &sources, parsed: &parsed };
    let (operating, findings) = evaluate(&circuit, Some(text), options);
    (operating, circuit, findings)
}

/// The reasoning about one diode.
fn told(lines: &str, diode: &str) -> Why {
    let options = Options { why: Some(diode.into()), ..Options::default() };
    evaluated(lines, &options).0.why.unwrap()
}
