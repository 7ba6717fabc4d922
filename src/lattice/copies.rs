//! Displaced copies of a pattern (ghosts) told from a denser net, by point symmetry about the zero order.
//!
//! A ghost repeats the whole pattern beside itself. Where the displacement is near a simple fraction of the cell, one denser net holds
//! both, and its evidence is good. But true orders come in pairs (h,k), (-h,-k) of like brightness about the zero
//! order; a copy is symmetric about its own middle and not about the true one. The same holds for a row with a few strays that pass for a plane.

use super::{
    contest::{Candidate, cell_size},
    evidence::real,
    grow::{Scene, nearest_node},
    seed::median,
};

/// Brightness ratio (nats) beyond which two opposite orders are no pair.
const NO_PAIR: f64 = 1.5;
/// Least share of the coarser lattice's points that the denser one must hold as well.
const SHARED: f64 = 0.8;
/// Least evidence of the coarser lattice as a share of the denser one's.
const OWN_EVIDENCE: f64 = 0.25;
/// Least ratio of cell sizes.
const COARSER: f64 = 1.3;
/// Factor two in brightness, nats.
const FAINTER: f64 = std::f64::consts::LN_2;
/// Two copies were dimmed by the same factor if their ratios agree this well (nats).
const SAME_FACTOR: f64 = 0.6;
/// How far above the faintest orders a point must be before its missing partner counts (nats).
const ABOVE_FAINTEST: f64 = 0.7;

/// Moves a lattice to the front if what the first one explains beyond it is a set of copies or strays.
pub(super) fn parents_first(scene: &Scene<'_>, mut ranked: Vec<Candidate>) -> Vec<Candidate> {
    for _ in 0..ranked.len() {
        let Some((first, others)) = ranked.split_first() else { break };
        let Some(parent) = others.iter().position(|c| extra_points_are_copies(scene, first, c)) else { break };
        let chosen = ranked.remove(parent + 1);
        ranked.insert(0, chosen);
    }
    ranked
}

fn extra_points_are_copies(scene: &Scene<'_>, dense: &Candidate, parent: &Candidate) -> bool {
    let coarser = parent.growth.line && !dense.growth.line
        || parent.growth.line == dense.growth.line && cell_size(&parent.growth) > COARSER * cell_size(&dense.growth);
    let (holds, keeps) = (&dense.growth.node, &parent.growth.node);
    let shared = (0..holds.len()).filter(|&i| holds[i].is_some() && keeps[i].is_some()).count();
    let extra: Vec<usize> = (0..holds.len()).filter(|&i| holds[i].is_some() && keeps[i].is_none()).collect();
    let kept: Vec<usize> = (0..holds.len()).filter(|&i| keeps[i].is_some()).collect();
    let parent_stands = parent.score.explained >= 3
        && real(shared) >= SHARED * real(parent.score.explained)
        && parent.score.log_evidence > scene.options.least_evidence.max(OWN_EVIDENCE * dense.score.log_evidence);
    if !coarser || extra.is_empty() || !parent_stands || !fainter(scene, &extra, &kept) {
        return false;
    }
    let lonely = |middle: Option<(i32, i32)>| {
        let Some((paired, lone)) = middle.map(|m| pairs(scene, dense, m, &extra)) else { return false };
        lone > 2 * paired && 2 * lone >= extra.len()
    };
    let zero_of = |c: &Candidate| c.growth.fit.warp.place(0.5 * f64::from(c.zero.doubled.0), 0.5 * f64::from(c.zero.doubled.1));
    let node_at = |place: [f64; 2]| nearest_node(&dense.growth.fit.warp, place).map(|n| n.node);
    let (of_parent, of_dense) = (node_at(zero_of(parent)), node_at(zero_of(dense)));
    // Where the parent's zero order outshines all others it is beyond doubt; else the denser net may be right about its own.
    let shining = outshines(scene, parent, &kept);
    lonely(of_parent) && (shining || lonely(of_dense)) || shining && of_parent.is_some_and(|zero| repeats(scene, dense, zero, &extra))
}

