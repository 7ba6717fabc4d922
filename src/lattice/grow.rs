//! Giving points their node, outwards from a start: only where the map so far knows the place well enough to be unambiguous.

use std::collections::BTreeMap;

use super::{
    cell::{dot, norm},
    point::IndexOptions,
    warp::{Sighting, Warp, WarpFit, WarpScale},
};

/// The usable points and what is known about the picture as a whole.
pub(super) struct Scene<'a> {
    /// Places.
    pub at: Vec<[f64; 2]>,
    /// Standard uncertainties.
    pub u: Vec<f64>,
    /// Natural log of the brightness.
    pub ln_weight: Vec<f64>,
    /// Further log odds of being the zero order.
    pub zero_log_odds: Vec<f64>,
    /// Median place.
    pub centre: [f64; 2],
    /// Largest distance from the centre.
    pub extent: f64,
    /// Least standard deviation of a point about its node.
    pub slack: f64,
    /// Area over which the points are strewn.
    pub area: f64,
    /// Options of the caller.
    pub options: &'a IndexOptions,
    /// Whether a place lies inside the photo.
    pub visible: &'a dyn Fn([f64; 2]) -> bool,
}

impl Scene<'_> {
    /// Standard deviation of a point about its node.
    pub(super) fn sd(&self, i: usize) -> f64 {
        self.u[i].hypot(self.slack)
    }
}

/// A start: a place taken as node (0,0) and the steps from it.
#[derive(Debug, Clone, Copy)]
pub(super) struct Start {
    /// Place of node (0, 0).
    pub origin: [f64; 2],
    /// Steps; the second is unused for a line.
    pub steps: [[f64; 2]; 2],
    /// Standard deviation of the steps.
    pub sd: f64,
    /// One row only.
    pub line: bool,
}

/// Points with nodes, and the map that places the nodes.
#[derive(Debug, Clone)]
pub(super) struct Growth {
    /// Node per point of the scene.
    pub node: Vec<Option<(i32, i32)>>,
    /// Points that lost a node to a better one: (point, winner).
    pub beaten: Vec<(usize, usize)>,
    /// Points on a node beyond the end of the pattern (filled in by `trim`).
    pub beyond: Vec<usize>,
    /// Scale of the map's priors.
    scale: WarpScale,
    /// The map.
    pub fit: WarpFit,
    /// Shortest step, the unit of slack.
    pub step: f64,
    /// One row only.
    pub line: bool,
}

impl Growth {
    /// Number of points with a node.
    pub(super) fn explained(&self) -> usize {
        self.node.iter().flatten().count()
    }

    /// The start sits on a node and steps along the primitive steps there: growing it would find this lattice again.
    pub(super) fn holds(&self, start: &Start) -> bool {
        let Some(near) = nearest_node(&self.fit.warp, start.origin) else { return false };
        let g = self.fit.warp.steps(near.order[0], near.order[1]);
        let off = |v: [f64; 2], w: [f64; 2]| norm([v[0] - w[0], v[1] - w[1]]).min(norm([v[0] + w[0], v[1] + w[1]]));
        let same = |v: [f64; 2], w: [f64; 2]| off(v, w) < 0.08 * self.step;
        let [p, q] = start.steps;
        let steps = if self.line { same(p, g[0]) } else { (same(p, g[0]) && same(q, g[1])) || (same(p, g[1]) && same(q, g[0])) };
        steps && start.line == self.line && near.distance < 0.1 * self.step
    }
}

/// Rounds of assigning and refitting; growth by a factor per round reaches any edge long before.
const ROUNDS: usize = 14;
/// A node is given only where the map's own standard deviation is below this share of the shortest step.
pub(super) const KNOWN_WELL: f64 = 0.16;
/// Acceptance radius in standard deviations: a true point is lost once in a thousand.
const GATE: f64 = 3.7;
/// Acceptance radius never exceeds this share of the shortest step.
const WIDEST_GATE: f64 = 0.3;

/// Grows a lattice over the points `among` (indices into the scene). None where the start is degenerate or fewer than two points join.
pub(super) fn grow(scene: &Scene<'_>, among: &[usize], start: &Start) -> Option<Growth> {
    let step = shortest_step(start)?;
    let scale = WarpScale {
        centre: scene.centre,
        extent: scene.extent,
        steps: [norm(start.steps[0]), norm(start.steps[1])],
        bend: scene.options.bend,
    };
    let anchors = anchors(start, scene.slack);
    let mut fit = Warp::fit(&anchors, &scale, start.line)?;
    let mut growth = Growth { node: Vec::new(), beaten: Vec::new(), beyond: Vec::new(), scale, fit: fit.clone(), step, line: start.line };
    let mut orders = vec![[0.0; 2]; scene.at.len()];
    for _ in 0..ROUNDS {
        let (node, beaten) = assign(scene, among, &fit.warp, step, start.line, &mut orders);
        if node == growth.node {
            break;
        }
        let mut sightings = sightings(scene, &node);
        growth.node = node;
        growth.beaten = beaten;
        let enough = sightings.len() >= if start.line { 3 } else { 5 };
        if !enough {
            sightings.extend_from_slice(&anchors);
        }
        fit = Warp::fit(&sightings, &scale, start.line)?;
    }
    refit(scene, &growth)
}

