//! Instances of subcircuits.

use super::behaviour::Behaviour;
use super::expand::Expander;
use super::line::Line;

impl Expander<'_> {
    /// `instance = name *node subcircuit *pair`
    pub(super) fn instance(&mut self, line: &Line<'_>, _broken: bool) {
        let first_pin = self.circuit.pins.len();
        let end = line.fields.words_before_pairs.min(line.len());
        self.push_pins(line, 1, end.saturating_sub(1).max(1));
        self.push_element(line, b'X', first_pin, Behaviour::Unknown { reason: "its subcircuit is missing" });
        self.circuit.incomplete = true;
    }
}
