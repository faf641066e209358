//! The method's own reasoning about one diode in plain words: assume the other states, see them fail; assume this
//! one, see it hold. With the numbers that convince.

use super::result::{Case, DiodeResult};
use crate::circuit::{Circuit, State};
use crate::complementarity::{Interval, Quantity, View};
use crate::finding::{interval, quantity};

/// The method's reasoning about one diode in one condition.
pub(crate) fn sentences(circuit: &Circuit, case: &Case, diode: &DiodeResult) -> Vec<String> {
    Speaker { circuit, case, diode }.sentences()
}

/// One line of the reasoning: why the diode is not in the state `expected`, or where it is, why that holds.
pub fn against(circuit: &Circuit, case: &Case, diode: &DiodeResult, expected: State) -> String {
    let speaker = Speaker { circuit, case, diode };
    let line = speaker.against(expected);
    // the line stands alone, so it must say of whom it speaks
    line.replacen("Assume it ", &format!("Assume {} ", speaker.name()), 1)
}

/// A clause as a sentence.
pub(crate) fn sentence(clause: &str) -> String {
    let mut letters = clause.chars();
    let first: String = letters.next().map(|c| c.to_uppercase().collect()).unwrap_or_default();
    format!("{first}{}.", letters.as_str())
}

/// Two quantities with as many digits as it takes to tell them apart.
pub(crate) fn apart(a: f64, b: f64, unit: &str) -> (String, String) {
    let plain = (quantity(a, unit), quantity(b, unit));
    if plain.0 != plain.1 || a == b {
        return plain;
    }
    let digits = |value: f64, digits: usize| {
        let rounded: f64 = format!("{value:.digits$e}").parse().unwrap_or(value);
        format!("{rounded} {unit}")
    };
    (3..17).map(|n| (digits(a, n), digits(b, n))).find(|(a, b)| a != b).unwrap_or(plain)
}

struct Speaker<'a> {
    circuit: &'a Circuit,
    case: &'a Case,
    diode: &'a DiodeResult,
}

