//! How much more likely the points are on this lattice than strewn by chance.
//!
//! log evidence = log p(places | lattice) + k log A - log(n!/(n-k)!) - log(ways to choose which nodes are occupied)
//!
//! Places: marginal likelihood of the map (its free parameters integrated out, so that a lattice pays for its two or four
//! numbers). Chance: n points strewn evenly over the area A, unordered. Occupied nodes: within rings about the middle of
//! brightness, k of N nodes, log C(N, k) + log(N + 1) per ring. A lattice that is too dense pays for its empty nodes, one
//! that is too coarse loses the points between its nodes; rings let the pattern fade outwards without a penalty.

use statrs::function::gamma::ln_gamma;

use super::{
    cell::norm,
    grow::{Growth, Scene, sightings},
    warp::{Sighting, Warp},
};

/// Score of a lattice and the counts behind it.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Score {
    /// Log evidence over chance, nats.
    pub log_evidence: f64,
    /// Points with a node.
    pub explained: usize,
    /// Visible nodes within the region of the explained points.
    pub nodes: usize,
}

/// Nodes looked at per point before a lattice counts as hopelessly dense.
const NODES_PER_POINT: usize = 40;
/// Rings over which occupancy is counted.
const RINGS: usize = 6;

/// Nodes beyond which a lattice among `total` points counts as hopelessly dense.
pub(super) fn most_nodes(total: usize) -> usize {
    NODES_PER_POINT * total + 400
}

/// Score of a grown lattice among `total` points. None where it is hopelessly dense or degenerate.
pub(super) fn score(scene: &Scene<'_>, growth: &Growth, total: usize) -> Option<Score> {
    let nodes = nodes_in_region(scene, growth, most_nodes(total))?;
    score_with(scene, growth, total, &nodes)
}

/// [`score`] with the nodes of the region at hand.
pub(super) fn score_with(scene: &Scene<'_>, growth: &Growth, total: usize, nodes: &[Node]) -> Option<Score> {
    let explained = growth.explained();
    let log_evidence = growth.fit.log_likelihood + chance(scene, explained, total) - occupancy_cost(nodes);
    log_evidence.is_finite().then_some(Score { log_evidence, explained, nodes: nodes.len() })
}

/// Minus the log density of `explained` of `total` points strewn evenly, unordered.
pub(super) fn chance(scene: &Scene<'_>, explained: usize, total: usize) -> f64 {
    real(explained) * scene.area.ln() - (ln_gamma(real(total) + 1.0) - ln_gamma(real(total.saturating_sub(explained)) + 1.0))
}

/// Evidence for even spacing along a row alone, nats: the same comparison in one dimension, against points strewn by chance
/// along the row. Collinearity speaks in [`score`] but not here, so dust on a scratch is not taken for a grating.
pub(super) fn row_evidence(scene: &Scene<'_>, growth: &Growth) -> Option<f64> {
    let on_row = sightings(scene, &growth.node);
    let warp = &growth.fit.warp;
    let strip = row_neighbours(scene, growth, &on_row);
    let h: Vec<f64> = strip.iter().copied().filter(|h| h.is_finite()).collect();
    let (low, high) = h.iter().fold((f64::MAX, f64::MIN), |(l, u), &x| (l.min(x), u.max(x)));
    let (n, k) = (real(h.len()), real(on_row.len()));
    if h.len() < 3 || on_row.len() < 3 {
        return None;
    }
    let length = (high - low) * growth.step * (n + 1.0) / (n - 1.0);
    // Half of the two-dimensional likelihood is the part of each axis; the axis across the row is pure noise and carries its own.
    let log_likelihood = along_row_likelihood(scene, &on_row, warp, growth)?;
    let chance = k * length.ln() - (ln_gamma(n + 1.0) - ln_gamma(n - k + 1.0));
    let nodes = nodes_in_region(scene, growth, 100_000)?;
    let evidence = log_likelihood + chance - occupancy_cost(&nodes);
    evidence.is_finite().then_some(evidence)
}

/// A node, its distance from the middle of brightness, and whether a point sits there.
#[derive(Debug, Clone, Copy)]
pub(super) struct Node {
    pub order: (i32, i32),
    pub distance: f64,
    pub occupied: bool,
}

/// Visible nodes in the box of orders and the circle that the explained points span, from the middle outwards.
pub(super) fn nodes_in_region(scene: &Scene<'_>, growth: &Growth, most: usize) -> Option<Vec<Node>> {
    let found: std::collections::BTreeSet<(i32, i32)> = growth.node.iter().flatten().copied().collect();
    let [h0, h1, k0, k1] = order_box(&found)?;
    let count = (i64::from(h1) - i64::from(h0) + 1).checked_mul(i64::from(k1) - i64::from(k0) + 1)?;
    if usize::try_from(count).ok()? > most {
        return None;
    }
    let middle = middle_of_brightness(scene, growth);
    let distance = |(h, k): (i32, i32)| {
        let place = growth.fit.warp.place(f64::from(h), f64::from(k));
        (norm([place[0] - middle[0], place[1] - middle[1]]), place)
    };
    let reach = found.iter().map(|n| distance(*n).0).fold(0.0, f64::max) * (1.0 + 1e-9);
    let mut nodes = Vec::new();
    for h in h0..=h1 {
        for k in k0..=k1 {
            let occupied = found.contains(&(h, k));
            let (distance, place) = distance((h, k));
            if occupied || (distance <= reach && (scene.visible)(place)) {
                nodes.push(Node { order: (h, k), distance, occupied });
            }
        }
    }
    nodes.sort_by(|a, b| a.distance.total_cmp(&b.distance));
    Some(nodes)
}

