//! Which lattice explains the points best: guesses grown, their relatives tried, displaced copies told from denser nets.

use super::{
    Expected,
    cell::norm,
    copies::parents_first,
    evidence::Score,
    grow::{Growth, Scene, Start, grow},
    relatives::{regrow, relative_starts},
    seed::starts,
    trim::trimmed,
    zero::{ZeroChoice, choose_zero},
};

/// A grown lattice with its scores.
#[derive(Debug, Clone)]
pub(super) struct Candidate {
    pub growth: Growth,
    pub score: Score,
    pub zero: ZeroChoice,
}

impl Candidate {
    /// What candidates compete by: evidence of the places plus that of the zero order.
    pub(super) fn total(&self) -> f64 {
        let brightest = if self.growth.node.first().is_some_and(Option::is_some) { BRIGHTEST_HELD } else { 0.0 };
        self.score.log_evidence + self.zero.score.clamp(-ZERO_SAY, ZERO_SAY) + brightest
    }
}

/// Most that the zero order may say for or against a lattice, nats. Its symmetry counts occupied nodes once more, so it must not outweigh the places.
const ZERO_SAY: f64 = 8.0;

/// Credit for holding the brightest point of the scene (points are listed brightest first): between a pattern and its fainter copy, the pattern.
const BRIGHTEST_HELD: f64 = 4.0;

/// Lattices grown in full per shape before their relatives are tried.
const FINALISTS: usize = 4;

/// Lattices compared over all points where there are more than the seed points.
const FULL_ROUND: usize = 5;

/// Evidence from which a grown lattice stands for all further starts on its own nodes and steps.
const KNOWN_LATTICE: f64 = 15.0;

/// The best lattices over the points `among`, best first, distinct.
pub(super) fn candidates(scene: &Scene<'_>, among: &[usize]) -> Vec<Candidate> {
    let bright = &among[..among.len().min(scene.options.seed_points)];
    let mut found = Vec::new();
    for line in [true, false] {
        let excluded = if line { Expected::Plane } else { Expected::Line };
        if scene.options.expected == excluded || (!line && among.len() < 4) {
            continue;
        }
        let mut grown: Vec<(f64, Growth)> = Vec::new();
        for start in starts(scene, bright, line) {
            let known = grown.iter().any(|(evidence, g)| *evidence > KNOWN_LATTICE && g.holds(&start));
            let growth = if known { None } else { grow(scene, bright, &start) };
            grown.extend(growth.and_then(|g| trimmed(scene, g, bright.len())).map(|(g, s)| (s.log_evidence, g)));
        }
        grown.sort_by(|a, b| b.0.total_cmp(&a.0));
        let mut finalists: Vec<Growth> = Vec::new();
        for (_, growth) in grown {
            if finalists.len() < FINALISTS && !finalists.iter().any(|f| same_assignment(f, &growth)) {
                finalists.push(growth);
            }
        }
        for finalist in finalists {
            found.extend(with_relatives(scene, bright, finalist));
        }
    }
    let ranked = distinct(found);
    if among.len() <= bright.len() {
        return parents_first(scene, ranked);
    }
    let mut full: Vec<Candidate> = ranked.iter().take(FULL_ROUND).filter_map(|c| over_all(scene, among, c)).collect();
    let best = full.iter().max_by(|a, b| a.total().total_cmp(&b.total())).cloned();
    full.extend(best.into_iter().flat_map(|b| coarser(scene, &b, among.len())));
    parents_first(scene, distinct(full))
}

/// The same lattice over all points.
fn over_all(scene: &Scene<'_>, among: &[usize], candidate: &Candidate) -> Option<Candidate> {
    judge(scene, regrow(scene, &candidate.growth, among, nearest_whole(candidate.zero.doubled))?, among.len())
}

/// Coarser relatives over the points that a lattice holds: had strays at its in-between nodes hidden them, they show now.
fn coarser(scene: &Scene<'_>, candidate: &Candidate, total: usize) -> Vec<Candidate> {
    let growth = &candidate.growth;
    let held: Vec<usize> = (0..growth.node.len()).filter(|&i| growth.node[i].is_some()).collect();
    relative_starts(&growth.fit.warp, nearest_whole(candidate.zero.doubled), growth.line, scene.slack)
        .iter()
        .filter_map(|s| grow(scene, &held, s))
        .filter_map(|g| judge(scene, g, total))
        .collect()
}

/// Best first, each lattice once.
fn distinct(mut found: Vec<Candidate>) -> Vec<Candidate> {
    found.sort_by(|a, b| b.total().total_cmp(&a.total()));
    let mut distinct: Vec<Candidate> = Vec::new();
    for candidate in found {
        if distinct.len() < 12 && !distinct.iter().any(|d| same_assignment(&d.growth, &candidate.growth)) {
            distinct.push(candidate);
        }
    }
    distinct
}

/// A lattice and its relatives of index 2 and 3, climbing while a relative is better.
fn with_relatives(scene: &Scene<'_>, among: &[usize], growth: Growth) -> Vec<Candidate> {
    let Some(mut best) = judge(scene, growth, among.len()) else { return Vec::new() };
    let mut seen = vec![best.clone()];
    for _ in 0..3 {
        let node = nearest_whole(best.zero.doubled);
        let sd = scene.slack;
        let relatives: Vec<Candidate> = relative_starts(&best.growth.fit.warp, node, best.growth.line, sd)
            .iter()
            .filter_map(|s: &Start| grow(scene, among, s))
            .filter_map(|g| judge(scene, g, among.len()))
            .collect();
        let better = relatives.iter().filter(|r| r.total() > best.total()).max_by(|a, b| a.total().total_cmp(&b.total())).cloned();
        seen.extend(relatives);
        match better {
            Some(next) => best = next,
            None => break,
        }
    }
    seen
}

fn judge(scene: &Scene<'_>, growth: Growth, total: usize) -> Option<Candidate> {
    let (growth, score) = trimmed(scene, growth, total)?;
    let zero = choose_zero(scene, &growth)?;
    Some(Candidate { growth, score, zero })
}

/// Same cell size, same points.
fn same_assignment(a: &Growth, b: &Growth) -> bool {
    let seen = |n: &Growth| n.node.iter().map(Option::is_some).collect::<Vec<bool>>();
    a.line == b.line && (cell_size(a) / cell_size(b)).ln().abs() < 0.1 && seen(a) == seen(b)
}

/// The whole node at or just below a doubled one.
pub(super) fn nearest_whole(doubled: (i32, i32)) -> (i32, i32) {
    (doubled.0.div_euclid(2), doubled.1.div_euclid(2))
}

/// Area of the cell; for a line the step.
pub(super) fn cell_size(growth: &Growth) -> f64 {
    let [p, q] = growth.fit.warp.steps(0.0, 0.0);
    if growth.line { norm(p) } else { (p[0] * q[1] - p[1] * q[0]).abs() }
}
