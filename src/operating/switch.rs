//! Where transistors and switches stand: as a `hold` note says, or for switches whose control is held by sources,
//! as threshold and model say. Everything else is not known here.

use super::assemble::Setting;
use crate::circuit::{Behaviour, Circuit, ElementId, Model, ModelId, NodeId};

/// How an element's main path stands.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) enum Position {
    /// Carries nothing.
    Open,
    /// No resistance.
    Joined,
    /// A resistance in ohms.
    Through(f64),
    /// Not known.
    Unknown,
}

/// Resistance of a closed and of an open switch whose model does not say (common practice, from memory).
pub(crate) const CLOSED: f64 = 1.0;
pub(crate) const OPEN: f64 = 1e6;

/// What sources hold, found once per condition; empty where no switch asks.
pub(crate) struct Switches {
    /// Group of nodes that voltage sources tie together, and the potential within it, by node.
    held: Vec<(u32, f64)>,
    /// Net current that current sources push into a node, by node; not a number where anything else is there.
    fed: Vec<f64>,
}

impl Switches {
    /// Follows voltage sources from node to node.
    pub fn of(setting: &Setting<'_>) -> Self {
        let asks =
            |b: &Behaviour| matches!(b, Behaviour::VoltageSwitch { .. } | Behaviour::CurrentSwitch { .. });
        if !setting.circuit.elements.iter().any(|e| asks(&e.behaviour)) {
            return Switches { held: Vec::new(), fed: Vec::new() };
        }
        Switches { held: potentials(setting), fed: currents(setting) }
    }

    /// How the element stands.
    pub fn position(&self, setting: &Setting<'_>, id: ElementId) -> Position {
        let circuit = setting.circuit;
        match (&circuit.element(id).behaviour, setting.held(id)) {
            (_, Some(false)) => Position::Open,
            (Behaviour::VoltageSwitch { model } | Behaviour::CurrentSwitch { model, .. }, Some(true)) => {
                // a written contact resistance is better than none
                let written = model.and_then(|m| circuit.model(m).parameter("ron"));
                written.map_or(Position::Joined, |r| Position::Through(r.number))
            }
            (_, Some(true)) => Position::Joined,
            (&Behaviour::VoltageSwitch { model }, None) => {
                let control = self.voltage(circuit.node(id, 2), circuit.node(id, 3));
                follow(circuit, model, control, ["vt", "vh"])
            }
            (&Behaviour::CurrentSwitch { model, control }, None) => {
                let control = control.and_then(|c| self.current(circuit, c));
                follow(circuit, model, control, ["it", "ih"])
            }
            _ => Position::Unknown,
        }
    }

    /// Voltage between two nodes, where sources hold it.
    fn voltage(&self, plus: NodeId, minus: NodeId) -> Option<f64> {
        let (a, b) = (self.held.get(plus.index())?, self.held.get(minus.index())?);
        (a.0 == b.0).then_some(a.1 - b.1)
    }

    /// Current through a voltage source, where current sources alone feed one of its ends.
    fn current(&self, circuit: &Circuit, id: ElementId) -> Option<f64> {
        let at = |pin| self.fed.get(circuit.node(id, pin).index()).copied().filter(|i| i.is_finite());
        at(0).or_else(|| at(1).map(|i| -i))
    }
}

/// Closed above threshold plus hysteresis, open below threshold minus hysteresis; between them its history
/// decides, which an operating point does not have.
fn follow(circuit: &Circuit, model: Option<ModelId>, control: Option<f64>, names: [&str; 2]) -> Position {
    let (Some(model), Some(control)) = (model.map(|m| circuit.model(m)), control) else {
        return Position::Unknown;
    };
    let number = |model: &Model, name, usual| model.parameter(name).map_or(usual, |v| v.number);
    let threshold = number(model, names[0], 0.0);
    let half_band = number(model, names[1], 0.0).abs();
    if control > threshold + half_band {
        Position::Through(number(model, "ron", CLOSED))
    } else if control < threshold - half_band || half_band == 0.0 {
        Position::Through(number(model, "roff", OPEN))
    } else {
        Position::Unknown
    }
}

/// Spreads potentials along voltage sources and supplies, one group for each tree of them.
fn potentials(setting: &Setting<'_>) -> Vec<(u32, f64)> {
    let circuit = setting.circuit;
    let mut steps: Vec<(u32, u32, f64)> = Vec::new();
    for &id in &setting.plan.sources {
        if matches!(circuit.element(id).behaviour, Behaviour::VoltageSource(_)) {
            steps.push((circuit.node(id, 0).0, circuit.node(id, 1).0, setting.source(id).value));
        }
    }
    for (supply, level) in setting.plan.supplies.iter().zip(&setting.condition.supplies) {
        steps.push((supply.node.0, 0, level.value));
    }
    let mut around: Vec<Vec<(u32, f64)>> = vec![Vec::new(); circuit.nodes.len().max(1)];
    for &(plus, minus, volts) in &steps {
        around[plus as usize].push((minus, -volts));
        around[minus as usize].push((plus, volts));
    }
    let mut held = vec![(u32::MAX, 0.0); around.len()];
    for root in 0..around.len() {
        if held[root].0 != u32::MAX {
            continue;
        }
        held[root] = (root as u32, 0.0);
        let mut open = vec![root];
        while let Some(node) = open.pop() {
            let (group, potential) = held[node];
            for &(next, volts) in &around[node] {
                if held[next as usize].0 == u32::MAX {
                    held[next as usize] = (group, potential + volts);
                    open.push(next as usize);
                }
            }
        }
    }
    held
}

/// Sums what current sources push into each node. Capacitors carry nothing; a node may have one voltage source
/// (the one that is asked about) and nothing else.
fn currents(setting: &Setting<'_>) -> Vec<f64> {
    let circuit = setting.circuit;
    let mut fed = vec![0.0; circuit.nodes.len().max(1)];
    let mut voltage_sources = vec![0_u32; fed.len()];
    fed[0] = f64::NAN;
    for (id, element) in circuit.elements() {
        match element.behaviour {
            Behaviour::CurrentSource(_) => {
                let amperes = setting.source(id).value;
                fed[circuit.node(id, 0).index()] -= amperes;
                fed[circuit.node(id, 1).index()] += amperes;
            }
            Behaviour::Capacitor { .. } | Behaviour::Coupling { .. } => {}
            Behaviour::VoltageSource(_) => {
                for pin in circuit.pins(id) {
                    voltage_sources[pin.node.index()] += 1;
                }
            }
            Behaviour::VoltageByVoltage { .. }
            | Behaviour::CurrentByVoltage { .. }
            | Behaviour::VoltageSwitch { .. } => {
                // their control pins carry nothing
                for pin in circuit.pins(id).iter().take(2) {
                    fed[pin.node.index()] = f64::NAN;
                }
            }
            _ => {
                for pin in circuit.pins(id) {
                    fed[pin.node.index()] = f64::NAN;
                }
            }
        }
    }
    for (current, count) in fed.iter_mut().zip(voltage_sources) {
        if count > 1 {
            *current = f64::NAN;
        }
    }
    fed
}
