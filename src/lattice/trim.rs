//! Where the pattern ends: points that sit on a node so far out that chance explains them as well are let go.
//!
//! Every lattice is hit by some strays. One hit far outside would make the lattice answer for all the empty nodes up to there; so the
//! radius is chosen at which the evidence is greatest, and points beyond it carry no order.

use super::{
    evidence::{Score, chance, nodes_in_region, occupancy, real, score, score_with},
    grow::{Growth, Scene, refit},
};

/// Fewest points that a trimmed lattice keeps.
const FEWEST: usize = 3;
/// Gain in evidence, nats, for which points are let go.
const WORTH: f64 = 2.0;

/// The growth within the radius of greatest evidence, and its score. None where the lattice is hopelessly dense or degenerate.
pub(super) fn trimmed(scene: &Scene<'_>, growth: Growth, total: usize) -> Option<(Growth, Score)> {
    let nodes = nodes_in_region(scene, &growth, super::evidence::most_nodes(total))?;
    let whole = score_with(scene, &growth, total, &nodes)?;
    let explained = growth.explained();
    let per_point = (growth.fit.log_likelihood + chance(scene, explained, total)) / real(explained);
    let mut occupied = vec![0_usize];
    for node in &nodes {
        occupied.push(occupied.last().copied().unwrap_or(0) + usize::from(node.occupied));
    }
    let gain = |m: usize| real(occupied[m]) * per_point - occupancy(&occupied[..=m]);
    let full = gain(nodes.len());
    let cut = (1..=nodes.len()).filter(|&m| nodes[m - 1].occupied && occupied[m] >= FEWEST).max_by(|&a, &b| gain(a).total_cmp(&gain(b)))?;
    if gain(cut) < full + WORTH {
        return Some((growth, whole));
    }
    let kept: std::collections::BTreeSet<(i32, i32)> = nodes[..cut].iter().filter(|n| n.occupied).map(|n| n.order).collect();
    let mut inner = growth.clone();
    for (i, node) in inner.node.iter_mut().enumerate() {
        if node.is_some_and(|n| !kept.contains(&n)) {
            *node = None;
            inner.beyond.push(i);
        }
    }
    match refit(scene, &inner).and_then(|g| score(scene, &g, total).map(|s| (g, s))) {
        Some((g, s)) if s.log_evidence > whole.log_evidence => Some((g, s)),
        _ => Some((growth, whole)),
    }
}