/// The growth with its map fitted to exactly the points that have a node. None where these do not span the lattice.
pub(super) fn refit(scene: &Scene<'_>, growth: &Growth) -> Option<Growth> {
    let fit = Warp::fit(&sightings(scene, &growth.node), &growth.scale, growth.line)?;
    spans(growth).then(|| Growth { fit, ..growth.clone() })
}

/// Three nodes not on one straight line; for a line two nodes.
fn spans(growth: &Growth) -> bool {
    let mut nodes = growth.node.iter().flatten();
    let Some(first) = nodes.next() else { return false };
    let from_first: Vec<(i64, i64)> = nodes.map(|n| (i64::from(n.0 - first.0), i64::from(n.1 - first.1))).collect();
    let Some(along) = from_first.first() else { return false };
    growth.line || from_first.iter().any(|n| n.0 * along.1 != n.1 * along.0)
}

/// Distance of a point from the nearest node and that node.
pub(super) struct Nearest {
    pub node: (i32, i32),
    /// Real-valued order of the point.
    pub order: [f64; 2],
    /// Distance to the node's place.
    pub distance: f64,
    /// Variance of the node's place by the map.
    pub map_variance: f64,
}

/// The node nearest to a place.
pub(super) fn nearest_node(warp: &Warp, at: [f64; 2]) -> Option<Nearest> {
    node_near(warp, at, warp.order_at(at)?)
}

fn node_near(warp: &Warp, at: [f64; 2], order: [f64; 2]) -> Option<Nearest> {
    let node = (whole(order[0])?, whole(order[1])?);
    let (h, k) = (f64::from(node.0), f64::from(node.1));
    let place = warp.place(h, k);
    Some(Nearest { node, order, distance: (at[0] - place[0]).hypot(at[1] - place[1]), map_variance: warp.variance(h, k) })
}

type Assignment = (Vec<Option<(i32, i32)>>, Vec<(usize, usize)>);

fn assign(scene: &Scene<'_>, among: &[usize], warp: &Warp, step: f64, line: bool, orders: &mut [[f64; 2]]) -> Assignment {
    let mut node = vec![None; scene.at.len()];
    let mut holder: BTreeMap<(i32, i32), (usize, f64)> = BTreeMap::new();
    let mut beaten = Vec::new();
    for &i in among {
        let Some(near) = warp.order_from(scene.at[i], orders[i]).and_then(|o| node_near(warp, scene.at[i], o)) else {
            orders[i] = [0.0; 2];
            continue;
        };
        orders[i] = near.order;
        if near.map_variance > (KNOWN_WELL * step).powi(2) || (line && near.node.1 != 0) {
            continue;
        }
        let variance = near.map_variance + scene.sd(i).powi(2);
        if near.distance > (GATE * variance.sqrt()).min(WIDEST_GATE * step) {
            continue;
        }
        // A claim is better the nearer it is and the brighter: a faint stray beside an order must not take its node.
        let claim = scene.ln_weight[i] - 0.5 * near.distance * near.distance / variance;
        match holder.get(&near.node).copied() {
            Some((other, best)) if best >= claim => beaten.push((i, other)),
            before => {
                if let Some((other, _)) = before {
                    beaten.push((other, i));
                    node[other] = None;
                }
                holder.insert(near.node, (i, claim));
                node[i] = Some(near.node);
            }
        }
    }
    (node, beaten)
}

/// The sightings of all points that have a node.
pub(super) fn sightings(scene: &Scene<'_>, node: &[Option<(i32, i32)>]) -> Vec<Sighting> {
    let sighting = |(i, n): (usize, &Option<(i32, i32)>)| n.map(|node| Sighting { node, at: scene.at[i], sd: scene.sd(i) });
    node.iter().enumerate().filter_map(sighting).collect()
}

fn anchors(start: &Start, sd_origin: f64) -> Vec<Sighting> {
    let [o, p, q] = [start.origin, start.steps[0], start.steps[1]];
    let sd = start.sd.max(sd_origin);
    let mut all = vec![
        Sighting { node: (0, 0), at: o, sd: sd_origin },
        Sighting { node: (1, 0), at: [o[0] + p[0], o[1] + p[1]], sd },
        Sighting { node: (-1, 0), at: [o[0] - p[0], o[1] - p[1]], sd },
    ];
    if !start.line {
        all.push(Sighting { node: (0, 1), at: [o[0] + q[0], o[1] + q[1]], sd });
        all.push(Sighting { node: (0, -1), at: [o[0] - q[0], o[1] - q[1]], sd });
    }
    all
}

fn shortest_step(start: &Start) -> Option<f64> {
    let p = norm(start.steps[0]);
    let step = if start.line { p } else { p.min(norm(start.steps[1])) };
    let spans = start.line || {
        let [p, q] = start.steps;
        let area = (p[0] * q[1] - p[1] * q[0]).abs();
        area * area > 0.01 * dot(p, p) * dot(q, q)
    };
    (step.is_finite() && step > 1e-12 && spans).then_some(step)
}

/// Nearest whole number as i32; none beyond a million.
#[expect(clippy::cast_possible_truncation, reason = "range checked just before")]
pub(super) fn whole(x: f64) -> Option<i32> {
    let rounded = x.round();
    (rounded.abs() < 1e6).then_some(rounded as i32)
}
