//! The smallest network that still fails, by leaving out elements one after the other.

use crate::circuits::{Circuit, Kind};

/// Leaves out elements, then simplifies diodes, while `fails` still says so.
pub fn shrink(circuit: &Circuit, fails: &dyn Fn(&Circuit) -> bool) -> Circuit {
    let mut least = circuit.clone();
    loop {
        let smaller = candidates(&least).into_iter().find(|candidate| fails(candidate));
        match smaller {
            Some(smaller) => least = smaller,
            None => return least,
        }
    }
}

fn candidates(circuit: &Circuit) -> Vec<Circuit> {
    let mut list = Vec::new();
    for at in 0..circuit.elements.len() {
        let name = &circuit.elements[at].name;
        if circuit.elements.iter().any(|e| e.kind.listens() == Some(name)) {
            continue;
        }
        let mut smaller = circuit.clone();
        smaller.elements.remove(at);
        smaller.compact();
        list.push(smaller);
    }
    for at in 0..circuit.elements.len() {
        if let Kind::D(diode) = &circuit.elements[at].kind {
            let mut simple = diode.clone();
            simple.breakdown = None;
            list.extend(with(circuit, at, diode, simple));
            let mut simple = diode.clone();
            simple.series = crate::circuits::decimal::Dec::ZERO;
            list.extend(with(circuit, at, diode, simple));
        }
    }
    list
}

fn with(
    circuit: &Circuit,
    at: usize,
    old: &crate::circuits::Diode,
    new: crate::circuits::Diode,
) -> Option<Circuit> {
    (*old != new).then(|| {
        let mut simpler = circuit.clone();
        simpler.elements[at].kind = Kind::D(new);
        simpler
    })
}
