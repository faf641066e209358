//! The conditions at which a circuit is examined: nominal, the ends and corners of its ranges, what is held on
//! and off, and the two extreme instants of each moving source. Which values hold where, nothing solved.

use super::declared::{Declared, Range, Subject};
use crate::circuit::{Behaviour, Circuit, ElementId, NodeId, Source};
use crate::complementarity::Level;
use crate::finding::{Finding, Severity};
use crate::text::{FileId, Span};
use rustc_hash::FxHashMap;
use std::hash::{DefaultHasher, Hash, Hasher};

/// Most corners that are examined.
pub(crate) const MOST_CORNERS: usize = 64;

/// Most moving sources, and most things held both ways, that have conditions of their own.
pub(crate) const MOST_ALONE: usize = 32;

/// A node that a `supply` note holds against ground.
#[derive(Debug, Clone, PartialEq)]
pub(crate) struct Supply {
    /// The node.
    pub node: NodeId,
    /// Volts in nominal.
    pub volts: Level,
}

/// What each thing is worth in one condition.
#[derive(Debug, Clone, PartialEq)]
pub(crate) struct Condition {
    /// `nominal`, `VIN=9`, `V1=max`.
    pub name: String,
    /// Value of each independent source, in the order of [`Plan::sources`].
    pub sources: Vec<Level>,
    /// Places in the list of the sources that this condition (or `--set`) fixes, whatever the text says.
    pub fixed: Vec<usize>,
    /// Value of each supply, in the order of [`Plan::supplies`].
    pub supplies: Vec<Level>,
    /// Resistors that differ from the text, sorted by element.
    pub resistors: Vec<(ElementId, f64)>,
    /// Parameters that differ from the text.
    pub parameters: Vec<(String, f64)>,
    /// Degrees Celsius.
    pub temperature: f64,
    /// Transistors and switches held on (true) or off, sorted by element.
    pub held: Vec<(ElementId, bool)>,
    /// An extreme instant of a moving source.
    pub instant: bool,
}

/// All conditions.
#[derive(Debug, Clone, PartialEq)]
pub(crate) struct Plan {
    /// Independent sources in the order of the text.
    pub sources: Vec<ElementId>,
    /// Nodes that notes hold.
    pub supplies: Vec<Supply>,
    /// Sources that move over time (and are not set to a constant), in order.
    pub moving: Vec<ElementId>,
    /// Nominal first.
    pub conditions: Vec<Condition>,
}

/// A number as people write it is exact; one that arithmetic made shows more digits.
pub(crate) fn level(value: f64) -> Level {
    let digits =
        format!("{value:e}").split('e').next().map_or(0, |m| m.chars().filter(char::is_ascii_digit).count());
    Level { value, exact: digits <= 12 }
}

/// The independent source of an element, where it is one.
pub(crate) fn source(circuit: &Circuit, id: ElementId) -> Option<&Source> {
    match &circuit.element(id).behaviour {
        Behaviour::VoltageSource(source) | Behaviour::CurrentSource(source) => Some(source),
        _ => None,
    }
}

/// DC value, or where there is none the value at time zero, or 0.
fn standing(source: &Source) -> Level {
    match (source.dc, &source.shape) {
        (Some(dc), _) => Level { value: dc.number, exact: dc.written },
        (None, Some(shape)) => level(shape.value(0.0)),
        (None, None) => Level { value: 0.0, exact: true },
    }
}

/// Lays out the conditions in their order.
pub(crate) fn plan(circuit: &Circuit, declared: &Declared, findings: &mut Vec<Finding>) -> Plan {
    let sources: Vec<ElementId> =
        circuit.elements().map(|(id, _)| id).filter(|&id| source(circuit, id).is_some()).collect();
    let fixed = |id: ElementId| declared.set.iter().find(|(set, _)| *set == id).map(|(_, v)| level(*v));
    let is_moving = |id: ElementId| {
        fixed(id).is_none() && source(circuit, id).and_then(|s| s.shape.as_ref()).is_some_and(moves)
    };
    let moving: Vec<ElementId> = sources.iter().copied().filter(|&id| is_moving(id)).collect();
    let value = |&id: &ElementId| {
        fixed(id).or_else(|| source(circuit, id).map(standing)).unwrap_or(Level { value: 0.0, exact: true })
    };
    let nominal = Condition {
        name: "nominal".into(),
        sources: sources.iter().map(value).collect(),
        fixed: (0..sources.len()).filter(|&n| fixed(sources[n]).is_some()).collect(),
        supplies: declared.supplies.iter().map(|s| s.volts).collect(),
        resistors: Vec::new(),
        parameters: Vec::new(),
        temperature: declared.temperature,
        held: declared.held.clone(),
        instant: false,
    };
    let mut plan = Plan { sources, supplies: declared.supplies.clone(), moving, conditions: vec![nominal] };
    plan.add_ranges(circuit, declared);
    plan.add_instants(circuit);
    findings.extend(left_out(circuit, declared, &plan));
    plan
}

