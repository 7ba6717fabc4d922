//! The whole of indexing on one page: guess, grow, compare, find the zero order, explain the rest.

use super::{
    Evidence, Expected, IndexOptions, Indexed, LatticeError, Point, RunnerUp, Shape, Warning,
    cell::norm,
    contest::{Candidate, candidates, cell_size, nearest_whole, with_zero},
    evidence::{Score, row_evidence},
    grow::{Growth, Scene, Start, grow},
    rejected::explain_rejected,
    relatives::regrow,
    seed::median,
    trim::trimmed,
    zero::choose_zero,
};

/// Gives points of a plane their lattice and each its order (h, k).
///
/// `points` should lie where the lattice is regular up to the roughness of the geometry: direction cosines along the
/// sample. Their order does not matter, their common unit only sets the meaning of `options.bend`. `visible` says
/// whether a place lies inside the photo; it must hold for the unit circle too (no orders beyond it).
///
/// A lattice is a hypothesis that competes with chance: its log evidence (see `evidence.rs`) integrates over the smooth map
/// from order to place, counts empty nodes against it, and must exceed `options.least_evidence`. Line or plane, dense or
/// coarse and the place of the zero order are decided by the same sum.
///
/// # Errors
/// [`LatticeError::TooFewSpots`] below 3 usable points (4 where a plane is demanded), [`LatticeError::NoLattice`] if chance does as well.
pub fn index(points: &[Point], options: &IndexOptions, visible: &dyn Fn([f64; 2]) -> bool) -> Result<Indexed, LatticeError> {
    let usable = usable_in_canonical_order(points);
    let needed = if options.expected == Expected::Plane { 4 } else { 3 };
    if usable.len() < needed {
        return Err(LatticeError::TooFewSpots { found: usable.len(), needed });
    }
    let scene = scene(points, &usable, options, visible);
    let all: Vec<usize> = (0..usable.len()).collect();
    let ranked = candidates(&scene, &all);
    let none = |evidence: f64, explained: usize| LatticeError::NoLattice {
        spots: usable.len(),
        explained,
        evidence,
        needed: options.least_evidence,
    };
    let best = ranked.first().ok_or_else(|| none(0.0, 0))?;
    let settled = settle(&scene, best, &all).ok_or_else(|| none(best.score.log_evidence, best.score.explained))?;
    if let Some(weakest) = shortfall(&scene, &settled) {
        return Err(none(weakest, settled.score.explained));
    }
    Ok(report(points, &usable, &scene, &settled, &ranked))
}

/// Numbers the winner from its zero order over all points, on the reduced basis there.
fn settle(scene: &Scene<'_>, best: &Candidate, all: &[usize]) -> Option<Candidate> {
    let mut growth = regrow(scene, &best.growth, all, nearest_whole(best.zero.doubled))?;
    let mut zero = choose_zero(scene, &growth)?;
    // The middle of symmetry lies between the nodes: the visible orders are the odd ones of a net twice as dense.
    if zero.doubled.0 % 2 != 0 || zero.doubled.1 % 2 != 0 {
        let dense = halved(&growth, zero.doubled, scene).and_then(|start| grow(scene, all, &start));
        growth = dense.unwrap_or(growth);
        zero = choose_zero(scene, &growth)?;
    }
    for _ in 0..3 {
        let node = nearest_whole(zero.doubled);
        if node == (0, 0) {
            break;
        }
        growth = regrow(scene, &growth, all, node)?;
        zero = choose_zero(scene, &growth)?;
    }
    let (growth, score) = trimmed(scene, growth, all.len())?;
    with_zero(scene, growth, score)
}

fn halved(growth: &Growth, doubled: (i32, i32), scene: &Scene<'_>) -> Option<Start> {
    let (h, k) = (0.5 * f64::from(doubled.0), 0.5 * f64::from(doubled.1));
    let (origin, g) = (growth.fit.warp.place(h, k), growth.fit.warp.steps(h, k));
    let half = |v: [f64; 2]| [0.5 * v[0], 0.5 * v[1]];
    let steps = match (doubled.0 % 2 != 0, doubled.1 % 2 != 0) {
        (true, true) => [[0.5 * (g[0][0] + g[1][0]), 0.5 * (g[0][1] + g[1][1])], g[1]],
        (true, false) => [half(g[0]), g[1]],
        _ => [g[0], half(g[1])],
    };
    let sd = scene.slack;
    if growth.line { Some(Start { origin, steps, sd, line: true }) } else { super::relatives::reduced_start(origin, steps, sd) }
}

