//! Where lattices are guessed from: difference vectors among the brightest points.
//!
//! From each of a few origins, every pair of short difference vectors (to near neighbours, and those that recur between
//! neighbours all over the picture) is a basis to try. A quick count of the points near the origin that it explains picks the few that
//! are worth growing.

use super::{
    cell::{Cell, dot, minus, norm, reduce},
    grow::{Scene, Start},
    warp::Warp,
};

/// Near neighbours of an origin that serve as steps.
const NEIGHBOURS: usize = 16;
/// Recurring differences that serve as steps.
const RECURRING: usize = 10;
/// Bases kept per origin after the quick count.
const KEPT: usize = 5;
/// Points around the origin used in the quick count.
const QUICK_POINTS: usize = 40;

/// The starts worth growing, best first per origin; lines and planes apart.
pub(super) fn starts(scene: &Scene<'_>, bright: &[usize], line: bool) -> Vec<Start> {
    let recurring = recurring_steps(scene, bright);
    let mut all = Vec::new();
    for origin in origins(scene, bright) {
        let near = by_distance(scene, bright, scene.at[origin]);
        let mut steps: Vec<[f64; 2]> = near.iter().skip(1).take(NEIGHBOURS).map(|&i| minus(scene.at[i], scene.at[origin])).collect();
        steps.extend(&recurring);
        let steps = distinct(scene, steps);
        let quick: Vec<[f64; 2]> = near.iter().take(QUICK_POINTS).map(|&i| minus(scene.at[i], scene.at[origin])).collect();
        let mut tried: Vec<(f64, Start)> = if line { line_bases(&steps) } else { plane_bases(&steps) }
            .into_iter()
            .map(|steps| start(scene, scene.at[origin], steps, line))
            .map(|s| (quick_count(scene, &quick, &s), s))
            .collect();
        tried.sort_by(|a, b| b.0.total_cmp(&a.0));
        all.extend(tried.into_iter().take(KEPT).map(|(_, s)| s));
    }
    all
}

/// A start whose steps are as uncertain as a difference of two points under the stated bend.
pub(super) fn start(scene: &Scene<'_>, origin: [f64; 2], steps: [[f64; 2]; 2], line: bool) -> Start {
    let long = if line { norm(steps[0]) } else { norm(steps[0]).max(norm(steps[1])) };
    let typical_u = median(scene.u.iter().copied());
    Start { origin, steps, sd: typical_u.hypot(0.5 * scene.options.bend * long * long), line }
}

/// Points in order of distance from a place.
pub(super) fn by_distance(scene: &Scene<'_>, among: &[usize], from: [f64; 2]) -> Vec<usize> {
    let mut near = among.to_vec();
    near.sort_by(|&i, &j| norm(minus(scene.at[i], from)).total_cmp(&norm(minus(scene.at[j], from))));
    near
}

/// Median; 0 for an empty set.
pub(super) fn median(values: impl Iterator<Item = f64>) -> f64 {
    let mut sorted: Vec<f64> = values.collect();
    sorted.sort_by(f64::total_cmp);
    sorted.get(sorted.len() / 2).copied().unwrap_or(0.0)
}

/// The brightest points, those nearest to the middle of the bright ones, and the one where the zero order is expected.
fn origins(scene: &Scene<'_>, bright: &[usize]) -> Vec<usize> {
    let mut found: Vec<usize> = bright.iter().copied().take(5).collect();
    let head = &bright[..bright.len().min(30)];
    let middle = [median(head.iter().map(|&i| scene.at[i][0])), median(head.iter().map(|&i| scene.at[i][1]))];
    found.extend(by_distance(scene, bright, middle).into_iter().take(4));
    if let Some(hint) = scene.options.zero_hint {
        found.extend(by_distance(scene, bright, hint.at).into_iter().take(2));
    }
    let mut seen = std::collections::BTreeSet::new();
    found.retain(|i| seen.insert(*i));
    found
}

/// Differences between near neighbours that recur most often, shortest of equals first.
fn recurring_steps(scene: &Scene<'_>, bright: &[usize]) -> Vec<[f64; 2]> {
    let mut all = Vec::new();
    for &i in bright {
        let near = by_distance(scene, bright, scene.at[i]);
        all.extend(near.iter().skip(1).take(8).map(|&j| upward(minus(scene.at[j], scene.at[i]))));
    }
    all.sort_by(|a, b| norm(*a).total_cmp(&norm(*b)));
    let votes = |v: [f64; 2]| all.iter().filter(|w| same_step(scene, v, **w)).count();
    let mut voted: Vec<(usize, [f64; 2])> = all.iter().map(|v| (votes(*v), *v)).collect();
    voted.sort_by_key(|v| std::cmp::Reverse(v.0));
    let mut kept: Vec<[f64; 2]> = Vec::new();
    for (_, v) in voted {
        if kept.len() == RECURRING {
            break;
        }
        if !kept.iter().any(|k| same_step(scene, *k, v)) {
            kept.push(v);
        }
    }
    kept
}

