//! The method's order, against solutions in closed form.

use super::solver::Answer;
use super::*;

struct Sine;

impl Drive for Sine {
    fn at(&self, time: f64, inputs: &mut [f64]) {
        inputs.fill(time.sin());
    }
}

/// One ohm into one farad.
fn low_pass() -> System {
    let across = Affine { unknowns: vec![(0, 1.0)], ..Affine::default() };
    System {
        is_current: vec![false],
        inputs: 1,
        entries: vec![(0, 0, 1.0)],
        drive: vec![(0, 0, 1.0)],
        cells: vec![Cell::Capacitance { farads: 1.0, across }],
        ..System::default()
    }
}

/// Voltage at t = 2 after 2^`halvings` equal steps.
fn walked(halvings: u32) -> f64 {
    let mut march = March::new(Solver::new(low_pass()).unwrap(), vec![0.0], 1.0);
    let segment = Segment { start: 0.0, length: 2.0, coarsest: halvings, finest: halvings };
    let limits = Limits { tolerance: 1.0, budget: u64::MAX, is_cancelled: &|| false };
    assert_eq!(march.walk(segment, &Sine, None, &limits), End::Done);
    assert_eq!(march.steps, 1 << halvings);
    march.states[0]
}

/// v' + v = sin t from rest: v = (sin t − cos t + e^−t)/2, by hand. Of order two (Alexander 1977), the method quarters
/// its error when its step is halved.
#[test]
fn half_the_step_leaves_a_quarter_of_the_error() {
    let exact = (2f64.sin() - 2f64.cos() + (-2f64).exp()) / 2.0;
    let errors: Vec<f64> = (5..10).map(|halvings| (walked(halvings) - exact).abs()).collect();
    for pair in errors.windows(2) {
        let ratio = pair[0] / pair[1];
        assert!((3.7..4.4).contains(&ratio), "{ratio}: {errors:?}");
    }
}

/// Two nodes that resistances of `ohms` hold against currents, a blocking junction between them.
fn beside_a_junction(ohms: [f64; 2], amperes: [f64; 2]) -> System {
    let across = Affine { unknowns: vec![(0, 1.0), (1, -1.0)], ..Affine::default() };
    System {
        is_current: vec![false, false, true],
        entries: vec![
            (0, 0, 1.0 / ohms[0]),
            (1, 1, 1.0 / ohms[1]),
            (0, 2, 1.0),
            (2, 0, 1.0),
            (1, 2, -1.0),
            (2, 1, -1.0),
        ],
        constant: vec![(0, amperes[0]), (1, amperes[1])],
        junctions: vec![StepJunction {
            current: 2,
            across,
            forward: 0.7,
            reverse: f64::INFINITY,
            series: 0.0,
        }],
        ..System::default()
    }
}

/// What a blocking junction is tested by is the voltage across it, however large the currents beside it are: Ohm's law.
#[test]
fn a_blocking_junction_is_judged_by_its_voltage() {
    for ohms in [1e-3, 1.0, 2200.0, 1e6] {
        for volts in [[0.3, 0.9], [5.0, 4.4], [100.0, 99.7]] {
            let amperes = volts.map(|v: f64| v / ohms);
            let mut solver = Solver::new(beside_a_junction([ohms; 2], amperes)).unwrap();
            let mut answer = Answer::default();
            assert!(solver.stage(1.0, &[], &[], &mut answer));
            let expected = volts[0] - volts[1];
            assert!(
                (answer.tests[0] - expected).abs() <= 1e-12 * volts[0] + ohms * 1e-14,
                "{ohms} Ω: {:?}",
                answer.tests
            );
        }
    }
}