/// What has no condition because there would be too many.
fn left_out(circuit: &Circuit, declared: &Declared, plan: &Plan) -> Vec<Finding> {
    let (ranges, both, moving) = (declared.ranges.len(), declared.both.len(), plan.moving.len());
    let mut said = Vec::new();
    if ranges > MOST_CORNERS.ilog2() as usize {
        let span = declared.ranges.first().map(|r| r.span);
        said.push((
            span,
            format!("{ranges} ranges have 2^{ranges} corners; each end was examined alone, no corners"),
        ));
    } else if ranges > 0 && both > 0 && (1 << ranges) * both.min(MOST_ALONE) > MOST_CORNERS {
        let span = declared.ranges.first().map(|r| r.span);
        said.push((span, format!("{ranges} ranges and {both} parts held on and off have too many combinations; the corners were examined with all of them off")));
    }
    let place = |id: &ElementId| Some(circuit.element(*id).statement);
    if both > MOST_ALONE {
        let span = declared.both.first().and_then(place);
        said.push((
            span,
            format!(
                "{both} parts are held both ways; the first {MOST_ALONE} were examined on, one at a time"
            ),
        ));
    }
    if moving > MOST_ALONE {
        let span = plan.moving.first().and_then(place);
        said.push((span, format!("{moving} sources move over time; the extreme instants of the first {MOST_ALONE} were examined")));
    }
    let finding = |(span, message): (Option<Span>, String)| {
        let span = span.unwrap_or(Span::new(FileId(0), 0, 0));
        Finding::new("corners-left-out", Severity::Note, span, message)
            .label("the first of them")
            .help("Up to six ranges are examined in all combinations. Keep ranges of what matters together, or split the file, to have the rest examined.")
    };
    said.into_iter().map(finding).collect()
}

impl Condition {
    /// The same condition of a circuit that was expanded with other parameters: what is not fixed here takes its
    /// value from there.
    pub fn of_variant(&self, circuit: &Circuit, sources: &[ElementId]) -> Condition {
        let mut condition = self.clone();
        if self.instant {
            return condition;
        }
        for (at, (value, &id)) in condition.sources.iter_mut().zip(sources).enumerate() {
            if let Some(source) = source(circuit, id).filter(|_| !self.fixed.contains(&at)) {
                *value = standing(source);
            }
        }
        condition
    }
}

/// Whether a shape is worth more than one value.
fn moves(shape: &crate::circuit::Shape) -> bool {
    let (most, least) = shape.extremes(None);
    shape.value(most) != shape.value(least)
}

impl Condition {
    /// Whether both ask the same question, whatever they are called.
    fn is_alike(&self, other: &Condition) -> bool {
        self.sources == other.sources
            && self.fixed == other.fixed
            && self.supplies == other.supplies
            && self.resistors == other.resistors
            && self.parameters == other.parameters
            && self.temperature == other.temperature
            && self.held == other.held
            && self.instant == other.instant
    }

    /// Alike for the values of conditions that are alike. A quick hash takes an even number of turned signs for none.
    fn fingerprint(&self) -> u64 {
        let mut hasher = DefaultHasher::new();
        for level in self.sources.iter().chain(&self.supplies) {
            level.value.to_bits().hash(&mut hasher);
        }
        for (id, ohms) in &self.resistors {
            (id, ohms.to_bits()).hash(&mut hasher);
        }
        self.held.hash(&mut hasher);
        (self.temperature.to_bits(), self.instant).hash(&mut hasher);
        hasher.finish()
    }
}

impl Plan {
    /// For each condition the first that is alike: sources that move together have their extreme instants together,
    /// and one answer holds for all of them.
    pub(crate) fn twins(&self) -> Vec<usize> {
        let mut first: FxHashMap<u64, usize> = FxHashMap::default();
        let twin = |(number, condition): (usize, &Condition)| {
            let known = *first.entry(condition.fingerprint()).or_insert(number);
            if self.conditions[known].is_alike(condition) { known } else { number }
        };
        self.conditions.iter().enumerate().map(twin).collect()
    }

