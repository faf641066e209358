//! Which diodes are legs of a bridge and which are freewheel diodes, for the two operators that speak of them. By the
//! wiring alone.

use super::netlist::Card;

/// A leg of a bridge: with three others it leads from one node to another along two ways of two diodes each.
pub fn is_bridge_leg(cards: &[Card], leg: &Card) -> bool {
    let diodes: Vec<&Card> = cards.iter().filter(|c| c.letter == 'D' && c.inside == leg.inside).collect();
    let joins = |from: &str, to: &str| diodes.iter().any(|d| d.nodes[0] == from && d.nodes[1] == to);
    let (anode, cathode) = (leg.nodes[0].as_str(), leg.nodes[1].as_str());
    let others = |end: usize, at: &str| {
        let far = diodes.iter().filter(|d| d.nodes[end] == at).map(|d| d.nodes[1 - end].clone());
        far.collect::<Vec<String>>()
    };
    // leg from an alternating node to plus, or from minus to an alternating node
    let upper = others(1, cathode)
        .iter()
        .any(|b| b != anode && others(1, anode).iter().any(|minus| joins(minus, b) && minus != cathode));
    let lower = others(0, anode)
        .iter()
        .any(|b| b != cathode && others(0, cathode).iter().any(|plus| joins(b, plus) && plus != anode));
    upper || lower
}

/// A diode whose ends a chain of inductors and resistors joins, with at least one inductor.
pub fn is_freewheel(cards: &[Card], diode: &Card) -> bool {
    let links: Vec<&Card> =
        cards.iter().filter(|c| (c.letter == 'R' || c.letter == 'L') && c.inside == diode.inside).collect();
    let mut open = vec![(diode.nodes[0].clone(), false, vec![diode.nodes[0].clone()])];
    while let Some((at, coil, been)) = open.pop() {
        if at == diode.nodes[1] {
            if coil {
                return true;
            }
            continue;
        }
        if been.len() > 3 || at == "0" && been.len() > 1 {
            continue;
        }
        for link in &links {
            let Some(side) = link.nodes.iter().position(|n| *n == at) else { continue };
            let next = link.nodes[1 - side].clone();
            if !been.contains(&next) {
                let mut been = been.clone();
                been.push(next.clone());
                open.push((next, coil || link.letter == 'L', been));
            }
        }
    }
    false
}