/// The extra points repeat the pattern displaced by one offset: each is fainter than its parent by the same factor, the zero order's copy included.
fn repeats(scene: &Scene<'_>, dense: &Candidate, zero: (i32, i32), extra: &[usize]) -> bool {
    let brightest = extra.iter().max_by(|&&i, &&j| scene.ln_weight[i].total_cmp(&scene.ln_weight[j]));
    let Some(copy_of_zero) = brightest.and_then(|&i| dense.growth.node[i]) else { return false };
    let offset = (copy_of_zero.0 - zero.0, copy_of_zero.1 - zero.1);
    let by_node: std::collections::BTreeMap<(i32, i32), usize> =
        dense.growth.node.iter().enumerate().filter_map(|(i, n)| n.map(|n| (n, i))).collect();
    let parent = |n: (i32, i32)| by_node.get(&(n.0 - offset.0, n.1 - offset.1)).copied();
    let factor = |i: usize| Some(scene.ln_weight[i] - scene.ln_weight[parent(dense.growth.node[i]?)?]);
    let factors: Vec<f64> = extra.iter().filter_map(|&i| factor(i)).collect();
    let typical = median(factors.iter().copied());
    let like = |f: f64| (f - typical).abs() < SAME_FACTOR;
    let of_zero = by_node.get(&copy_of_zero).and_then(|&i| factor(i));
    let alike = factors.iter().filter(|f| like(**f)).count();
    extra.len() >= 3 && typical < -FAINTER && of_zero.is_some_and(like) && 5 * alike >= 4 * extra.len()
}

/// The extra points as a set are fainter than the parent's: their brightest, and their third brightest (a copy of the zero order may be bright).
fn fainter(scene: &Scene<'_>, extra: &[usize], kept: &[usize]) -> bool {
    let (e, k) = (descending(scene, extra), descending(scene, kept));
    let at = |v: &[f64], n: usize| v.get(n.min(v.len().saturating_sub(1))).copied().unwrap_or(f64::MIN);
    at(&e, 0) < at(&k, 0) && at(&e, 2) < at(&k, 2) - FAINTER
}

/// The point at the zero order is brighter than every other by a factor of two.
fn outshines(scene: &Scene<'_>, candidate: &Candidate, kept: &[usize]) -> bool {
    let (h, k) = candidate.zero.doubled;
    let Some(&zero) = kept.iter().find(|&&i| candidate.growth.node[i].is_some_and(|n| (2 * n.0, 2 * n.1) == (h, k))) else { return false };
    descending(scene, kept).get(1).is_none_or(|second| scene.ln_weight[zero] > second + FAINTER)
}

fn descending(scene: &Scene<'_>, points: &[usize]) -> Vec<f64> {
    let mut weights: Vec<f64> = points.iter().map(|&i| scene.ln_weight[i]).collect();
    weights.sort_by(|a, b| b.total_cmp(a));
    weights
}

/// Of the extra points: how many have an equal partner opposite the middle, and how many should have and have not.
fn pairs(scene: &Scene<'_>, dense: &Candidate, middle: (i32, i32), extra: &[usize]) -> (usize, usize) {
    let warp = &dense.growth.fit.warp;
    let explained = || dense.growth.node.iter().enumerate().filter_map(|(i, n)| n.map(|n| (n, i)));
    let faintest = median(explained().map(|(_, i)| scene.ln_weight[i])).min(median(extra.iter().map(|&i| scene.ln_weight[i])));
    let by_node: std::collections::BTreeMap<(i32, i32), usize> = explained().collect();
    let (mut paired, mut lone) = (0, 0);
    for &i in extra {
        let Some((h, k)) = dense.growth.node[i] else { continue };
        let partner = (2 * middle.0 - h, 2 * middle.1 - k);
        match by_node.get(&partner) {
            Some(&j) if (scene.ln_weight[i] - scene.ln_weight[j]).abs() < NO_PAIR => paired += 1,
            Some(_) => lone += 1,
            None => {
                let visible = (scene.visible)(warp.place(f64::from(partner.0), f64::from(partner.1)));
                lone += usize::from(visible && scene.ln_weight[i] > faintest - ABOVE_FAINTEST);
            }
        }
    }
    (paired, lone)
}
