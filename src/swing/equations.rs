//! Writes a part down as equations of time: unknowns, storage, junctions, gates. Potentials of a set of nodes that no
//! resistance, storage or source ties to ground are counted from one of its own nodes, so that a loose set loses no
//! digits.

use super::inputs::Given;
use super::parts::PartList;
use crate::circuit::{Behaviour, Circuit, ElementId, NodeId};
use crate::complementarity::stepping::{Affine, Cell, Gate, StepJunction, System};
use crate::operating::{Basis, Standing};
use petgraph::unionfind::UnionFind;
use rustc_hash::FxHashMap;

/// Resistances below this carry their current as an unknown, ohms.
const LOW: f64 = 1e-6;

/// A switch that follows sources.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Follower {
    /// Its control voltage over all inputs.
    pub control: Affine,
    /// Closes above the first, opens below the second; volts.
    pub levels: (f64, f64),
}

/// A part as equations.
pub(super) struct Equations {
    pub system: System,
    /// Moving sources that it depends on, by their numbers among all inputs.
    pub inputs: Vec<usize>,
    /// Potential of each node of the part, in the part's order.
    pub nodes: Vec<Affine>,
    /// The diodes, in the order of the junctions.
    pub diodes: Vec<ElementId>,
    /// The storage elements, in the order of the cells.
    pub storage: Vec<ElementId>,
    /// What the gates follow, in their order.
    pub followers: Vec<Follower>,
    /// Largest voltage or level that is written in it.
    pub volts: f64,
}

/// Builds the equations, or says why the part cannot be followed.
pub(super) fn equations(
    circuit: &Circuit,
    basis: &Basis,
    given: &Given<'_>,
    part: &PartList,
) -> Result<Equations, String> {
    let mut writer = Writer::new(circuit, basis, given);
    writer.potentials(part);
    for &id in &part.elements {
        writer.element(id)?;
    }
    writer.couplings(part)?;
    writer.listeners()?;
    Ok(writer.finish(part))
}

struct Writer<'a> {
    circuit: &'a Circuit,
    basis: &'a Basis,
    given: &'a Given<'a>,
    system: System,
    inputs: Vec<usize>,
    nodes: FxHashMap<NodeId, Affine>,
    diodes: Vec<ElementId>,
    storage: Vec<ElementId>,
    followers: Vec<Follower>,
    /// Unknown current of elements that have one.
    currents: FxHashMap<ElementId, u32>,
    /// Cell of each inductor.
    coils: FxHashMap<ElementId, u32>,
    listeners: Vec<ElementId>,
    volts: f64,
}

impl<'a> Writer<'a> {
    fn new(circuit: &'a Circuit, basis: &'a Basis, given: &'a Given<'a>) -> Self {
        Writer {
            circuit,
            basis,
            given,
            system: System::default(),
            inputs: Vec::new(),
            nodes: FxHashMap::default(),
            diodes: Vec::new(),
            storage: Vec::new(),
            followers: Vec::new(),
            currents: FxHashMap::default(),
            coils: FxHashMap::default(),
            listeners: Vec::new(),
            volts: 0.0,
        }
    }

    fn unknown(&mut self, is_current: bool) -> u32 {
        self.system.is_current.push(is_current);
        self.system.is_current.len() as u32 - 1
    }

    /// Gives every node its potential as a sum of unknowns.
    fn potentials(&mut self, part: &PartList) {
        let ground = part.nodes.len() as u32;
        let place: FxHashMap<NodeId, u32> =
            part.nodes.iter().enumerate().map(|(n, &node)| (node, n as u32)).collect();
        let at = |node: NodeId| place.get(&node).copied().unwrap_or(ground);
        let mut tied = UnionFind::<u32>::new(part.nodes.len() + 1);
        for &id in &part.elements {
            if let Some((a, b)) = self.ties(id) {
                tied.union(at(a), at(b));
            }
        }
        let mut base: FxHashMap<u32, Option<u32>> = FxHashMap::default();
        base.insert(tied.find_mut(ground), None);
        for (n, &node) in part.nodes.iter().enumerate() {
            let set = tied.find_mut(n as u32);
            let potential = match base.get(&set) {
                None => {
                    // the first node of a loose set stands for all of it
                    let unknown = self.unknown(false);
                    base.insert(set, Some(unknown));
                    self.system.entries.push((unknown, unknown, crate::complementarity::stepping::TIE));
                    vec![(unknown, 1.0)]
                }
                Some(&Some(common)) => {
                    let own = self.unknown(false);
                    vec![(own, 1.0), (common, 1.0)]
                }
                Some(None) => vec![(self.unknown(false), 1.0)],
            };
            self.nodes.insert(node, Affine { unknowns: potential, ..Affine::default() });
        }
    }