/// Most that brightness and symmetry about the zero order may add where the places alone fall short of the evidence asked for, nats.
const BRIGHTNESS_SAY: f64 = 6.0;

/// The evidence that falls short of what is asked for, if any does.
fn shortfall(scene: &Scene<'_>, settled: &Candidate) -> Option<f64> {
    let needed = scene.options.least_evidence;
    let least_points = if settled.growth.line { 3 } else { 4 };
    let evidence = settled.score.log_evidence + settled.zero.score.clamp(0.0, BRIGHTNESS_SAY);
    if settled.score.explained < least_points || evidence < needed {
        return Some(evidence);
    }
    if settled.growth.line {
        let row = row_evidence(scene, &settled.growth).unwrap_or(f64::MIN_POSITIVE);
        let asked = (0.35 * needed).min(0.8 * (super::evidence::real(settled.score.explained) - 2.0));
        return (row < asked).then_some(row);
    }
    None
}

fn report(points: &[Point], usable: &[usize], scene: &Scene<'_>, settled: &Candidate, ranked: &[Candidate]) -> Indexed {
    let growth = &settled.growth;
    let warp = &growth.fit.warp;
    let flip = if warp.steps(0.0, 0.0)[0][0] < 0.0 { -1 } else { 1 };
    let mut order = vec![None; points.len()];
    for (i, node) in growth.node.iter().enumerate() {
        order[usable[i]] = node.map(|(h, k)| (flip * h, flip * k));
    }
    let steps = warp.steps(0.0, 0.0).map(|v| [f64::from(flip) * v[0], f64::from(flip) * v[1]]);
    let g = if growth.line { [steps[0], [0.0; 2]] } else { steps };
    let runner_up = runner_up(settled, ranked);
    let explained = explain_rejected(points, usable, scene, settled);
    let mut warnings = super::rejected::numbering_warnings(scene, growth);
    warnings.extend(zero_warnings(settled, flip));
    if growth.node.first().is_some_and(Option::is_none) {
        warnings.push(Warning::BrightestUnexplained { point: usable[0] });
    }
    warnings.extend(explained.warnings);
    if let Some(rival) = &runner_up {
        warnings.extend(rival_warning(settled, rival));
    }
    Indexed {
        shape: if growth.line { Shape::Line } else { Shape::Plane },
        zero: warp.place(0.0, 0.0),
        zero_seen: order.iter().position(|o| *o == Some((0, 0))),
        g,
        order,
        rejected: explained.rejected,
        evidence: evidence(scene, settled, runner_up),
        warnings,
    }
}

fn evidence(scene: &Scene<'_>, settled: &Candidate, runner_up: Option<RunnerUp>) -> Evidence {
    let Score { explained, nodes, log_evidence } = settled.score;
    let miss = settled.growth.node.iter().enumerate().filter_map(|(i, node)| {
        let (h, k) = (*node)?;
        let place = settled.growth.fit.warp.place(f64::from(h), f64::from(k));
        Some(norm([scene.at[i][0] - place[0], scene.at[i][1] - place[1]]))
    });
    // Median of a Rayleigh distribution is 1.1774 sd per axis.
    let rms_orders = median(miss) / 1.1774 / settled.growth.step;
    Evidence {
        explained,
        predicted_visible: nodes,
        missing: nodes.saturating_sub(explained),
        fill: super::evidence::real(explained) / super::evidence::real(nodes.max(1)),
        log_evidence,
        rms_orders,
        zero_score: settled.zero.score,
        zero_lead: settled.zero.lead,
        runner_up,
    }
}

fn zero_warnings(settled: &Candidate, flip: i32) -> Vec<Warning> {
    let mut warnings = Vec::new();
    if !settled.growth.node.contains(&Some((0, 0))) {
        warnings.push(Warning::ZeroUnseen);
    }
    if let Some((h, k)) = settled.zero.second.filter(|_| settled.zero.lead < 3.0) {
        warnings.push(Warning::ZeroUncertain { lead: settled.zero.lead, other: (flip * h, flip * k) });
    }
    if settled.score.explained < if settled.growth.line { 4 } else { 6 } {
        warnings.push(Warning::FewPoints { explained: settled.score.explained });
    }
    warnings
}

