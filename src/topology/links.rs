//! How each kind of element joins its pins: what passes a direct current, what only a changing one, what
//! merely listens.

use crate::circuit::{Behaviour, Circuit, ElementId};

/// What passes between two pins.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Link {
    /// A direct current, at least in one state of the element.
    Direct,
    /// Only a changing current: capacitors, and the gate of an insulated-gate transistor.
    Capacitive,
    /// A current that the element imposes: I, G and F.
    Imposed,
}

use Link::{Capacitive, Direct, Imposed};

const DIRECT: &[(usize, usize, Link)] = &[(0, 1, Direct)];
const CAPACITIVE: &[(usize, usize, Link)] = &[(0, 1, Capacitive)];
const IMPOSED: &[(usize, usize, Link)] = &[(0, 1, Imposed)];
const JUNCTIONS: &[(usize, usize, Link)] = &[(0, 1, Direct), (1, 2, Direct), (2, 3, Direct)];
const INSULATED: &[(usize, usize, Link)] = &[(0, 2, Direct), (0, 1, Capacitive), (2, 3, Direct)];

/// The links of an element by pin numbers; those whose pins the element does not have are left out. An element
/// whose behaviour is not known links all its pins.
pub fn links(circuit: &Circuit, id: ElementId) -> impl Iterator<Item = (usize, usize, Link)> {
    let element = circuit.element(id);
    let count = circuit.pins(id).len();
    let (table, star): (&[_], usize) = match &element.behaviour {
        Behaviour::Resistor(_)
        | Behaviour::Inductor { .. }
        | Behaviour::VoltageSource(_)
        | Behaviour::Diode { .. }
        | Behaviour::VoltageByVoltage { .. }
        | Behaviour::VoltageByCurrent { .. }
        | Behaviour::VoltageSwitch { .. }
        | Behaviour::CurrentSwitch { .. } => (DIRECT, 0),
        Behaviour::Capacitor { .. } => (CAPACITIVE, 0),
        Behaviour::CurrentSource(_)
        | Behaviour::CurrentByVoltage { .. }
        | Behaviour::CurrentByCurrent { .. } => (IMPOSED, 0),
        Behaviour::Transistor { .. } if element.letter == b'M' => (INSULATED, 0),
        Behaviour::Transistor { .. } => (JUNCTIONS, 0),
        Behaviour::Coupling { .. } => (&[], 0),
        Behaviour::Unknown { .. } => (&[], count),
    };
    let fixed = table.iter().copied().filter(move |&(a, b, _)| a < count && b < count);
    fixed.chain((1..star).map(|pin| (0, pin, Direct)))
}

/// Nothing is known about what it does, so it may hold or feed any of its nodes.
pub fn is_opaque(circuit: &Circuit, id: ElementId) -> bool {
    matches!(circuit.element(id).behaviour, Behaviour::Unknown { .. })
}

/// The pin listens to a voltage and passes no current.
pub fn is_sensing(circuit: &Circuit, id: ElementId, pin: usize) -> bool {
    let element = circuit.element(id);
    match element.behaviour {
        Behaviour::VoltageByVoltage { .. }
        | Behaviour::CurrentByVoltage { .. }
        | Behaviour::VoltageSwitch { .. } => pin >= 2,
        _ => false,
    }
}

/// The diode may pass a reverse current: its model gives a breakdown voltage, or is not there to tell.
pub fn can_break_down(circuit: &Circuit, id: ElementId) -> bool {
    match circuit.element(id).behaviour {
        Behaviour::Diode { model: Some(model), .. } => circuit.model(model).parameter("bv").is_some(),
        _ => true,
    }
}

/// A diode that passes current one way only.
pub(super) fn is_one_way(circuit: &Circuit, id: ElementId) -> bool {
    matches!(circuit.element(id).behaviour, Behaviour::Diode { .. }) && !can_break_down(circuit, id)
}
