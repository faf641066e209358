//! Linear systems of conductances: nodes, edges with positive conductance, injected currents, potentials against
//! node 0. Two ways to factor one pattern: `mesh` (no subtraction, any spread of values) and `supernodal` (fast on
//! large systems of moderate spread). Nothing here knows junctions.

use super::mesh::Mesh;
use super::supernodal::Supernodal;

/// From this number of unknowns on the supernodal factorization is the faster one.
const LARGE: usize = 2000;
/// Greatest over least conductance up to which plain double precision keeps enough digits for refinement.
const MODERATE: f64 = 1e9;

/// One pattern, factored as often as the numbers change.
pub(super) struct Laplacian {
    nodes: usize,
    edges: Vec<(u32, u32)>,
    mesh: Option<Mesh>,
    supernodal: Option<Supernodal>,
    use_mesh: bool,
    /// The factor of a large pattern would not fit in memory: nothing can be solved.
    pub(super) too_large: bool,
    /// Factorizations done.
    pub(super) factorizations: usize,
}

impl Laplacian {
    /// `nodes` counts node 0. Every node must be joined to node 0 by some path of edges.
    pub(super) fn new(nodes: usize, edges: Vec<(u32, u32)>) -> Self {
        let supernodal = if nodes > LARGE { Supernodal::new(nodes, &edges) } else { None };
        let too_large = nodes > LARGE && supernodal.is_none();
        Laplacian { nodes, edges, mesh: None, supernodal, use_mesh: false, too_large, factorizations: 0 }
    }

    pub(super) fn edges(&self) -> &[(u32, u32)] {
        &self.edges
    }

    /// Factors with these conductances (> 0), one for each edge. With `exact`, wide spreads are factored without
    /// subtraction whatever it costs.
    pub(super) fn factor(&mut self, conductances: &[f64], exact: bool) {
        if self.too_large {
            return;
        }
        self.factorizations += 1;
        let proper = |&(a, b): &(u32, u32)| a != b;
        let values = || self.edges.iter().zip(conductances).filter(|(e, _)| proper(e)).map(|(_, &g)| g);
        let spread = values().fold(0.0, f64::max) / values().fold(f64::INFINITY, f64::min);
        self.use_mesh = true;
        if !exact || spread <= MODERATE {
            let factored = self.supernodal.as_mut().is_some_and(|s| s.factor(&self.edges, conductances));
            self.use_mesh = !factored;
        }
        if self.use_mesh {
            self.factor_mesh(conductances);
        }
    }

    /// Factors again without subtraction, where [`factor`](Self::factor) lost too many digits.
    pub(super) fn factor_again(&mut self, conductances: &[f64]) -> bool {
        if self.use_mesh || self.too_large {
            return false;
        }
        self.factorizations += 1;
        self.use_mesh = true;
        self.factor_mesh(conductances);
        true
    }

    fn factor_mesh(&mut self, conductances: &[f64]) {
        let (nodes, edges) = (self.nodes, &self.edges);
        self.mesh.get_or_insert_with(|| Mesh::new(nodes, edges)).factor(conductances);
    }

    /// Injected currents to potentials, in place; entry 0 becomes 0.
    pub(super) fn solve(&mut self, values: &mut [f64]) {
        match (&self.mesh, &mut self.supernodal) {
            (Some(mesh), _) if self.use_mesh => mesh.solve(values),
            (_, Some(supernodal)) => supernodal.solve(values),
            _ => values.fill(0.0),
        }
    }
}
