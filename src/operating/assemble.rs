//! Turns the circuit at one condition into a network of branches, and keeps which branch is which element.
//! Only translation: nothing is solved or judged here.

use super::condition::{Condition, Plan};
use super::drop::Diode;
use super::switch::{Position, Switches};
use crate::circuit::{Behaviour, Circuit, Element, ElementId, NodeId, Value};
use crate::complementarity::{Branch, Control, Junction, Law, Level, Network};

/// No branch.
pub(crate) const NONE: u32 = u32::MAX;

/// Whose a branch is.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum Owner {
    /// An element of the circuit.
    Element(ElementId),
    /// A supply, by its place in the plan.
    Supply(usize),
}

/// A network and whose its branches are.
#[derive(Debug, Clone, PartialEq)]
pub(crate) struct Assembly {
    /// The problem; its node numbers are those of the circuit.
    pub network: Network,
    /// First branch of each element, by element number; [`NONE`] where it has none.
    pub branch: Vec<u32>,
    /// Owner of each branch.
    pub owner: Vec<Owner>,
}

/// Where sources and diodes stand in their lists, by element number. Made once for all conditions.
pub(crate) struct Slots(Vec<u32>);

impl Slots {
    /// For the plan's sources and the diodes.
    pub fn of(circuit: &Circuit, plan: &Plan, diodes: &[Diode]) -> Self {
        let mut slots = vec![NONE; circuit.elements.len()];
        for (n, id) in plan.sources.iter().enumerate() {
            slots[id.index()] = n as u32;
        }
        for (n, diode) in diodes.iter().enumerate() {
            slots[diode.element.index()] = n as u32;
        }
        Slots(slots)
    }

    /// Place of a source or a diode in its list.
    pub fn place(&self, id: ElementId) -> Option<usize> {
        self.0.get(id.index()).filter(|&&n| n != NONE).map(|&n| n as usize)
    }
}

/// Everything that says what the elements are worth.
#[derive(Clone, Copy)]
pub(crate) struct Setting<'a> {
    /// The circuit.
    pub circuit: &'a Circuit,
    /// All conditions' common lists.
    pub plan: &'a Plan,
    /// Places in them.
    pub slots: &'a Slots,
    /// The diodes.
    pub diodes: &'a [Diode],
    /// The condition.
    pub condition: &'a Condition,
}

impl Setting<'_> {
    /// Value of an independent source.
    pub fn source(&self, id: ElementId) -> Level {
        let zero = Level { value: 0.0, exact: true };
        self.slots.place(id).and_then(|n| self.condition.sources.get(n)).copied().unwrap_or(zero)
    }

    /// Ohms of a resistor.
    pub fn resistance(&self, id: ElementId, written: Value) -> f64 {
        let changed = self.condition.resistors.binary_search_by_key(&id, |r| r.0);
        changed.map_or(written.number, |at| self.condition.resistors[at].1)
    }

    /// Whether and how a note holds it.
    pub fn held(&self, id: ElementId) -> Option<bool> {
        self.condition.held.binary_search_by_key(&id, |h| h.0).ok().map(|at| self.condition.held[at].1)
    }

    /// The diode's numbers.
    pub fn diode(&self, id: ElementId) -> Option<&Diode> {
        self.slots.place(id).and_then(|n| self.diodes.get(n))
    }
}

/// Builds the network of one condition.
pub(crate) fn assemble(setting: &Setting<'_>) -> Assembly {
    let circuit = setting.circuit;
    let mut builder = Builder {
        setting,
        switches: Switches::of(setting),
        assembly: Assembly {
            network: Network { nodes: circuit.nodes.len().max(1) as u32, branches: Vec::new() },
            branch: vec![NONE; circuit.elements.len()],
            owner: Vec::new(),
        },
        listeners: Vec::new(),
    };
    builder.assembly.network.branches.reserve(circuit.elements.len());
    builder.assembly.owner.reserve(circuit.elements.len());
    for (id, element) in circuit.elements() {
        builder.element(id, element);
    }
    builder.supplies();
    builder.listen();
    builder.assembly
}

struct Builder<'a> {
    setting: &'a Setting<'a>,
    switches: Switches,
    assembly: Assembly,
    /// Branches that listen to the current of an element whose branch may come later.
    listeners: Vec<(u32, ElementId)>,
}