    /// The two nodes whose difference an element fixes in a stage, whatever the modes.
    fn ties(&self, id: ElementId) -> Option<(NodeId, NodeId)> {
        let circuit = self.circuit;
        let (a, b) = (circuit.node(id, 0), circuit.node(id, 1));
        match &circuit.element(id).behaviour {
            Behaviour::Resistor(_)
            | Behaviour::Capacitor { .. }
            | Behaviour::Inductor { .. }
            | Behaviour::VoltageSource(_)
            | Behaviour::VoltageByVoltage { .. }
            | Behaviour::VoltageByCurrent { .. } => Some((a, b)),
            Behaviour::VoltageSwitch { .. }
            | Behaviour::CurrentSwitch { .. }
            | Behaviour::Transistor { .. } => match self.basis.standing(circuit, id) {
                Standing::Open => None,
                _ => Some(crate::operating::main_path(circuit, id)),
            },
            _ => None,
        }
    }

    /// Number of an input among those of this part.
    fn local(&mut self, mut sum: Affine) -> Affine {
        for (input, _) in &mut sum.inputs {
            let global = *input as usize;
            let at = self.inputs.iter().position(|&n| n == global).unwrap_or_else(|| {
                self.inputs.push(global);
                self.inputs.len() - 1
            });
            *input = at as u32;
        }
        self.volts = self.volts.max(sum.constant.abs());
        sum
    }

    fn node(&mut self, node: NodeId) -> Affine {
        match (self.nodes.get(&node), self.given.held.get(node.index())) {
            (Some(sum), _) => sum.clone(),
            (None, Some(Some(held))) => self.local(held.clone()),
            _ => Affine::default(),
        }
    }

    fn between(&mut self, plus: NodeId, minus: NodeId) -> Affine {
        let (plus, minus) = (self.node(plus), self.node(minus));
        plus.minus(&minus)
    }

    fn across(&mut self, id: ElementId) -> Affine {
        self.between(self.circuit.node(id, 0), self.circuit.node(id, 1))
    }

    /// A current as an unknown, that flows along `across` and has a row of its own: `across − … = value`.
    fn branch(&mut self, id: ElementId, across: &Affine) -> u32 {
        let current = self.unknown(true);
        for &(row, factor) in &across.unknowns {
            self.system.entries.push((row, current, factor));
            self.system.entries.push((current, row, factor));
        }
        self.currents.insert(id, current);
        current
    }

    /// The row of a voltage: `across = value`, with next to no resistance.
    fn voltage(&mut self, id: ElementId, across: &Affine, value: &Affine, ohms: f64) -> u32 {
        let row = self.branch(id, across);
        let diagonal = -(ohms + crate::complementarity::stepping::BARE);
        self.system.entries.push((row, row, diagonal));
        self.right(row, &value.minus(across));
        row
    }

    /// Adds the given share of a sum to a right-hand side.
    fn right(&mut self, row: u32, sum: &Affine) {
        if sum.constant != 0.0 {
            self.system.constant.push((row, sum.constant));
        }
        for &(input, factor) in &sum.inputs {
            self.system.drive.push((row, input, factor));
        }
    }

    fn conductance(&mut self, across: &Affine, siemens: f64) {
        for &(row, a) in &across.unknowns {
            for &(col, b) in &across.unknowns {
                self.system.entries.push((row, col, siemens * a * b));
            }
            let pushed = Affine {
                inputs: across.inputs.iter().map(|&(n, f)| (n, -siemens * a * f)).collect(),
                constant: -siemens * a * across.constant,
                ..Affine::default()
            };
            self.right(row, &pushed);
        }
    }

    fn resistor(&mut self, id: ElementId, across: &Affine, ohms: f64) -> Result<(), String> {
        if !ohms.is_finite() {
            return Err(self.told(id, "has no value that can be used"));
        }
        if ohms.abs() < LOW {
            self.voltage(id, across, &Affine::default(), ohms);
        } else {
            self.conductance(across, 1.0 / ohms);
        }
        Ok(())
    }

    fn told(&self, id: ElementId, what: &str) -> String {
        format!("{} {what}", self.circuit.element_name(id))
    }

