//! How each kind of element joins its pins: what passes a direct current, what only a changing one, what
//! merely listens.

use crate::circuit::{Behaviour, Circuit, ElementId, ModelKind, NodeId, NoteKind};

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

/// The diode may be meant to pass a reverse current: its model gives a breakdown voltage no greater than `available`, the
/// most that the circuit's sources can bring about, or is not there to tell. That of a light-emitting diode is a limit.
pub fn can_break_down(circuit: &Circuit, id: ElementId, available: f64) -> bool {
    match circuit.element(id).behaviour {
        Behaviour::Diode { model: Some(model), .. } => {
            let model = circuit.model(model);
            !gives_light(circuit, id) && model.parameter("bv").is_some_and(|bv| bv.number.abs() <= available)
        }
        _ => true,
    }
}

/// A diode that gives light, by the voltage at which its model carries 1 mA: no silicon junction needs 1.2 V (common
/// practice).
pub fn gives_light(circuit: &Circuit, id: ElementId) -> bool {
    let Behaviour::Diode { model: Some(model), .. } = circuit.element(id).behaviour else { return false };
    let model = circuit.model(model);
    let (Some(saturation), emission) = (model.parameter("is"), model.parameter("n")) else { return false };
    let emission = emission.map_or(1.0, |n| n.number);
    saturation.number > 0.0 && emission * 0.02585 * (1e-3 / saturation.number).ln_1p() > 1.2
}

/// A diode that passes current one way only.
fn is_one_way(circuit: &Circuit, id: ElementId, available: f64) -> bool {
    matches!(circuit.element(id).behaviour, Behaviour::Diode { .. })
        && !can_break_down(circuit, id, available)
}

/// What passes current one way only, from node to node: a diode without breakdown, and the junctions and the main path
/// of a bipolar transistor, of which only the junction from base to collector works both for and against it.
pub(super) fn arcs(circuit: &Circuit, id: ElementId, available: f64) -> Vec<(NodeId, NodeId)> {
    let element = circuit.element(id);
    match element.behaviour {
        Behaviour::Diode { .. } if is_one_way(circuit, id, available) => {
            vec![(circuit.node(id, 0), circuit.node(id, 1))]
        }
        Behaviour::Transistor { model: Some(model) } if element.letter == b'Q' => {
            let [c, b, e] = [0, 1, 2].map(|pin| circuit.node(id, pin));
            match circuit.model(model).kind {
                ModelKind::Npn => vec![(c, e), (b, e), (b, c)],
                ModelKind::Pnp => vec![(e, c), (e, b), (c, b)],
                _ => Vec::new(),
            }
        }
        _ => Vec::new(),
    }
}

/// Volts to which a switched coil, a current source or an amplifier may rise where a surge diode is to stop it.
const KICKED: f64 = 60.0;

/// The sum of the greatest values of all voltage sources and supplies, in volts, which no difference of potentials
/// exceeds, half as much again where a coil, a current source or an amplifier may raise more; without bound where it is not
/// known what else may.
pub fn available_volts(circuit: &Circuit) -> f64 {
    let stop = circuit.transient.map(|t| t.stop);
    let mut sum = 0.0;
    let coils = super::cuts::coupled_coils(circuit);
    let (mut least, mut most) = (f64::INFINITY, 0.0_f64);
    let mut kicks = false;
    for (id, element) in circuit.elements() {
        match &element.behaviour {
            Behaviour::VoltageSource(source) => {
                let (low, high) = super::loops::span_of_values(source, stop);
                sum += low.abs().max(high.abs());
            }
            Behaviour::Resistor(_)
            | Behaviour::Diode { .. }
            | Behaviour::Capacitor { initial: None, .. }
            | Behaviour::VoltageSwitch { .. }
            | Behaviour::CurrentSwitch { .. }
            | Behaviour::Transistor { .. }
            | Behaviour::Coupling { .. } => {}
            Behaviour::Inductor { henries, initial: None } if coils.contains(&id) => {
                (least, most) = (least.min(henries.number), most.max(henries.number));
            }
            Behaviour::Inductor { initial: None, .. }
            | Behaviour::CurrentSource(_)
            | Behaviour::VoltageByVoltage { .. }
            | Behaviour::VoltageByCurrent { .. }
            | Behaviour::CurrentByVoltage { .. }
            | Behaviour::CurrentByCurrent { .. } => kicks = true,
            _ => return f64::INFINITY,
        }
    }
    for note in &circuit.notes {
        match &note.kind {
            NoteKind::Supply { volts, range } => {
                let ends = range.unwrap_or((volts.number, volts.number));
                sum += volts.number.abs().max(ends.0.abs()).max(ends.1.abs());
            }
            NoteKind::Range { from, to } => sum += from.abs().max(to.abs()),
            _ => {}
        }
    }
    // windings transform by the root of their inductances at most
    let ratio = if most > 0.0 && least > 0.0 { 1.0 + (most / least).sqrt() } else { 1.0 };
    // a sweep names a source by name only
    let sum = ratio * sum + circuit.sweeps.iter().map(|s| s.from.abs().max(s.to.abs())).sum::<f64>();
    // what breaks down when a coil is switched off or an amplifier finds no feedback is a Zener or surge diode chosen for
    // it, not a rectifier
    if kicks { KICKED.max(1.5 * sum) } else { sum }
}
