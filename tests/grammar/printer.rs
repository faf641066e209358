//! Prints a flat circuit as a netlist of one level: everything that the circuit knows about its elements, nothing else.

use kneewise::circuit::{Behaviour, Circuit, ElementId, ModelId, ModelKind, Shape, Source};
use std::fmt::Write as _;

pub fn print(circuit: &Circuit) -> String {
    let mut printer = Printer { circuit, models: Vec::new(), text: String::from("printed\n") };
    printer.settings();
    for (id, _) in circuit.elements() {
        printer.element(id);
    }
    printer.model_lines();
    printer.text
}

struct Printer<'c> {
    circuit: &'c Circuit,
    /// Those that elements name, in order of first use.
    models: Vec<ModelId>,
    text: String,
}

impl Printer<'_> {
    fn settings(&mut self) {
        let circuit = self.circuit;
        if let Some(celsius) = circuit.temperature {
            writeln!(self.text, ".temp {celsius:?}").unwrap();
        }
        if let Some(celsius) = circuit.nominal_temperature {
            writeln!(self.text, ".options tnom={celsius:?}").unwrap();
        }
        if let Some(t) = &circuit.transient {
            let uic = if t.uic { " uic" } else { "" };
            writeln!(self.text, ".tran {:?} {:?} {:?}{uic}", t.step, t.stop, t.start).unwrap();
        }
        for sweep in &circuit.sweeps {
            writeln!(self.text, ".dc {} {:?} {:?} 1", sweep.name, sweep.from, sweep.to).unwrap();
        }
        for &(node, volts) in &circuit.initial {
            writeln!(self.text, ".ic v({})={volts:?}", circuit.node_name(node)).unwrap();
        }
    }

    /// Its full name, with its letter before it where the path begins with another.
    fn name(&self, id: ElementId) -> String {
        let element = self.circuit.element(id);
        let letter = match element.behaviour {
            Behaviour::Unknown { .. } => 'X',
            _ => char::from(element.letter),
        };
        let name = self.circuit.element_name(id);
        if name.starts_with([letter, letter.to_ascii_lowercase()]) {
            name
        } else {
            format!("{letter}_{name}")
        }
    }

    fn model(&mut self, id: Option<ModelId>) -> String {
        let Some(id) = id else { return "NOMODEL".to_owned() };
        let at = self.models.iter().position(|&m| m == id).unwrap_or_else(|| {
            self.models.push(id);
            self.models.len() - 1
        });
        format!("MODEL{at}")
    }

    fn control(&self, id: Option<ElementId>) -> String {
        id.map_or("V_NOWHERE".to_owned(), |id| self.name(id))
    }

    fn element(&mut self, id: ElementId) {
        let circuit = self.circuit;
        let mut line = self.name(id);
        for pin in circuit.pins(id) {
            write!(line, " {}", circuit.node_name(pin.node)).unwrap();
        }
        let rest = match &circuit.element(id).behaviour {
            Behaviour::Resistor(value) => format!("{:?}", value.number),
            Behaviour::Capacitor { farads, initial } => with_initial(farads.number, *initial),
            Behaviour::Inductor { henries, initial } => with_initial(henries.number, *initial),
            Behaviour::Coupling { coils, coefficient } => {
                let coils: Vec<String> = coils.iter().map(|&c| self.name(c)).collect();
                format!("{} {coefficient:?}", coils.join(" "))
            }
            Behaviour::VoltageSource(source) | Behaviour::CurrentSource(source) => source_text(source),
            Behaviour::Diode { model, area } => format!("{} {area:?}", self.model(*model)),
            Behaviour::VoltageByVoltage { gain } | Behaviour::CurrentByVoltage { gain } => {
                format!("{:?}", gain.number)
            }
            Behaviour::VoltageByCurrent { gain, control } | Behaviour::CurrentByCurrent { gain, control } => {
                format!("{} {:?}", self.control(*control), gain.number)
            }
            Behaviour::VoltageSwitch { model } | Behaviour::Transistor { model } => self.model(*model),
            Behaviour::CurrentSwitch { model, control } => {
                format!("{} {}", self.control(*control), self.model(*model))
            }
            Behaviour::Unknown { .. } => "UNKNOWN".to_owned(),
        };
        writeln!(self.text, "{line} {rest}").unwrap();
    }

    fn model_lines(&mut self) {
        for (number, &id) in self.models.iter().enumerate() {
            let model = self.circuit.model(id);
            let kind = match model.kind {
                ModelKind::Diode => "D",
                ModelKind::Npn => "NPN",
                ModelKind::Pnp => "PNP",
                ModelKind::Nmos => "NMOS",
                ModelKind::Pmos => "PMOS",
                ModelKind::Njf => "NJF",
                ModelKind::Pjf => "PJF",
                ModelKind::VoltageSwitch => "SW",
                ModelKind::CurrentSwitch => "CSW",
                ModelKind::Resistor => "R",
                ModelKind::Capacitor => "C",
                ModelKind::Inductor => "L",
                ModelKind::Other => "OTHER",
            };
            let pairs: Vec<String> =
                model.parameters.iter().map(|(key, value)| format!("{key}={:?}", value.number)).collect();
            writeln!(self.text, ".model MODEL{number} {kind}({})", pairs.join(" ")).unwrap();
        }
    }
}

fn with_initial(value: f64, initial: Option<f64>) -> String {
    initial.map_or(format!("{value:?}"), |initial| format!("{value:?} ic={initial:?}"))
}

fn source_text(source: &Source) -> String {
    let mut text = String::new();
    if let Some(dc) = source.dc {
        write!(text, "DC {:?} ", dc.number).unwrap();
    }
    if let Some(ac) = source.ac {
        write!(text, "AC {ac:?} ").unwrap();
    }
    let shape = match &source.shape {
        None => return text,
        Some(Shape::Sine { offset, amplitude, frequency, delay, damping, phase }) => {
            format!("SIN({offset:?} {amplitude:?} {frequency:?} {delay:?} {damping:?} {phase:?})")
        }
        Some(Shape::Pulse { low, high, delay, rise, fall, width, period }) => {
            format!("PULSE({low:?} {high:?} {delay:?} {rise:?} {fall:?} {width:?} {period:?})")
        }
        Some(Shape::Points(points)) => {
            let points: Vec<String> = points.iter().map(|(t, v)| format!("{t:?} {v:?}")).collect();
            format!("PWL({})", points.join(" "))
        }
        Some(Shape::Repeated { points, from }) => {
            let points: Vec<String> = points.iter().map(|(t, v)| format!("{t:?} {v:?}")).collect();
            format!("PWL({}) r={from:?}", points.join(" "))
        }
        Some(Shape::Exponential { low, high, delay1, tau1, delay2, tau2 }) => {
            format!("EXP({low:?} {high:?} {delay1:?} {tau1:?} {delay2:?} {tau2:?})")
        }
        Some(Shape::Modulated { offset, amplitude, carrier, index, signal }) => {
            format!("SFFM({offset:?} {amplitude:?} {carrier:?} {index:?} {signal:?})")
        }
    };
    text + &shape
}