    fn element(&mut self, id: ElementId) -> Result<(), String> {
        let circuit = self.circuit;
        match &circuit.element(id).behaviour {
            Behaviour::Resistor(ohms) => {
                let across = self.across(id);
                self.resistor(id, &across, ohms.number)
            }
            Behaviour::Capacitor { farads, .. } => self.capacitor(id, farads.number),
            Behaviour::Inductor { henries, .. } => self.inductor(id, henries.number),
            Behaviour::Coupling { .. } => Ok(()),
            Behaviour::VoltageSource(_) | Behaviour::CurrentSource(_) => {
                self.source(id);
                Ok(())
            }
            Behaviour::Diode { .. } => self.diode(id),
            Behaviour::VoltageByVoltage { gain } => {
                self.voltage_by_voltage(id, gain.number);
                Ok(())
            }
            Behaviour::CurrentByVoltage { gain } => {
                self.current_by_voltage(id, gain.number);
                Ok(())
            }
            Behaviour::VoltageByCurrent { .. } => {
                let across = self.across(id);
                self.voltage(id, &across, &Affine::default(), 0.0);
                self.listeners.push(id);
                Ok(())
            }
            Behaviour::CurrentByCurrent { .. } => {
                self.listeners.push(id);
                Ok(())
            }
            Behaviour::VoltageSwitch { .. }
            | Behaviour::CurrentSwitch { .. }
            | Behaviour::Transistor { .. } => self.switch(id),
            Behaviour::Unknown { reason } => {
                Err(format!("{} is not evaluated: {reason}", circuit.element_name(id)))
            }
        }
    }

    fn source(&mut self, id: ElementId) {
        let (across, value) = (self.across(id), self.given.source(id));
        let value = self.local(value);
        if matches!(self.circuit.element(id).behaviour, Behaviour::CurrentSource(_)) {
            self.push(&across, &value);
        } else {
            self.voltage(id, &across, &value, 0.0);
        }
    }

    fn voltage_by_voltage(&mut self, id: ElementId, gain: f64) {
        let (across, control) = (self.across(id), self.control(id));
        self.system.one_sided = true;
        let row = self.voltage(id, &across, &scaled(&control, gain), 0.0);
        for &(col, factor) in &control.unknowns {
            self.system.entries.push((row, col, -gain * factor));
        }
    }

    fn current_by_voltage(&mut self, id: ElementId, gain: f64) {
        let (across, control) = (self.across(id), self.control(id));
        self.system.one_sided = true;
        for &(row, a) in &across.unknowns {
            for &(col, b) in &control.unknowns {
                self.system.entries.push((row, col, gain * a * b));
            }
        }
        self.push(&across, &Affine { unknowns: Vec::new(), ..scaled(&control, gain) });
    }

    /// What a controlled source listens to: the voltage between its third and fourth node.
    fn control(&mut self, id: ElementId) -> Affine {
        self.between(self.circuit.node(id, 2), self.circuit.node(id, 3))
    }

    /// A given current along `across`.
    fn push(&mut self, across: &Affine, value: &Affine) {
        for &(row, factor) in &across.unknowns {
            self.right(row, &scaled(value, -factor));
        }
    }

    fn capacitor(&mut self, id: ElementId, farads: f64) -> Result<(), String> {
        if farads == 0.0 {
            return Ok(());
        }
        if !(farads > 0.0 && farads.is_finite()) {
            return Err(self.told(id, "has a capacitance that cannot be followed"));
        }
        let across = self.across(id);
        if across.unknowns.is_empty() {
            return Ok(()); // both ends are held: it changes nothing here
        }
        self.storage.push(id);
        self.system.cells.push(Cell::Capacitance { farads, across });
        Ok(())
    }

    fn inductor(&mut self, id: ElementId, henries: f64) -> Result<(), String> {
        let across = self.across(id);
        if henries == 0.0 {
            self.voltage(id, &across, &Affine::default(), 0.0);
            return Ok(());
        }
        if !(henries > 0.0 && henries.is_finite()) {
            return Err(self.told(id, "has an inductance that cannot be followed"));
        }
        let current = self.branch(id, &across);
        self.right(current, &Affine::default().minus(&across));
        let cell = self.system.cells.len() as u32;
        self.coils.insert(id, cell);
        self.storage.push(id);
        self.system.cells.push(Cell::Inductance { current, flux: vec![(cell, henries)] });
        Ok(())
    }

    fn diode(&mut self, id: ElementId) -> Result<(), String> {
        let Some(numbers) = self.basis.junction(id) else {
            return Err(self.told(id, "has no numbers that can be used"));
        };
        let across = self.across(id);
        let current = self.branch(id, &across);
        self.volts = self.volts.max(numbers.forward);
        self.diodes.push(id);
        self.system.junctions.push(StepJunction {
            current,
            across,
            forward: numbers.forward,
            reverse: numbers.reverse.unwrap_or(f64::INFINITY),
            series: numbers.series,
        });
        Ok(())
    }

