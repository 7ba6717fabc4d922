//! Why points carry no order, and what the points that do carry one say about the numbering.

use std::collections::BTreeMap;

use super::{
    Point, Reason, Warning,
    cell::{dot, minus, norm},
    contest::{Candidate, candidates, over_all},
    evidence::real,
    grow::{Growth, KNOWN_WELL, Nearest, Scene, nearest_node},
    seed::median,
};

/// Reasons per point, and the warnings that follow from them.
pub(super) struct Explained {
    pub rejected: Vec<(usize, Reason)>,
    pub warnings: Vec<Warning>,
}

/// Radius, in orders, within which displaced copies share one offset.
const OFFSET_RADIUS: f64 = 0.06;
/// Least size of a set of copies.
const FEWEST_COPIES: usize = 3;

/// Gives every point without order its reason.
pub(super) fn explain_rejected(points: &[Point], usable: &[usize], scene: &Scene<'_>, settled: &Candidate) -> Explained {
    let growth = &settled.growth;
    let mut reason: BTreeMap<usize, Reason> = (0..points.len()).filter(|i| !usable.contains(i)).map(|i| (i, Reason::NotANumber)).collect();
    let beaten: BTreeMap<usize, usize> = growth.beaten.iter().copied().collect();
    let mut loose = Vec::new();
    let beyond: BTreeMap<usize, (i32, i32)> =
        growth.beyond.iter().filter_map(|&i| nearest_node(&growth.fit.warp, scene.at[i]).map(|n| (i, n.node))).collect();
    reason.extend(beyond.iter().map(|(&i, &order)| (usable[i], Reason::BeyondPattern { order })));
    for i in (0..scene.at.len()).filter(|i| growth.node[*i].is_none() && !beyond.contains_key(i)) {
        match beaten.get(&i) {
            Some(&winner) => {
                reason.insert(usable[i], Reason::Duplicate { of: usable[last_winner(&beaten, winner)] });
            }
            None => loose.push(i),
        }
    }
    let mut warnings = Vec::new();
    let ghosts = ghosts(scene, growth, &loose);
    if !ghosts.is_empty() {
        warnings.push(Warning::Ghosts { points: ghosts.len() });
    }
    loose.retain(|i| !ghosts.contains_key(i));
    let second = second_lattice(scene, settled, &loose);
    if let Some((g, members)) = &second {
        warnings.push(Warning::SecondLattice { g: *g, points: members.len() });
    }
    reason.extend(ghosts.into_iter().map(|(i, r)| (usable[i], r)));
    for i in loose {
        let in_second = second.as_ref().is_some_and(|(_, members)| members.contains(&i));
        reason.insert(usable[i], if in_second { Reason::SecondLattice } else { stray(scene, growth, i) });
    }
    Explained { rejected: reason.into_iter().collect(), warnings }
}

/// The winner of a node may have been beaten in turn.
fn last_winner(beaten: &BTreeMap<usize, usize>, first: usize) -> usize {
    let mut winner = first;
    for _ in 0..beaten.len() {
        match beaten.get(&winner) {
            Some(&next) => winner = next,
            None => break,
        }
    }
    winner
}

fn stray(scene: &Scene<'_>, growth: &Growth, i: usize) -> Reason {
    let Some(near) = nearest_node(&growth.fit.warp, scene.at[i]) else { return Reason::OutOfReach };
    if growth.line {
        let place = growth.fit.warp.place(near.order[0], 0.0);
        let distance = norm(minus(scene.at[i], place)) / growth.step;
        if distance > 0.2 {
            return Reason::OffLine { distance };
        }
    }
    let offset = fraction(&near);
    if near.map_variance.sqrt() > KNOWN_WELL * growth.step { Reason::OutOfReach } else { Reason::OffLattice { offset } }
}

fn fraction(near: &Nearest) -> [f64; 2] {
    [near.order[0] - f64::from(near.node.0), near.order[1] - f64::from(near.node.1)]
}

/// Sets of loose points that share one offset from the nodes: displaced copies of the pattern.
fn ghosts(scene: &Scene<'_>, growth: &Growth, loose: &[usize]) -> BTreeMap<usize, Reason> {
    let mut found = BTreeMap::new();
    let mut open: Vec<(usize, [f64; 2])> = loose.iter().filter_map(|&i| Some((i, displacement(scene, growth, i)?))).collect();
    let brightest = scene.ln_weight.iter().zip(&growth.node).filter(|(_, n)| n.is_some()).map(|(w, _)| *w).fold(f64::MIN, f64::max);
    let room = if growth.line { 2.0 * scene.extent / growth.step } else { 1.0 };
    let mean = real(open.len()) * std::f64::consts::PI * OFFSET_RADIUS * OFFSET_RADIUS / room;
    loop {
        let members =
            |f: [f64; 2]| open.iter().filter(|(_, o)| apart(f, *o, growth.line) < OFFSET_RADIUS).map(|(i, _)| *i).collect::<Vec<usize>>();
        let best = open.iter().map(|(_, f)| (members(*f), *f)).max_by_key(|(m, _)| m.len());
        let Some((set, offset)) = best else { break };
        // Chance that so many of the loose points fall together, for any of them as the middle.
        let chance = real(open.len()) * poisson_tail(set.len().saturating_sub(1), mean);
        let faint = set.iter().all(|&i| scene.ln_weight[i] < brightest);
        if set.len() < FEWEST_COPIES || chance > 1e-2 || !faint {
            break;
        }
        let [p, mut q] = growth.fit.warp.steps(0.0, 0.0);
        if growth.line {
            q = [-p[1], p[0]];
        }
        let place = [offset[0] * p[0] + offset[1] * q[0], offset[0] * p[1] + offset[1] * q[1]];
        found.extend(set.iter().map(|&i| (i, Reason::Ghost { offset: place, copies: set.len() })));
        open.retain(|(i, _)| !set.contains(i));
    }
    found
}

