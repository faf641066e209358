//! Which diodes an extreme instant of a moving source cannot judge: those in parts where the source meets a
//! capacitor, an inductor or a coupling, because there the past counts too.

use super::condition::Plan;
use crate::circuit::{Behaviour, Circuit, ElementId, NodeId};
use petgraph::unionfind::UnionFind;

/// The diodes and the nodes that are left to the time pass, in order.
pub(crate) fn left_to_time(circuit: &Circuit, plan: &Plan) -> (Vec<ElementId>, Vec<NodeId>) {
    if plan.moving.is_empty() {
        return (Vec::new(), Vec::new());
    }
    let held = held_nodes(circuit, plan);
    let mut groups = UnionFind::<u32>::new(circuit.nodes.len().max(1));
    let free = |node: NodeId| held.get(node.index()).is_none_or(|h| *h == Held::No);
    for (id, element) in circuit.elements() {
        join(&mut groups, circuit.pins(id).iter().map(|p| p.node).filter(|&n| free(n)));
        if let Behaviour::Coupling { coils, .. } = &element.behaviour {
            let ends = coils.iter().flat_map(|&coil| circuit.pins(coil)).map(|p| p.node);
            join(&mut groups, ends.filter(|&n| free(n)));
        }
    }
    let mut remembers = vec![false; circuit.nodes.len().max(1)];
    let mut moved = remembers.clone();
    let at = |groups: &mut UnionFind<u32>, node: NodeId| groups.find_mut(node.0) as usize;
    for (id, element) in circuit.elements() {
        let is_reactive =
            matches!(element.behaviour, Behaviour::Capacitor { .. } | Behaviour::Inductor { .. });
        let is_moving = plan.moving.binary_search(&id).is_ok();
        let pins = circuit.pins(id);
        let touches_moving =
            is_moving || pins.iter().any(|p| held.get(p.node.index()) == Some(&Held::Moving));
        for pin in pins.iter().filter(|p| free(p.node)) {
            let group = at(&mut groups, pin.node);
            remembers[group] |= is_reactive;
            moved[group] |= touches_moving;
        }
    }
    let is_left_node = |&node: &NodeId| {
        let group = groups.find(node.0) as usize;
        free(node) && remembers[group] && moved[group]
    };
    let is_left = |&id: &ElementId| circuit.pins(id).iter().any(|p| is_left_node(&p.node));
    let nodes = (0..circuit.nodes.len()).map(NodeId::new).filter(is_left_node).collect();
    let diodes = circuit.elements().filter(|(_, e)| matches!(e.behaviour, Behaviour::Diode { .. }));
    (diodes.map(|(id, _)| id).filter(is_left).collect(), nodes)
}

fn join(groups: &mut UnionFind<u32>, nodes: impl Iterator<Item = NodeId>) {
    let mut first = None;
    for node in nodes {
        groups.union(*first.get_or_insert(node.0), node.0);
    }
}

/// How a node's potential is given.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum Held {
    No,
    Still,
    Moving,
}

/// Nodes held against ground by chains of voltage sources and supplies; moving where any of the chain moves.
fn held_nodes(circuit: &Circuit, plan: &Plan) -> Vec<Held> {
    let mut around: Vec<Vec<(NodeId, bool)>> = vec![Vec::new(); circuit.nodes.len().max(1)];
    for &id in &plan.sources {
        if matches!(circuit.element(id).behaviour, Behaviour::VoltageSource(_)) {
            let (a, b) = (circuit.node(id, 0), circuit.node(id, 1));
            let is_moving = plan.moving.binary_search(&id).is_ok();
            around[a.index()].push((b, is_moving));
            around[b.index()].push((a, is_moving));
        }
    }
    for supply in &plan.supplies {
        around[0].push((supply.node, false));
    }
    let mut held = vec![Held::No; around.len()];
    held[0] = Held::Still;
    let mut open = vec![NodeId::GROUND];
    while let Some(node) = open.pop() {
        let here = held[node.index()];
        for &(next, is_moving) in &around[node.index()] {
            if held[next.index()] == Held::No {
                held[next.index()] = if is_moving { Held::Moving } else { here };
                open.push(next);
            }
        }
    }
    held
}