fn distinct(scene: &Scene<'_>, steps: Vec<[f64; 2]>) -> Vec<[f64; 2]> {
    let mut kept: Vec<[f64; 2]> = Vec::new();
    for v in steps.into_iter().map(upward).filter(|v| norm(*v) > 1e-9 * scene.extent) {
        if !kept.iter().any(|k| norm(minus(*k, v)) < 0.01 * norm(v)) {
            kept.push(v);
        }
    }
    kept
}

/// One of v, -v, so that a difference and its reverse are the same step.
fn upward(v: [f64; 2]) -> [f64; 2] {
    if v[1] < 0.0 || (v[1] <= 0.0 && v[0] < 0.0) { [-v[0], -v[1]] } else { v }
}

fn same_step(scene: &Scene<'_>, v: [f64; 2], w: [f64; 2]) -> bool {
    let slack = 0.03 * norm(v) + scene.options.bend * norm(v) * norm(v);
    norm(minus(v, w)) < slack || norm([v[0] + w[0], v[1] + w[1]]) < slack
}

fn line_bases(steps: &[[f64; 2]]) -> Vec<[[f64; 2]; 2]> {
    let parts = |v: &[f64; 2]| [1.0, 2.0, 3.0].map(|n| [[v[0] / n, v[1] / n], [0.0, 0.0]]);
    steps.iter().flat_map(parts).collect()
}

fn plane_bases(steps: &[[f64; 2]]) -> Vec<[[f64; 2]; 2]> {
    let mut kept: Vec<[[f64; 2]; 2]> = Vec::new();
    for (i, p) in steps.iter().enumerate() {
        for q in &steps[i + 1..] {
            let Ok(reduced) = reduce(&Cell { a: *p, b: *q }) else { continue };
            let (a, b) = (upward(reduced.cell.a), upward(reduced.cell.b));
            let area = (a[0] * b[1] - a[1] * b[0]).abs();
            // A cell much flatter than any reduced lattice comes from two copies of nearly the same step.
            let flat = area < 0.15 * norm(b) * norm(a) || norm(b) > 12.0 * norm(a);
            let known = kept.iter().any(|k| norm(minus(k[0], a)) < 0.02 * norm(a) && norm(minus(k[1], b)) < 0.02 * norm(b));
            if !flat && !known {
                kept.push([a, b]);
            }
        }
    }
    kept
}

/// Sum over the points near the origin of log(cell area / acceptance area): what a hit is worth against chance. A rigid net, no refit.
fn quick_count(scene: &Scene<'_>, around: &[[f64; 2]], start: &Start) -> f64 {
    let [p, q] = start.steps;
    let pp = dot(p, p);
    let area = p[0] * q[1] - p[1] * q[0];
    let shortest = if start.line { pp.sqrt() } else { pp.sqrt().min(norm(q)) };
    let base = start.sd.hypot(scene.slack);
    let mut total = 0.0;
    for v in around {
        let order =
            if start.line { [dot(*v, p) / pp, 0.0] } else { [(v[0] * q[1] - v[1] * q[0]) / area, (p[0] * v[1] - p[1] * v[0]) / area] };
        let node = [order[0].round(), order[1].round()];
        let off = [v[0] - node[0] * p[0] - node[1] * q[0], v[1] - node[0] * p[1] - node[1] * q[1]];
        let gate = 3.0 * base * (1.0 + 0.7 * norm(node)) + 0.5 * scene.options.bend * dot(*v, *v);
        let cell = if start.line { pp } else { area.abs() };
        if gate < 0.3 * shortest && norm(off) < gate {
            total += (cell / (std::f64::consts::PI * gate * gate)).ln().max(0.0);
        } else if gate < 0.3 * shortest {
            total -= 0.3;
        }
    }
    total
}

/// The steps of a map at an order, for starting again from there.
pub(super) fn steps_of(warp: &Warp, node: (i32, i32)) -> [[f64; 2]; 2] {
    warp.steps(f64::from(node.0), f64::from(node.1))
}