impl Builder<'_> {
    fn element(&mut self, id: ElementId, element: &Element) {
        let zero = Level { value: 0.0, exact: true };
        match &element.behaviour {
            Behaviour::Resistor(ohms) => match self.setting.resistance(id, *ohms) {
                0.0 => self.between(id, Law::Short),
                ohms if ohms.is_finite() => self.between(id, Law::Resistance(ohms)),
                _ => self.unknown(id),
            },
            Behaviour::Capacitor { .. } | Behaviour::Coupling { .. } => {}
            Behaviour::Inductor { .. } => self.between(id, Law::Short),
            Behaviour::VoltageSource(_) => self.between(id, Law::Voltage(self.setting.source(id))),
            Behaviour::CurrentSource(_) => self.between(id, Law::Current(self.setting.source(id))),
            Behaviour::Diode { .. } => {
                let junction = self.setting.diode(id).map(|diode| Junction {
                    forward: diode.level(self.setting.condition.temperature),
                    reverse: diode.reverse,
                    series: diode.series,
                });
                self.between(id, junction.map_or(Law::Unknown, Law::Junction));
            }
            Behaviour::VoltageByVoltage { gain } => {
                self.between(id, Law::VoltageControlled(gain.number, self.across(id)));
            }
            Behaviour::CurrentByVoltage { gain } if gain.number == 0.0 => {
                self.between(id, Law::Current(zero));
            }
            Behaviour::CurrentByVoltage { gain } => {
                self.between(id, Law::CurrentControlled(gain.number, self.across(id)));
            }
            Behaviour::VoltageByCurrent { gain, control } => {
                self.listening(id, *control, Law::VoltageControlled(gain.number, Control::Current(NONE)));
            }
            Behaviour::CurrentByCurrent { gain, control } => {
                self.listening(id, *control, Law::CurrentControlled(gain.number, Control::Current(NONE)));
            }
            Behaviour::VoltageSwitch { .. }
            | Behaviour::CurrentSwitch { .. }
            | Behaviour::Transistor { .. } => self.held(id),
            Behaviour::Unknown { .. } => self.unknown(id),
        }
    }

    fn across(&self, id: ElementId) -> Control {
        Control::Voltage(self.setting.circuit.node(id, 2).0, self.setting.circuit.node(id, 3).0)
    }

    fn push(&mut self, owner: Owner, from: NodeId, to: NodeId, law: Law) {
        let number = self.assembly.network.branches.len() as u32;
        if let Owner::Element(id) = owner
            && self.assembly.branch[id.index()] == NONE
        {
            self.assembly.branch[id.index()] = number;
        }
        self.assembly.network.branches.push(Branch { from: from.0, to: to.0, law });
        self.assembly.owner.push(owner);
    }

    /// A branch from the first to the second pin.
    fn between(&mut self, id: ElementId, law: Law) {
        let circuit = self.setting.circuit;
        self.push(Owner::Element(id), circuit.node(id, 0), circuit.node(id, 1), law);
    }

    fn listening(&mut self, id: ElementId, control: Option<ElementId>, law: Law) {
        let Some(control) = control else { return self.unknown(id) };
        self.listeners.push((self.assembly.network.branches.len() as u32, control));
        self.between(id, law);
    }

    /// A star over the pins, so that all parts it touches are known to hang on it.
    fn unknown(&mut self, id: ElementId) {
        let pins = self.setting.circuit.pins(id);
        let Some(centre) = pins.first().map(|p| p.node) else { return };
        if let [only] = pins {
            return self.push(Owner::Element(id), only.node, NodeId::GROUND, Law::Unknown);
        }
        for pin in &pins[1..] {
            if pin.node != centre {
                self.push(Owner::Element(id), centre, pin.node, Law::Unknown);
            }
        }
    }

    /// A transistor or switch: as a note holds it, as its control drives it, or unknown.
    fn held(&mut self, id: ElementId) {
        let circuit = self.setting.circuit;
        let (first, second) = main_path(circuit, id);
        let law = match self.switches.position(self.setting, id) {
            Position::Open => return,
            Position::Unknown => return self.unknown(id),
            Position::Joined => Law::Short,
            Position::Through(0.0) => Law::Short,
            Position::Through(ohms) => Law::Resistance(ohms),
        };
        self.push(Owner::Element(id), first, second, law);
    }

    fn supplies(&mut self) {
        let levels = self.setting.condition.supplies.iter();
        for (n, (supply, level)) in self.setting.plan.supplies.iter().zip(levels).enumerate() {
            self.push(Owner::Supply(n), supply.node, NodeId::GROUND, Law::Voltage(*level));
        }
    }

    /// Joins those that listen to a current to its branch.
    fn listen(&mut self) {
        for &(listener, control) in &self.listeners {
            let heard = self.assembly.branch.get(control.index()).copied().unwrap_or(NONE);
            let law = &mut self.assembly.network.branches[listener as usize].law;
            match law {
                _ if heard == NONE => *law = Law::Unknown,
                Law::VoltageControlled(_, control) | Law::CurrentControlled(_, control) => {
                    *control = Control::Current(heard);
                }
                _ => {}
            }
        }
    }
}

/// The two nodes that a transistor or switch joins: collector and emitter, drain and source, the contacts.
pub(crate) fn main_path(circuit: &Circuit, id: ElementId) -> (NodeId, NodeId) {
    let second = if matches!(circuit.element(id).behaviour, Behaviour::Transistor { .. }) { 2 } else { 1 };
    (circuit.node(id, 0), circuit.node(id, second))
}
