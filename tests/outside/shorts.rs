//! Loops of inductors and 0 Ω alone, and currents that merely circulate: what the words of the model say about them,
//! worked out by hand.

use crate::run::{self, Named, nominal};
use kneewise::circuit::State;
use kneewise::complementarity::Verdict;

fn case(netlist: &str) -> (Verdict, kneewise::analysis::Analysis) {
    let analysis = run::states(netlist);
    let verdict = nominal(&analysis).expect("a nominal case").verdict;
    (verdict, analysis)
}

/// How two shorts side by side share 5 mA is nobody's business: the verdict stays `unique`, their currents are ranges
/// that admit an equal split.
#[test]
fn loops_of_shorts_alone_stay_unique() {
    for (first, second) in [("L1 b 0 1m", "L2 b 0 2m"), ("R2 b 0 0", "R3 b 0 0"), ("L1 b 0 1m", "R2 b 0 0")] {
        let (verdict, analysis) = case(&format!("shorts\nV1 a 0 5\nR1 a b 1k\n{first}\n{second}\n.end\n"));
        assert_eq!(verdict, Verdict::Unique, "{first}, {second}");
        let named = Named::new(&analysis, &nominal(&analysis).expect("a case").solutions[0]);
        for line in [first, second] {
            let name = line.split(' ').next().expect("a name");
            let current = named.branch(name).expect("listed").current;
            let open = current.interval().unwrap_or_else(|| panic!("{name}: {current:?} is no range"));
            assert!(open.low <= 2.5e-3 && 2.5e-3 <= open.high, "{name}: {open:?}");
        }
        let known = named.branch("V1").expect("listed").current.known().expect("known");
        assert!((known + 5e-3).abs() < 1e-12, "{known}");
    }
}

/// A short in series with something is known like anything else.
#[test]
fn a_short_in_the_way_carries_what_the_way_carries() {
    let (verdict, analysis) = case(
        "in series\nV1 a 0 5\nL1 a b 1m\nR1 b c 1k\nR2 c d 0\nD1 d 0 DX\n.model DX D\n*@ drop DX 0.7\n.end\n",
    );
    assert_eq!(verdict, Verdict::Unique);
    let named = Named::new(&analysis, &nominal(&analysis).expect("a case").solutions[0]);
    for name in ["L1", "R2"] {
        let current = named.branch(name).expect("listed").current.known().expect("known");
        assert!((current - 4.3e-3).abs() < 1e-14, "{name}: {current}");
    }
}

/// Antiparallel ideal diodes could send any current round in a circle. It is left out: one carries what comes, the
/// other nothing.
#[test]
fn what_merely_circulates_is_left_out() {
    let (verdict, analysis) = case(
        "antiparallel\nV1 a 0 5\nR1 a b 1k\nD1 b 0 DX\nD2 0 b DX\nD3 b c DX\nD4 c d DX\nD5 d b DX\nR2 c 0 1k\n.model DX D\n*@ drop DX 0\n.end\n",
    );
    assert_eq!(verdict, Verdict::Unique);
    let named = Named::new(&analysis, &nominal(&analysis).expect("a case").solutions[0]);
    for (name, state, current) in [
        ("D1", State::Conducting, 5e-3),
        ("D2", State::Blocking, 0.0),
        ("D3", State::Blocking, 0.0),
        ("D4", State::Blocking, 0.0),
        ("D5", State::Blocking, 0.0),
    ] {
        let diode = named.diode(name).expect("listed");
        assert_eq!(diode.state, state, "{name}");
        assert!(
            diode.current.known().is_some_and(|i| (i - current).abs() < 1e-14),
            "{name}: {:?}",
            diode.current
        );
    }
}

