//! The part of a network that one junction lives in, with the sources that hold its edges, as a network of its
//! own: what is asked about one diode need not solve the rest of a large circuit again.

use crate::complementarity::{Branch, Control, Law, Network, Outcome};
use rustc_hash::FxHashMap;

/// A smaller network and the numbers its branches have in the large one.
pub(crate) struct Excerpt {
    pub network: Network,
    /// Number in the large network of each branch.
    pub original: Vec<u32>,
}

impl Excerpt {
    /// The part of `junction`; `None` where it is in no part or hangs on currents of other parts.
    pub fn around(network: &Network, outcome: &Outcome, junction: u32) -> Option<Self> {
        let part = outcome.parts.iter().find(|p| p.branches.contains(&junction))?;
        let mut chosen = part.branches.clone();
        chosen.extend(holders(network, outcome, &chosen));
        chosen.sort_unstable();
        chosen.dedup();
        let branch_number: FxHashMap<u32, u32> =
            chosen.iter().enumerate().map(|(n, &b)| (b, n as u32)).collect();
        let mut nodes: FxHashMap<u32, u32> = FxHashMap::default();
        nodes.insert(0, 0);
        let mut node = |n: u32| {
            let next = nodes.len() as u32;
            *nodes.entry(n).or_insert(next)
        };
        let mut branches = Vec::with_capacity(chosen.len());
        for &number in &chosen {
            let Branch { from, to, law } = *network.branches.get(number as usize)?;
            let mut control = |c: Control| match c {
                Control::Voltage(a, b) => Some(Control::Voltage(node(a), node(b))),
                Control::Current(b) => branch_number.get(&b).map(|&b| Control::Current(b)),
            };
            let law = match law {
                Law::VoltageControlled(gain, c) => Law::VoltageControlled(gain, control(c)?),
                Law::CurrentControlled(gain, c) => Law::CurrentControlled(gain, control(c)?),
                law => law,
            };
            branches.push(Branch { from: node(from), to: node(to), law });
        }
        let network = Network { nodes: nodes.len() as u32, branches };
        Some(Excerpt { network, original: chosen })
    }

    /// Number here of a branch of the large network.
    pub fn number(&self, original: u32) -> Option<u32> {
        self.original.binary_search(&original).ok().map(|n| n as u32)
    }
}

/// Branches of no part through which the ends of `inside` are held: trees of sources down to the reference.
fn holders(network: &Network, outcome: &Outcome, inside: &[u32]) -> Vec<u32> {
    let mut in_part = vec![false; network.branches.len()];
    for &branch in outcome.parts.iter().flat_map(|p| &p.branches) {
        in_part[branch as usize] = true;
    }
    let mut around: FxHashMap<u32, Vec<u32>> = FxHashMap::default();
    let free = (0..network.branches.len()).filter(|&n| !in_part[n]);
    for (number, branch) in free.map(|n| (n as u32, &network.branches[n])) {
        if matches!(branch.law, Law::Voltage(_) | Law::Short | Law::VoltageControlled(..)) {
            around.entry(branch.from).or_default().push(number);
            around.entry(branch.to).or_default().push(number);
        }
    }
    let mut seen: FxHashMap<u32, u32> = FxHashMap::default();
    seen.insert(0, 0); // beyond the reference nothing holds anything
    let mut open: Vec<u32> = Vec::new();
    for &number in inside {
        let branch = &network.branches[number as usize];
        open.extend([branch.from, branch.to]);
        if let Law::VoltageControlled(_, Control::Voltage(a, b))
        | Law::CurrentControlled(_, Control::Voltage(a, b)) = branch.law
        {
            open.extend([a, b]);
        }
    }
    let mut found = Vec::new();
    while let Some(node) = open.pop() {
        if seen.insert(node, 0).is_some() {
            continue;
        }
        for &number in around.get(&node).into_iter().flatten() {
            found.push(number);
            let branch = &network.branches[number as usize];
            open.extend([branch.from, branch.to]);
        }
    }
    found
}