    fn switch(&mut self, id: ElementId) -> Result<(), String> {
        let (a, b) = crate::operating::main_path(self.circuit, id);
        let across = self.between(a, b);
        match self.basis.standing(self.circuit, id) {
            Standing::Open => Ok(()),
            Standing::Through(ohms) => self.resistor(id, &across, ohms),
            Standing::Follows { closes, opens, on, off } => {
                let (plus, minus) = (self.circuit.node(id, 2), self.circuit.node(id, 3));
                let Some(control) = self.given.difference(plus, minus) else {
                    return Err(self.told(
                        id,
                        "is a switch whose control voltage depends on the circuit; a `hold` note tells where it stands",
                    ));
                };
                let conductance = [on, off].map(|ohms| 1.0 / ohms.max(LOW));
                self.system.gates.push(Gate { across, conductance });
                self.followers.push(Follower { control, levels: (closes, opens) });
                Ok(())
            }
            Standing::Unknown => Err(self.told(
                id,
                "is a transistor or switch that no `hold` note holds on or off, so its part cannot be followed",
            )),
        }
    }

    /// M = k·√(L1·L2) between every two coils of a coupling.
    fn couplings(&mut self, part: &PartList) -> Result<(), String> {
        for &id in &part.elements {
            let Behaviour::Coupling { coils, coefficient } = &self.circuit.element(id).behaviour else {
                continue;
            };
            if coefficient.abs() > 1.0 || !coefficient.is_finite() {
                return Err(self.told(id, "couples by more than 1, which no transformer does"));
            }
            let known: Vec<u32> = coils.iter().filter_map(|coil| self.coils.get(coil)).copied().collect();
            for &one in &known {
                for &other in known.iter().filter(|&&other| other != one) {
                    let mutual = coefficient * (self.own(one) * self.own(other)).sqrt();
                    if let Some(Cell::Inductance { flux, .. }) = self.system.cells.get_mut(one as usize) {
                        flux.push((other, mutual));
                    }
                }
            }
        }
        Ok(())
    }

    fn own(&self, cell: u32) -> f64 {
        match self.system.cells.get(cell as usize) {
            Some(Cell::Inductance { flux, .. }) => flux.first().map_or(0.0, |f| f.1),
            _ => 0.0,
        }
    }

    /// Those that follow a current, now that all currents have their unknowns.
    fn listeners(&mut self) -> Result<(), String> {
        for id in std::mem::take(&mut self.listeners) {
            let behaviour = &self.circuit.element(id).behaviour;
            let heard = super::inputs::listens_to(behaviour).and_then(|c| self.currents.get(&c)).copied();
            let Some(heard) = heard else {
                return Err(self.told(id, "follows a current that is not known here"));
            };
            self.system.one_sided = true;
            match behaviour {
                Behaviour::VoltageByCurrent { gain, .. } => {
                    if let Some(&row) = self.currents.get(&id) {
                        self.system.entries.push((row, heard, -gain.number));
                    }
                }
                Behaviour::CurrentByCurrent { gain, .. } => {
                    for (row, factor) in self.across(id).unknowns {
                        self.system.entries.push((row, heard, gain.number * factor));
                    }
                }
                _ => {}
            }
        }
        Ok(())
    }

    fn finish(mut self, part: &PartList) -> Equations {
        let nodes = part.nodes.iter().map(|n| self.nodes.get(n).cloned().unwrap_or_default()).collect();
        self.system.inputs = self.inputs.len();
        Equations {
            system: self.system,
            inputs: self.inputs,
            nodes,
            diodes: self.diodes,
            storage: self.storage,
            followers: self.followers,
            volts: self.volts,
        }
    }
}

fn scaled(sum: &Affine, factor: f64) -> Affine {
    let all = |list: &[(u32, f64)]| list.iter().map(|&(n, f)| (n, f * factor)).collect();
    Affine { unknowns: all(&sum.unknowns), inputs: all(&sum.inputs), constant: sum.constant * factor }
}

/// Nodes that sources hold, as a part without unknowns.
pub(super) fn held(given: &Given<'_>, part: &PartList) -> Equations {
    let potential = |node: &NodeId| given.held.get(node.index()).cloned().flatten().unwrap_or_default();
    Equations {
        system: System { inputs: given.shapes.len(), ..System::default() },
        inputs: (0..given.shapes.len()).collect(),
        nodes: part.nodes.iter().map(potential).collect(),
        diodes: Vec::new(),
        storage: Vec::new(),
        followers: Vec::new(),
        volts: 0.0,
    }
}