/// A source of 0 V beside an ideal diode: how they split what comes is open, what circulates is left out.
#[test]
fn a_meter_beside_an_ideal_diode_shares_what_comes() {
    let (verdict, analysis) =
        case("meter\nV1 a 0 5\nR1 a b 1k\nD1 b 0 DX\nV2 b 0 0\n.model DX D\n*@ drop DX 0\n.end\n");
    assert_eq!(verdict, Verdict::Shared);
    let named = Named::new(&analysis, &nominal(&analysis).expect("a case").solutions[0]);
    let diode = named.diode("D1").expect("listed").current;
    let meter = named.branch("V2").expect("listed").current;
    for current in [diode, meter] {
        let open = current.interval().unwrap_or_else(|| panic!("{current:?}"));
        assert!(open.low.abs() < 1e-14 && (open.high - 5e-3).abs() < 1e-14, "{open:?}");
    }
}

/// A drop that a source cancels is a loop of a conducting diode and a source whose voltages sum to zero: its current
/// is open, and has no end.
#[test]
fn a_loop_in_which_drop_and_source_cancel_stays_open() {
    let (verdict, analysis) =
        case("tie\nV1 a 0 5\nR1 a b 1k\nD1 b 0 DX\nV2 b 0 1\n.model DX D\n*@ drop DX 1\n.end\n");
    assert_eq!(verdict, Verdict::Shared);
    let named = Named::new(&analysis, &nominal(&analysis).expect("a case").solutions[0]);
    let diode = named.diode("D1").expect("listed").current.interval().expect("a range");
    assert!(diode.low.abs() < 1e-15 && diode.high == f64::INFINITY, "{diode:?}");
    let meter = named.branch("V2").expect("listed").current.interval().expect("a range");
    assert!((meter.high - 4e-3).abs() < 1e-14 && meter.low == f64::NEG_INFINITY, "{meter:?}");
}

/// An order of nodes decides what circulates: D11 carries all 3 mA that come to n2 while the meter V1 brings back what
/// the source takes from n3; D10 carries all of them while the meter carries the rest on.
#[test]
fn a_meter_may_turn_round_without_anything_circulating() {
    let (verdict, analysis) = case(
        "ring\nI1 0 n2 3m\nD10 n2 n3 DX\nD11 n2 0 DX\nV1 n3 0 0\nI3 n3 0 1m\n.model DX D\n*@ drop DX 0\n.end\n",
    );
    assert_eq!(verdict, Verdict::Shared);
    let named = Named::new(&analysis, &nominal(&analysis).expect("a case").solutions[0]);
    for name in ["D10", "D11"] {
        let open = named.diode(name).expect("listed").current.interval().expect("a range");
        assert!(open.low.abs() < 1e-14 && (open.high - 3e-3).abs() < 1e-14, "{name}: {open:?}");
    }
    let meter = named.branch("V1").expect("listed").current.interval().expect("a range");
    assert!((meter.low + 1e-3).abs() < 1e-14 && (meter.high - 2e-3).abs() < 1e-14, "{meter:?}");
}

/// Sources to ground hold their nodes whatever contradicts them further on: what stands on those nodes keeps its answer.
#[test]
fn a_contradiction_between_two_rails_leaves_the_rails_alone() {
    let (verdict, analysis) =
        case("rails\nV1 a 0 5\nV2 b 0 3\nV3 a c 1\nL1 c b 1m\nR1 a 0 1k\nR2 c 0 1k\n.end\n");
    assert_eq!(verdict, Verdict::None);
    let named = Named::new(&analysis, &nominal(&analysis).expect("a case").solutions[0]);
    assert!(named.branch("R1").expect("listed").current.known().is_some_and(|i| (i - 5e-3).abs() < 1e-15));
    for name in ["R2", "V3"] {
        assert!(named.branch(name).map_or(true, |b| b.current.known().is_none()), "{name}");
    }
}

/// A source whose ends are joined contradicts itself and nobody else.
#[test]
fn a_source_that_closes_on_itself_leaves_the_rest_alone() {
    let (verdict, analysis) = case("itself\nV1 b b 0.7\nR1 b 0 1k\nV2 a 0 5\nR2 a b 1k\n.end\n");
    assert_eq!(verdict, Verdict::None);
    let named = Named::new(&analysis, &nominal(&analysis).expect("a case").solutions[0]);
    assert!(named.branch("R1").expect("listed").current.known().is_some_and(|i| (i - 2.5e-3).abs() < 1e-15));
}
