//! The table on hand-made results.

use super::*;
use crate::analysis::analyse;
use crate::config::Options;
use crate::operating::{Case, Cause, DiodeResult, Drop, DropOrigin, Interval, NodeResult, Residual};
use crate::text::Memory;
use std::path::Path;

const NETLIST: &str = "t\nV1 in 0 12\nR1 in a 1k\nD1 a 0 DX\nD2 in b DX\nD3 0 b DX\nI1 b 0 1m\n.model DX D\n";

fn diode(element: usize, state: State, current: Quantity, voltage: f64) -> DiodeResult {
    let origin = DropOrigin::Model { model: "DX".into(), decade: 1e-3 };
    DiodeResult {
        element: ElementId::new(element),
        state,
        not_evaluated: None,
        unmodelled: false,
        voltage: Quantity::Known(voltage),
        current,
        power: None,
        drop: Drop { volts: 0.7, written: false, origin },
        breakdown: None,
        series: 0.0,
        view: None,
        margin: Some(1.234),
        knee: None,
        trust: None,
        trust_reasons: Vec::new(),
        error: None,
        refined: None,
    }
}

fn case(name: &str, verdict: Verdict, diodes: Vec<DiodeResult>) -> Case {
    let node = NodeResult {
        node: crate::circuit::NodeId::new(1),
        voltage: Quantity::Open(Interval { low: 0.0, high: f64::INFINITY }),
        error: None,
        refined: None,
    };
    let nodes = if verdict == Verdict::Floating { vec![node] } else { Vec::new() };
    let cause =
        Cause { verdict, text: "D2 alone leads there".into(), elements: Vec::new(), left_to_time: false };
    Case {
        name: name.into(),
        sources: vec![(ElementId::new(0), 12.0)],
        supplies: Vec::new(),
        instant: false,
        temperature: 27.0,
        verdict,
        causes: if verdict == Verdict::Unique { Vec::new() } else { vec![cause] },
        truncated: false,
        solves: 2,
        residual: Residual { current: 0.0, voltage: 0.0, relative: 2e-16 },
        solutions: vec![Solution {
            diodes,
            nodes,
            branches: Vec::new(),
            differences: Vec::new(),
            unrefined: Vec::new(),
        }],
    }
}

fn shown(cases: Vec<Case>) -> String {
    let mut files = Memory::with("a.net", NETLIST);
    let mut analysis = analyse(&mut files, Path::new("a.net"), &Options::default()).unwrap();
    analysis.operating = Some(Operating { cases, ..Operating::default() });
    let mut page = Page::new(false);
    states(&mut page, &analysis);
    page.text().to_owned()
}

#[test]
fn what_changes_stands_first_and_the_rest_once() {
    let known = Quantity::Known;
    let nominal = vec![
        diode(2, State::Conducting, known(11.3e-3), 0.7),
        diode(3, State::Conducting, known(1e-3), 0.7),
        diode(4, State::Blocking, known(0.0), -11.3),
    ];
    let low = vec![
        diode(2, State::Blocking, known(0.0), 0.5),
        diode(3, State::Conducting, known(0.4e-3), 0.7),
        diode(4, State::Blocking, known(0.0), 1e-15),
    ];
    let cases = vec![case("nominal", Verdict::Unique, nominal), case("V1=0.5", Verdict::Unique, low)];
    let expected = "\
nominal: V1 = 12 V, 27 °C
and further V1=0.5

changes with the condition
  diode   state        current   voltage     drop   drop from         margin   in
  D1      conducting   11.3 mA    700 mV   700 mV   model DX at 1mA   1.23 V   nominal
          blocking        0 A     500 mV   700 mV   model DX at 1mA   1.23 V   V1=0.5

the same state in every condition
  diode   state                 current        voltage     drop   drop from         margin
  D2      conducting   400 µA … 1.00 mA         700 mV   700 mV   model DX at 1mA   1.23 V
  D3      blocking                 0 A    -11.3 … 0 V    700 mV   model DX at 1mA   1.23 V

unique in both conditions: one set of states and no other; put back into the circuit laws, it
misses none by more than 2e-16 of the largest term
3 diodes: 2 conducting, 1 blocking (nominal); 2 conditions, 4 factorizations
";
    let shown = shown(cases);
    assert_eq!(shown, expected, "\n{shown}");
}

#[test]
fn what_is_open_is_an_interval_with_its_cause() {
    let open = Quantity::Open(Interval { low: 0.0, high: 2.15e-3 });
    let mut lost = diode(4, State::NotEvaluated, Quantity::Unknown, 0.0);
    lost.voltage = Quantity::Unknown;
    lost.margin = None;
    lost.not_evaluated = Some("Q1 is a transistor".into());
    let diodes = vec![diode(2, State::Conducting, open, 0.7), diode(3, State::Conducting, open, 0.7), lost];
    let expected = "\
nominal: V1 = 12 V, 27 °C
floating: every current is settled; some potentials are open
  D2 alone leads there
  open: node in  at least 0 V

  diode   state           current               voltage     drop   drop from         margin
  D1      conducting      open: 0 A … 2.15 mA    700 mV   700 mV   model DX at 1mA   1.23 V
  D2      conducting      open: 0 A … 2.15 mA    700 mV   700 mV   model DX at 1mA   1.23 V
  D3      not evaluated   -                           -   700 mV   model DX at 1mA
  D3 is not evaluated: Q1 is a transistor

3 diodes: 2 conducting, 1 not evaluated; 1 condition, 2 factorizations
";
    let shown = shown(vec![case("nominal", Verdict::Floating, diodes)]);
    assert_eq!(shown, expected, "\n{shown}");
}