/// Displacement of a point from the nearest node, in steps: along both steps, or for a line along the row and across it.
fn displacement(scene: &Scene<'_>, growth: &Growth, i: usize) -> Option<[f64; 2]> {
    let near = nearest_node(&growth.fit.warp, scene.at[i])?;
    if !growth.line {
        return Some(fraction(&near));
    }
    let from_row = minus(scene.at[i], growth.fit.warp.place(near.order[0], 0.0));
    let p = growth.fit.warp.steps(near.order[0], 0.0)[0];
    let across = (p[0] * from_row[1] - p[1] * from_row[0]) / dot(p, p).max(f64::MIN_POSITIVE);
    Some([fraction(&near)[0], across])
}

/// Distance of two displacements; whole orders make no difference, but rows of a line do not repeat.
fn apart(f: [f64; 2], g: [f64; 2], line: bool) -> f64 {
    let wrap = |x: f64| x - x.round();
    let across = f[1] - g[1];
    wrap(f[0] - g[0]).hypot(if line { across } else { wrap(across) })
}

/// P(at least n) of a Poisson distribution.
fn poisson_tail(n: usize, mean: f64) -> f64 {
    let mut term = (-mean).exp();
    let mut below = 0.0;
    for j in 0..n {
        below += term;
        term *= mean / real(j + 1);
    }
    (1.0 - below).max(0.0)
}

/// Brightest loose points among which a second lattice is looked for.
const SECOND_SEEDS: usize = 60;

/// A lattice among the loose points that owes nothing to the first one.
fn second_lattice(scene: &Scene<'_>, settled: &Candidate, loose: &[usize]) -> Option<([[f64; 2]; 2], Vec<usize>)> {
    if loose.len() < 6 {
        return None;
    }
    let bright = &loose[..loose.len().min(SECOND_SEEDS)];
    let mut best = candidates(scene, bright).into_iter().next()?;
    if bright.len() < loose.len() {
        best = over_all(scene, loose, &best)?;
    }
    let members: Vec<usize> = (0..scene.at.len()).filter(|&i| best.growth.node[i].is_some()).collect();
    let convincing = best.score.log_evidence > 2.5 * scene.options.least_evidence && members.len() >= 6;
    let shared = best.growth.line && !settled.growth.line;
    let steps = best.growth.fit.warp.steps(0.0, 0.0);
    (convincing && !shared).then_some((if best.growth.line { [steps[0], [0.0; 2]] } else { steps }, members))
}

/// Rows (a, b, m): the sublattice of orders with a h + b k divisible by m.
const SUBLATTICES: [(i32, i32, i32); 7] = [(1, 0, 2), (0, 1, 2), (1, 1, 2), (1, 0, 3), (0, 1, 3), (1, 1, 3), (1, 2, 3)];
/// A faint set is at most this bright against its strong neighbours.
const FAINT: f64 = 0.05;

/// What the set of found orders says about the numbering: how few points decide against a coarser one, and faint orders in between.
pub(super) fn numbering_warnings(scene: &Scene<'_>, growth: &Growth) -> Vec<Warning> {
    let found: Vec<((i32, i32), f64)> =
        growth.node.iter().zip(&scene.ln_weight).filter_map(|(n, w)| n.map(|n| (n, *w))).filter(|(n, _)| *n != (0, 0)).collect();
    let mut warnings = Vec::new();
    for (a, b, m) in SUBLATTICES {
        if growth.line && b != 0 {
            continue;
        }
        let coset = |n: (i32, i32)| (a * n.0 + b * n.1).rem_euclid(m);
        let most = (0..m).map(|c| found.iter().filter(|(n, _)| coset(*n) == c).count()).max().unwrap_or(0);
        let deciders = found.len() - most;
        if deciders <= 2 && found.len() >= 3 {
            warnings.push(Warning::FewDeciders { factor: m.unsigned_abs(), deciders });
        }
        let (inside, outside): (Vec<_>, Vec<_>) = found.iter().partition(|(n, _)| coset(*n) == 0);
        if let Some(ratio) = faintness(&inside, &outside).filter(|r| *r < FAINT) {
            warnings.push(Warning::FaintBetween { factor: m.unsigned_abs(), brightness_ratio: ratio });
        }
    }
    warnings
}

type Order = ((i32, i32), f64);

/// Median brightness of the orders outside a sublattice over that of their nearest neighbours in it. None below four of each.
fn faintness(inside: &[&Order], outside: &[&Order]) -> Option<f64> {
    if inside.len() < 4 || outside.len() < 4 {
        return None;
    }
    let nearest = |n: (i32, i32)| {
        let reach = |o: &&&Order| (o.0.0 - n.0).pow(2) + (o.0.1 - n.1).pow(2);
        inside.iter().min_by_key(reach).map(|o| o.1)
    };
    let ratios = outside.iter().filter_map(|o| nearest(o.0).map(|w| o.1 - w));
    Some(median(ratios).exp())
}