    /// Each end alone, each held thing on and off, then all corners, and all corners with each thing on.
    fn add_ranges(&mut self, circuit: &Circuit, declared: &Declared) {
        let ends: Vec<Vec<Change<'_>>> = declared.ranges.iter().map(ends).collect();
        let both = &declared.both[..declared.both.len().min(MOST_ALONE)];
        let on: Vec<Change<'_>> = both.iter().map(|&id| Change::Hold(id, true)).collect();
        for change in ends.iter().flatten() {
            self.add(circuit, &[*change]);
        }
        for &id in both {
            self.add(circuit, &[Change::Hold(id, true)]);
            self.add(circuit, &[Change::Hold(id, false)]);
        }
        let corners = corners(&ends);
        if declared.ranges.len() > 1 {
            for corner in &corners {
                self.add(circuit, corner);
            }
        }
        if !ends.is_empty() && corners.len() * on.len() <= MOST_CORNERS {
            for (corner, held) in corners.iter().flat_map(|c| on.iter().map(move |h| (c, *h))) {
                self.add(circuit, &[corner.as_slice(), &[held]].concat());
            }
        }
    }

    /// `V1=max` and `V1=min`: every other source stands at its value then, ranges at nominal.
    fn add_instants(&mut self, circuit: &Circuit) {
        let stop = circuit.transient.map(|t| t.stop);
        for id in self.moving.iter().take(MOST_ALONE).copied().collect::<Vec<_>>() {
            let Some(shape) = source(circuit, id).and_then(|s| s.shape.as_ref()) else { continue };
            let (most, least) = shape.extremes(stop);
            for (word, t) in [("max", most), ("min", least)] {
                let mut condition = self.conditions[0].clone();
                condition.name = format!("{}={word}", circuit.element_name(id));
                condition.instant = true;
                for (value, &other) in condition.sources.iter_mut().zip(&self.sources) {
                    let shape = source(circuit, other).and_then(|s| s.shape.as_ref());
                    if let Some(shape) = shape.filter(|_| self.moving.binary_search(&other).is_ok()) {
                        *value = level(shape.value(t));
                    }
                }
                self.conditions.push(condition);
            }
        }
    }

    fn add(&mut self, circuit: &Circuit, changes: &[Change<'_>]) {
        let mut condition = self.conditions[0].clone();
        let names: Vec<String> = changes.iter().map(|c| c.name(circuit)).collect();
        condition.name = names.join(",");
        for change in changes {
            change.apply(self, &mut condition);
        }
        self.conditions.push(condition);
    }
}

/// A number as a name shows it: the digits that arithmetic leaves behind are cut off.
fn shown(value: f64) -> f64 {
    format!("{value:.11e}").parse().unwrap_or(value)
}

/// One thing that a condition changes against nominal.
#[derive(Clone, Copy)]
enum Change<'a> {
    End(&'a Range, f64),
    Hold(ElementId, bool),
}

impl Change<'_> {
    fn name(&self, circuit: &Circuit) -> String {
        match self {
            Change::End(range, value) => format!("{}={}", range.name, shown(*value)),
            Change::Hold(id, on) => {
                format!("{}={}", circuit.element_name(*id), if *on { "on" } else { "off" })
            }
        }
    }

    fn apply(&self, plan: &Plan, condition: &mut Condition) {
        match self {
            Change::End(range, value) => match &range.subject {
                Subject::Source(id) => {
                    if let Ok(at) = plan.sources.binary_search(id) {
                        condition.sources[at] = level(*value);
                        condition.fixed.push(at);
                    }
                }
                Subject::Supply(at) => condition.supplies[*at] = level(*value),
                Subject::Resistor(id) => put(&mut condition.resistors, *id, *value),
                Subject::Parameter(name) => condition.parameters.push((name.clone(), *value)),
                Subject::Temperature => condition.temperature = *value,
            },
            Change::Hold(id, on) => put(&mut condition.held, *id, *on),
        }
    }
}

/// Puts a value into a list sorted by element.
fn put<T>(list: &mut Vec<(ElementId, T)>, id: ElementId, value: T) {
    match list.binary_search_by_key(&id, |e| e.0) {
        Ok(at) => list[at].1 = value,
        Err(at) => list.insert(at, (id, value)),
    }
}

/// Both ends of a range; one where they are one.
fn ends(range: &Range) -> Vec<Change<'_>> {
    let mut ends = vec![Change::End(range, range.from)];
    if range.to != range.from {
        ends.push(Change::End(range, range.to));
    }
    ends
}

/// All combinations, the last declared changing fastest; one empty combination where nothing is declared, none
/// where there would be too many.
fn corners<'a>(ends: &[Vec<Change<'a>>]) -> Vec<Vec<Change<'a>>> {
    if ends.len() >= usize::BITS as usize || 1 << ends.len() > MOST_CORNERS {
        return Vec::new();
    }
    let mut all = vec![Vec::new()];
    for pair in ends {
        all = all
            .iter()
            .flat_map(|corner| pair.iter().map(move |end| [corner.as_slice(), &[*end]].concat()))
            .collect();
    }
    all
}