/// Mean place of the brightest third of the explained points: the middle from which the pattern fades.
pub(super) fn middle_of_brightness(scene: &Scene<'_>, growth: &Growth) -> [f64; 2] {
    let mut explained: Vec<usize> = (0..scene.at.len()).filter(|&i| growth.node.get(i).is_some_and(Option::is_some)).collect();
    explained.sort_by(|&i, &j| scene.ln_weight[j].total_cmp(&scene.ln_weight[i]));
    explained.truncate((explained.len() / 3).max(3));
    let n = real(explained.len().max(1));
    let sum = explained.iter().fold([0.0, 0.0], |s, &i| [s[0] + scene.at[i][0], s[1] + scene.at[i][1]]);
    [sum[0] / n, sum[1] / n]
}

/// Smallest box of orders around the nodes: h from, h to, k from, k to.
pub(super) fn order_box(found: &std::collections::BTreeSet<(i32, i32)>) -> Option<[i32; 4]> {
    let h = found.iter().map(|n| n.0);
    let k = found.iter().map(|n| n.1);
    Some([h.clone().min()?, h.max()?, k.clone().min()?, k.max()?])
}

/// log of the number of ways to choose which nodes carry a point, told ring by ring.
fn occupancy_cost(nodes: &[Node]) -> f64 {
    let mut occupied = vec![0];
    for node in nodes {
        occupied.push(occupied.last().copied().unwrap_or(0) + usize::from(node.occupied));
    }
    occupancy(&occupied)
}

/// The same from running counts of occupied nodes, outwards, starting with 0.
pub(super) fn occupancy(occupied: &[usize]) -> f64 {
    let nodes = occupied.len().saturating_sub(1);
    let ring = nodes.div_ceil(RINGS).max(8);
    let cost = |from: usize| {
        let to = (from + ring).min(nodes);
        let (n, k) = (real(to - from), real(occupied[to] - occupied[from]));
        ln_gamma(n + 1.0) - ln_gamma(k + 1.0) - ln_gamma(n - k + 1.0) + (n + 1.0).ln()
    };
    (0..nodes).step_by(ring).map(cost).sum()
}

/// Orders along the row of all points that lie as near to the row as the explained ones do.
fn row_neighbours(scene: &Scene<'_>, growth: &Growth, on_row: &[Sighting]) -> Vec<f64> {
    let warp = &growth.fit.warp;
    let reach = on_row.iter().map(|s| s.node.0.abs()).max().map_or(0.0, f64::from) + 1.5;
    let near = |&at: &[f64; 2]| {
        let h = warp.order_at(at)?[0];
        let place = warp.place(h, 0.0);
        let sd = scene.slack.hypot(warp.variance(h, 0.0).sqrt());
        (h.abs() <= reach && (at[0] - place[0]).hypot(at[1] - place[1]) < 4.0 * sd.max(0.05 * growth.step)).then_some(h)
    };
    scene.at.iter().filter_map(near).collect()
}

/// Marginal likelihood of the places along the row: both axes turned so that the row is the first, the second left out.
fn along_row_likelihood(scene: &Scene<'_>, on_row: &[Sighting], warp: &Warp, growth: &Growth) -> Option<f64> {
    let direction = warp.steps(0.0, 0.0)[0];
    let length = norm(direction);
    if length <= f64::MIN_POSITIVE {
        return None;
    }
    let flat: Vec<Sighting> = on_row
        .iter()
        .map(|s| {
            let from = [s.at[0] - scene.centre[0], s.at[1] - scene.centre[1]];
            let along = (from[0] * direction[0] + from[1] * direction[1]) / length;
            Sighting { at: [along, 0.0], ..*s }
        })
        .collect();
    let scale =
        super::warp::WarpScale { centre: [0.0; 2], extent: scene.extent, steps: [growth.step, growth.step], bend: scene.options.bend };
    let both = Warp::fit(&flat, &scale, true)?.log_likelihood;
    let zeros: Vec<Sighting> = flat.iter().map(|s| Sighting { at: [0.0; 2], ..*s }).collect();
    let across = 0.5 * Warp::fit(&zeros, &scale, true)?.log_likelihood;
    Some(both - across)
}

#[expect(clippy::cast_precision_loss, reason = "counts of points and nodes are far below 2^53")]
pub(super) fn real(n: usize) -> f64 {
    n as f64
}
