//! Whether two flat circuits are one circuit under other names: refinement of node colours, and where colours tie, every
//! way to break the tie. Names do not count, except ground and those of sources that others listen to.

use super::netlist::{Flat, Part};
use std::collections::{BTreeMap, hash_map::DefaultHasher};
use std::hash::{Hash, Hasher};

/// Whether the wiring and all values are the same.
pub fn same(a: &Flat, b: &Flat) -> bool {
    let (x, y) = (Graph::of(a), Graph::of(b));
    x.nodes.len() == y.nodes.len() && x.edges.len() == y.edges.len() && matches(&x, &y, x.start(), y.start())
}

struct Edge {
    /// What it is, whatever it joins.
    kind: String,
    /// Positions of its nodes; for elements without direction the order does not count.
    nodes: Vec<usize>,
    two_way: bool,
}

struct Graph {
    nodes: Vec<String>,
    edges: Vec<Edge>,
}

impl Graph {
    fn of(flat: &Flat) -> Graph {
        let mut nodes = flat.nodes();
        nodes.insert(0, "0".into());
        let place: BTreeMap<&String, usize> = nodes.iter().enumerate().map(|(n, name)| (name, n)).collect();
        let edge = |part: &Part| Edge {
            kind: kind(flat, part),
            nodes: part.nodes.iter().map(|n| place[n]).collect(),
            two_way: "RCL".contains(part.letter),
        };
        let edges = flat.parts.iter().map(edge).collect();
        Graph { nodes, edges }
    }

    fn start(&self) -> Vec<u64> {
        (0..self.nodes.len()).map(|n| u64::from(n == 0)).collect()
    }

    /// Colours by what meets at each node, until nothing is told apart any more.
    fn refine(&self, mut colours: Vec<u64>) -> Vec<u64> {
        for _ in 0..self.nodes.len() {
            let mut around: Vec<Vec<u64>> = vec![Vec::new(); self.nodes.len()];
            for edge in &self.edges {
                let seen: Vec<u64> = edge.nodes.iter().map(|&n| colours[n]).collect();
                for (pin, &node) in edge.nodes.iter().enumerate() {
                    around[node].push(if edge.two_way {
                        hash(&(&edge.kind, seen[1 - pin.min(1)]))
                    } else {
                        hash(&(&edge.kind, pin, &seen))
                    });
                }
            }
            let next: Vec<u64> = around
                .iter_mut()
                .zip(&colours)
                .map(|(list, own)| {
                    list.sort_unstable();
                    hash(&(own, list))
                })
                .collect();
            let stable = classes(&next) == classes(&colours);
            colours = next;
            if stable {
                break;
            }
        }
        colours
    }

    fn table(&self, names: &[u64]) -> Vec<(String, Vec<u64>)> {
        let mut table: Vec<(String, Vec<u64>)> = self
            .edges
            .iter()
            .map(|edge| {
                let mut nodes: Vec<u64> = edge.nodes.iter().map(|&n| names[n]).collect();
                if edge.two_way {
                    nodes.sort_unstable();
                }
                (edge.kind.clone(), nodes)
            })
            .collect();
        table.sort();
        table
    }
}

fn matches(a: &Graph, b: &Graph, from: Vec<u64>, to: Vec<u64>) -> bool {
    let (from, to) = (a.refine(from), b.refine(to));
    let sorted = |colours: &[u64]| {
        let mut list = colours.to_vec();
        list.sort_unstable();
        list
    };
    if sorted(&from) != sorted(&to) {
        return false;
    }
    let tie = (0..from.len()).find(|&n| from.iter().filter(|&&c| c == from[n]).count() > 1);
    let Some(tie) = tie else { return a.table(&from) == b.table(&to) };
    let mut marked = from.clone();
    marked[tie] = hash(&(from[tie], "chosen"));
    (0..to.len()).filter(|&n| to[n] == from[tie]).any(|n| {
        let mut other = to.clone();
        other[n] = marked[tie];
        matches(a, b, marked.clone(), other)
    })
}

/// What an element is: letter, value, the numbers of its model, its shape.
fn kind(flat: &Flat, part: &Part) -> String {
    let model = part.words.last().and_then(|w| flat.models.get(w));
    let noted: Vec<&Vec<String>> = flat
        .notes
        .iter()
        .filter(|n| {
            let about = n.get(1).map(String::as_str).unwrap_or("");
            matches!(n[0].as_str(), "drop" | "made-of" | "hold")
                && (about == part.name || part.words.last().is_some_and(|w| w == about))
        })
        .collect();
    let heard = if "KFHW".contains(part.letter) { part.words.join(" ") } else { String::new() };
    let listens = flat.parts.iter().any(|p| "KFHW".contains(p.letter) && p.words.contains(&part.name));
    let name = if listens || part.letter == 'K' { part.name.as_str() } else { "" };
    let said: Vec<&[String]> = noted.iter().map(|n| &n[2..]).collect();
    format!(
        "{} {:?} {model:?} {:?} {said:?} {} {heard} {name}",
        part.letter, part.value, part.shape, part.area
    )
}

fn classes(colours: &[u64]) -> usize {
    colours.iter().collect::<std::collections::BTreeSet<_>>().len()
}

fn hash(value: &impl Hash) -> u64 {
    let mut hasher = DefaultHasher::new();
    value.hash(&mut hasher);
    hasher.finish()
}
