//! The second opinion: the exponential law on every part that the constant-drop model solved. Only asked for and
//! collected here; Newton's method is `complementarity`'s.

use super::assemble::{NONE, Setting};
use super::evaluate::Solved;
use super::knee::curve_of;
use super::result::{Refined, Unrefined};
use crate::complementarity::{Law, Smoothness, Solution};

/// Largest number of diodes in a part for which it is sought without being asked for.
pub(crate) const MOST_DIODES: usize = 5000;

/// What was found, by diode (in their order) and by node.
#[derive(Default)]
pub(crate) struct Opinion {
    /// `None` where it was not sought or not found.
    pub diodes: Vec<Option<Refined>>,
    /// Volts; NaN where unknown.
    pub nodes: Vec<f64>,
    /// Parts without an answer.
    pub failed: Vec<Unrefined>,
}

/// The second opinion on one solution; `is_sought` says by branch whether its part takes part.
pub(crate) fn opinion(
    setting: &Setting<'_>,
    solved: &Solved,
    solution: &Solution,
    is_sought: impl Fn(u32) -> bool,
) -> Opinion {
    let network = &solved.assembly.network;
    let mut laws = vec![Smoothness::Leave; network.branches.len()];
    let mut any = false;
    for diode in setting.diodes {
        let branch = solved.assembly.branch[diode.element.index()];
        if branch == NONE || !is_sought(branch) {
            continue;
        }
        if matches!(network.branches[branch as usize].law, Law::Junction(_)) {
            let curve = curve_of(setting, diode);
            any |= curve.is_some();
            laws[branch as usize] = curve.map_or(Smoothness::Corner, Smoothness::Curve);
        }
    }
    let none = vec![None; setting.diodes.len()];
    if !any {
        return Opinion { diodes: none, ..Opinion::default() };
    }
    let smooth = network.smooth(solution, &laws);
    let refined = |branch: u32| {
        let (voltage, current) = *smooth.junctions.get(branch as usize)?;
        (voltage.is_finite() && current.is_finite()).then_some(Refined { voltage, current })
    };
    let of_diode = |d: &super::drop::Diode| refined(solved.assembly.branch[d.element.index()]);
    let mut failed = Vec::new();
    for branches in &smooth.failed {
        let is_in = |d: &&super::drop::Diode| branches.contains(&solved.assembly.branch[d.element.index()]);
        let diodes = setting.diodes.iter().filter(is_in).map(|d| d.element).collect();
        failed.push(Unrefined { diodes, reason: "its iteration did not settle" });
    }
    Opinion { diodes: setting.diodes.iter().map(of_diode).collect(), nodes: smooth.potentials, failed }
}
