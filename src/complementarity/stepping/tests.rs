//! The method's order, against solutions in closed form.

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
