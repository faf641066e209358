//! How far a diode is from another state.

use crate::complementarity::{Place, View};

/// Distance in volts from the open-circuit voltage to the nearest level that would change the state, positive
/// where the state holds. `reverse` is the magnitude of the breakdown voltage. `None` where the place has no
/// margin (open, not evaluated).
pub(crate) fn margin(view: View, place: Place, forward: f64, reverse: Option<f64>) -> Option<f64> {
    let seen = view.open_circuit;
    // behind a negative resistance a diode carries on the other side of its level
    let side = if view.resistance < 0.0 { -1.0 } else { 1.0 };
    let margin = match place {
        Place::Conducting => side * (seen - forward),
        Place::Breakdown => side * (-reverse? - seen),
        Place::Blocking => (forward - seen).min(reverse.map_or(f64::INFINITY, |bv| seen + bv)),
        Place::Open | Place::Unknown => return None,
    };
    // at the corner: what rounding leaves is nothing
    let scale = seen.abs().max(forward.abs()).max(reverse.unwrap_or(0.0));
    Some(if margin.abs() <= 1e-12 * scale { 0.0 } else { margin })
}

#[cfg(test)]
mod tests {
    use super::*;

    fn see(open_circuit: f64) -> View {
        View { open_circuit, resistance: 1e3 }
    }

    // by hand from the constant-drop model
    #[test]
    fn distance_to_the_nearest_level() {
        let close = |a: Option<f64>, b: f64| assert!((a.unwrap() - b).abs() < 1e-12, "{a:?} is not {b}");
        close(margin(see(5.0), Place::Conducting, 0.7, None), 4.3);
        close(margin(see(0.2), Place::Blocking, 0.7, None), 0.5);
        close(margin(see(-4.9), Place::Blocking, 0.7, Some(5.1)), 0.2);
        close(margin(see(-9.0), Place::Breakdown, 0.7, Some(5.1)), 3.9);
        assert_eq!(margin(see(0.7), Place::Blocking, 0.7, None), Some(0.0));
        assert_eq!(margin(see(0.1 + 0.2), Place::Blocking, 0.3, None), Some(0.0));
        let negative = View { open_circuit: -1.0, resistance: -1e3 };
        close(margin(negative, Place::Conducting, 0.7, None), 1.7);
        assert_eq!(margin(see(1.0), Place::Unknown, 0.7, None), None);
    }
}