/// The best candidate that is another lattice than the chosen one.
fn runner_up(settled: &Candidate, ranked: &[Candidate]) -> Option<RunnerUp> {
    let mine = cell_size(&settled.growth);
    let differs = |c: &&Candidate| c.growth.line != settled.growth.line || (cell_size(&c.growth) / mine).ln().abs() > 0.2;
    // A denser net that lost because it holds displaced copies of the pattern is no rival.
    let best = ranked.first()?.total();
    let rival = ranked.iter().filter(|c| c.total() <= best).find(differs)?;
    let line = rival.growth.line;
    let steps = rival.growth.fit.warp.steps(0.0, 0.0);
    Some(RunnerUp {
        shape: if line { Shape::Line } else { Shape::Plane },
        g: if line { [steps[0], [0.0; 2]] } else { steps },
        cell_ratio: cell_size(&rival.growth) / mine,
        explained: rival.score.explained,
        // Compared on the seed points, where all candidates were judged.
        log_evidence: settled.score.log_evidence + rival.total() - best,
    })
}

fn rival_warning(settled: &Candidate, rival: &RunnerUp) -> Option<Warning> {
    let lead = settled.score.log_evidence - rival.log_evidence;
    let same_shape = (rival.shape == Shape::Line) == settled.growth.line;
    match (lead < 5.0, same_shape) {
        (true, true) => Some(Warning::ThinNumbering { lead, cell_ratio: rival.cell_ratio }),
        (true, false) => Some(Warning::ShapeUncertain { lead }),
        _ => None,
    }
}

/// Numbers of the usable points, brightest first, ties by place: the order in which the caller lists them must not matter.
fn usable_in_canonical_order(points: &[Point]) -> Vec<usize> {
    let good = |p: &Point| p.at.iter().all(|x| x.abs() < 1e6) && p.u.is_finite() && p.u >= 0.0 && p.weight.is_finite() && p.weight > 0.0;
    let mut usable: Vec<usize> = (0..points.len()).filter(|&i| good(&points[i]) && !points[i].zero_log_odds.is_nan()).collect();
    usable.sort_by(|&i, &j| {
        let (p, q) = (&points[i], &points[j]);
        q.weight.total_cmp(&p.weight).then(p.at[0].total_cmp(&q.at[0])).then(p.at[1].total_cmp(&q.at[1]))
    });
    usable
}

fn scene<'a>(points: &[Point], usable: &[usize], options: &'a IndexOptions, visible: &'a dyn Fn([f64; 2]) -> bool) -> Scene<'a> {
    let pick = |f: fn(&Point) -> f64| usable.iter().map(|&i| f(&points[i])).collect::<Vec<f64>>();
    let at: Vec<[f64; 2]> = usable.iter().map(|&i| points[i].at).collect();
    let centre = [median(at.iter().map(|p| p[0])), median(at.iter().map(|p| p[1]))];
    let mut distance: Vec<f64> = at.iter().map(|p| norm([p[0] - centre[0], p[1] - centre[1]])).collect();
    distance.sort_by(f64::total_cmp);
    let extent = distance.last().copied().unwrap_or(0.0).max(1e-12);
    // Nine tenths of the points set the area, so that one stray far out does not make the middle look crowded.
    let most = distance.get((9 * distance.len()).div_ceil(10).saturating_sub(1)).copied().unwrap_or(extent).max(1e-3 * extent);
    let area = std::f64::consts::PI * most * most / 0.9;
    Scene {
        slack: options.node_slack * typical_spacing(&at),
        u: pick(|p| p.u),
        ln_weight: pick(|p| p.weight.ln()),
        zero_log_odds: pick(|p| p.zero_log_odds.clamp(-20.0, 20.0)),
        at,
        centre,
        extent,
        area,
        options,
        visible,
    }
}

/// Bright points from which the typical spacing is taken.
const SPACING_POINTS: usize = 60;

/// Median distance of the brightest points from their nearest neighbour among themselves.
fn typical_spacing(at: &[[f64; 2]]) -> f64 {
    let head = &at[..at.len().min(SPACING_POINTS)];
    let nearest = |(i, p): (usize, &[f64; 2])| {
        head.iter().enumerate().filter(|(j, _)| *j != i).map(|(_, q)| norm([p[0] - q[0], p[1] - q[1]])).fold(f64::MAX, f64::min)
    };
    median(head.iter().enumerate().map(nearest))
}