impl Speaker<'_> {
    fn name(&self) -> String {
        self.circuit.element_name(self.diode.element)
    }

    fn sentences(&self) -> Vec<String> {
        let origin = format!(
            "{} has a drop of {} ({}){}{}.",
            self.name(),
            quantity(self.diode.drop.volts, "V"),
            self.diode.drop.origin,
            self.diode
                .breakdown
                .map_or(String::new(), |bv| format!(", breaks down at {}", quantity(bv, "V"))),
            match self.diode.series {
                0.0 => String::new(),
                ohms => format!(", and has {} in series", quantity(ohms, "Ω")),
            }
        );
        let mut all = vec![origin];
        all.extend(match (self.diode.state, self.diode.view) {
            (State::Conducting | State::Breakdown | State::Blocking, Some(view)) if view.resistance < 0.0 => {
                self.behind_negative_resistance(view)
            }
            (State::Conducting, Some(view)) => self.carries(view, true),
            (State::Breakdown, Some(view)) => self.carries(view, false),
            (State::Blocking, Some(view)) => self.blocks(view),
            (State::NotEvaluated, _) => self.not_evaluated(),
            (state, _) => self.without_view(state),
        });
        all
    }

    fn against(&self, expected: State) -> String {
        let diode = self.diode;
        let lines = match (diode.state, diode.view) {
            (State::Conducting | State::Breakdown, Some(view)) if view.resistance >= 0.0 => {
                self.carries(view, diode.state == State::Conducting)
            }
            (State::Blocking, Some(view)) if view.resistance >= 0.0 => self.blocks(view),
            _ => self.sentences().into_iter().skip(1).collect(),
        };
        if expected == State::Breakdown && diode.breakdown.is_none() {
            return format!("{} has no breakdown voltage: no BV in its model.", self.name());
        }
        let verb = match expected {
            State::Conducting => " conducts: ",
            State::Breakdown => " breaks down: ",
            _ => " blocks: ",
        };
        let fitting = lines.iter().find(|line| line.starts_with("Assume ") && line.contains(verb));
        fitting.or(lines.first()).cloned().unwrap_or_default()
    }

    /// Level in the direction that is examined: the drop, or minus the breakdown voltage.
    fn level(&self, forward: bool) -> f64 {
        if forward { self.diode.drop.volts } else { -self.diode.breakdown.unwrap_or(f64::INFINITY) }
    }

    /// `(4.62 V − 700 mV) / 1 kΩ = 3.92 mA`, the current that an assumption leads to, and its value.
    fn current(&self, view: View, forward: bool) -> (String, f64) {
        let level = self.level(forward);
        let (seen, limit) = apart(view.open_circuit, level.abs(), "V");
        let sign = if forward { "−" } else { "+" };
        let current = (view.open_circuit - level) / view.resistance;
        let sum = format!(
            "({seen} {sign} {limit}) / {} = {}",
            quantity(view.resistance, "Ω"),
            quantity(current, "A")
        );
        (sum, current)
    }

    /// Behind a negative resistance each assumption may hold by itself.
    fn behind_negative_resistance(&self, view: View) -> Vec<String> {
        let seen = quantity(view.open_circuit, "V");
        let mut all = vec![format!(
            "With every other diode in its state the rest of the circuit acts as {seen} behind a negative resistance of {}: what it puts across {} rises as more is drawn.",
            quantity(view.resistance, "Ω"),
            self.name()
        )];
        match self.diode.state {
            State::Blocking => all.push(format!(
                "Assume it blocks: {seen} stands across it, within its limits, so this holds."
            )),
            state => {
                let (sum, _) = self.current(view, state == State::Conducting);
                all.push(format!(
                    "Assume it is {}: {sum} flows from anode to cathode, which agrees, so this holds.",
                    state.word()
                ));
            }
        }
        all.push("Other assumptions may hold by themselves too; all diodes together decide.".to_owned());
        all
    }

    fn carries(&self, view: View, forward: bool) -> Vec<String> {
        let level = self.level(forward);
        let (seen, limit) = apart(view.open_circuit, level, "V");
        let (beyond, what, verb, way) = if forward {
            ("more than its drop of", "drop", "conducts", "which is forward")
        } else {
            ("beyond its breakdown at", "breakdown voltage", "breaks down", "which is backward")
        };
        let (sum, _) = self.current(view, forward);
        let mut all = vec![
            format!(
                "Assume {} blocks: with every other diode in its state the rest of the circuit puts {seen} across it, {beyond} {limit}, so that assumption fails.",
                self.name()
            ),
            format!("Assume it {verb}: {sum} flows from anode to cathode, {way}, so this holds."),
        ];
        if let Some(margin) = self.diode.margin {
            all.push(format!(
                "Margin: its {what} would have to exceed {}, {} more, to change the state.",
                quantity(view.open_circuit.abs(), "V"),
                quantity(margin, "V")
            ));
        }
        all
    }

    fn blocks(&self, view: View) -> Vec<String> {
        let drop = self.diode.drop.volts;
        let (seen, limit) = apart(view.open_circuit, drop, "V");
        let mut all = Vec::new();
        if self.diode.margin == Some(0.0) {
            all.push(format!(
                "{} stands exactly at a corner: the rest of the circuit puts {seen} across it and it carries nothing. The smallest change decides.",
                self.name()
            ));
            return all;
        }
        if view.resistance > 0.0 {
            let (sum, _) = self.current(view, true);
            all.push(format!("Assume {} conducts: {sum} would have to flow from anode to cathode, which is backward, so that assumption fails.", self.name()));
            if self.diode.breakdown.is_some() {
                let (sum, _) = self.current(view, false);
                all.push(format!("Assume it breaks down: {sum} would have to flow, which is forward, so that assumption fails."));
            }
        }
        let floor = self
            .diode
            .breakdown
            .map_or(String::new(), |bv| format!(" and above its breakdown at {}", quantity(-bv, "V")));
        all.push(format!("Assume it blocks: with every other diode in its state the rest of the circuit puts {seen} across it, less than its drop of {limit}{floor}, so this holds."));
        if let Some(margin) = self.diode.margin {
            let is_reverse =
                self.diode.breakdown.is_some_and(|bv| view.open_circuit + bv < drop - view.open_circuit);
            let what = if is_reverse { "it would break down" } else { "it would conduct" };
            let direction = if is_reverse { "less" } else { "more" };
            all.push(format!("Margin: {} {direction} across it and {what}.", quantity(margin, "V")));
        }
        all
    }

    /// No finite open-circuit voltage: fed by currents, floating, or part of an open split.
    fn without_view(&self, state: State) -> Vec<String> {
        let name = self.name();
        let causes = || self.case.causes.iter().filter(|c| c.elements.contains(&self.diode.element));
        let mut all = match (state, self.diode.current, self.diode.voltage) {
            (State::Conducting | State::Breakdown, Quantity::Known(current), _) => vec![format!(
                "Assume {name} blocks: the {} that the sources push through it have no other way, so that assumption fails. Assume it is {}: it carries them, so this holds. No voltage stands behind that current, so there is no margin in volts.",
                quantity(current, "A"),
                state.word()
            )],
            (_, Quantity::Open(Interval { low, high }), _) => vec![format!(
                "The model leaves its current open: {}. In some solution it is {}.",
                interval(low, high, "A"),
                state.word()
            )],
            (State::Blocking, _, Quantity::Open(Interval { low, high })) => vec![format!(
                "It carries nothing in every solution, but the model leaves its voltage open: {}.",
                interval(low, high, "V")
            )],
            (State::Blocking, _, Quantity::Known(volts)) => vec![format!(
                "Assume {name} blocks: {} stands across it, less than its drop of {}, so this holds.",
                quantity(volts, "V"),
                quantity(self.diode.drop.volts, "V")
            )],
            _ => vec![format!("{name} is {}.", state.word())],
        };
        all.extend(causes().map(|c| sentence(&c.text)));
        all
    }

    fn not_evaluated(&self) -> Vec<String> {
        let reason = self.diode.not_evaluated.clone().unwrap_or_else(|| "its part was not solved".into());
        vec![format!("{} is not evaluated: {reason}.", self.name())]
    }
}

/// How far that may be believed: error bar, reasons, and what the exponential law says.
pub(crate) fn trust(diode: &DiodeResult) -> Vec<String> {
    let Some(trust) = diode.trust else { return Vec::new() };
    let bar = match (diode.state, diode.error) {
        (_, None) => String::new(),
        (State::Blocking, Some(bar)) => format!(": it may leak up to {}", quantity(bar.current, "A")),
        (_, Some(bar)) => format!(": the current is known to ±{}", quantity(bar.current, "A")),
    };
    let mut sentences = vec![format!("Trust in this is {}{bar}.", trust.word())];
    sentences.extend(diode.trust_reasons.iter().map(|reason| {
        // a clause without a subject speaks of the diode
        let is_bare = ["carries", "may", "sees"].iter().any(|verb| reason.starts_with(verb));
        sentence(&if is_bare { format!("it {reason}") } else { reason.clone() })
    }));
    if let Some(refined) = diode.refined {
        let v = quantity(refined.voltage, "V");
        // surfaces leak more
        let is_nothing = refined.current.abs() < 1e-12;
        let i = if is_nothing { "under 1 pA".to_owned() } else { quantity(refined.current, "A") };
        sentences.push(format!("By the exponential law it carries {i} at {v}."));
    }
    sentences
}
