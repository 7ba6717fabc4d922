//! Which node is the zero order: brightness, the point symmetry of the pattern about it, and what was known beforehand.
//!
//! The zero order is a hypothesis like the lattice. Each node near the middle is scored in nats: it is usually the
//! brightest; orders (h,k) and (-h,-k) of a thin sample are about equally bright; where one is seen the other should be.
//! A node without a point can win (hole, beam stop, out of the frame).

use std::collections::BTreeMap;

use super::{
    cell::{minus, norm},
    evidence::{middle_of_brightness, order_box},
    grow::{Growth, Scene},
    seed::median,
};

/// The chosen zero order in the numbering of the growth, doubled (so that half nodes can be said).
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct ZeroChoice {
    /// Twice the node: odd numbers mean that the middle of symmetry lies between nodes.
    pub doubled: (i32, i32),
    /// Its score, nats.
    pub score: f64,
    /// Lead over the next best whole node, nats.
    pub lead: f64,
    /// The next best node (not doubled).
    pub second: Option<(i32, i32)>,
}

/// Brightest orders used for the symmetry.
const ORDERS: usize = 150;
/// Nodes tried.
const CANDIDATES: usize = 60;
/// Spread of ln(brightness) between an order and its opposite.
const PAIR_SPREAD: f64 = 0.45;
/// Cost of a zero order that should be visible and is not.
const UNSEEN: f64 = 4.0;
/// Cost of a zero order that is just as bright as the brightest other order; usually it is several times brighter.
const NOT_BRIGHTER: f64 = 2.0;
/// Cost of lying one rms extent of the pattern away from the middle of brightness, and its bound.
const OFF_MIDDLE: f64 = 1.0;
const FARTHEST: f64 = 6.0;
/// Further cost of a middle between the nodes: the numbering must be doubled for it.
const BETWEEN: f64 = 4.0;
/// Brightness and symmetry of neighbouring orders are not independent: their joint evidence is tempered.
const TEMPER: f64 = 0.7;

/// Chooses the zero order. None where no point has a node.
pub(super) fn choose_zero(scene: &Scene<'_>, growth: &Growth) -> Option<ZeroChoice> {
    let field = Field::new(scene, growth)?;
    let mut scored: Vec<((i32, i32), f64)> =
        field.candidates(scene, growth).into_iter().map(|c| (c, field.score(scene, growth, c))).collect();
    scored.sort_by(|a, b| b.1.total_cmp(&a.1).then(a.0.cmp(&b.0)));
    let (doubled, score) = *scored.first()?;
    let rival = scored.iter().skip(1).find(|(c, _)| c.0 % 2 == 0 && c.1 % 2 == 0);
    Some(ZeroChoice {
        doubled,
        score,
        lead: rival.map_or(100.0, |r| (score - r.1).min(100.0)),
        second: rival.map(|r| (r.0.0 / 2, r.0.1 / 2)),
    })
}

struct Field {
    point: BTreeMap<(i32, i32), usize>,
    strong: Vec<((i32, i32), f64)>,
    faint_limit: f64,
    spread: f64,
    brightest: [f64; 2],
    fill: f64,
    line: bool,
    middle: [f64; 2],
    extent: f64,
}

impl Field {
    fn new(scene: &Scene<'_>, growth: &Growth) -> Option<Self> {
        let point: BTreeMap<(i32, i32), usize> = growth.node.iter().enumerate().filter_map(|(i, n)| n.map(|n| (n, i))).collect();
        let mut strong: Vec<((i32, i32), f64)> = point.iter().map(|(n, &i)| (*n, scene.ln_weight[i])).collect();
        strong.sort_by(|a, b| b.1.total_cmp(&a.1).then(a.0.cmp(&b.0)));
        let brightest = [strong.first()?.1, strong.get(1)?.1];
        let faint_limit = strong[strong.len() - 1 - strong.len() / 10].1;
        strong.truncate(ORDERS);
        let middle = median(strong.iter().map(|s| s.1));
        let spread = (1.4826 * median(strong.iter().map(|s| (s.1 - middle).abs()))).max(PAIR_SPREAD);
        let nodes = super::evidence::nodes_in_region(scene, growth, 1_000_000)?.len();
        let fill = (super::evidence::real(point.len()) / super::evidence::real(nodes.max(1))).clamp(0.05, 0.95);
        let middle_at = middle_of_brightness(scene, growth);
        let squares = point.values().map(|&i| norm(minus(scene.at[i], middle_at)).powi(2)).sum::<f64>();
        let extent = (squares / super::evidence::real(point.len())).sqrt().max(1e-12);
        Some(Self { middle: middle_at, extent, point, strong, faint_limit, spread, brightest, fill, line: growth.line })
    }

    /// Brightest nodes, nodes nearest to the middle, half nodes nearest to the middle; all doubled.
    fn candidates(&self, scene: &Scene<'_>, growth: &Growth) -> Vec<(i32, i32)> {
        let mut found: Vec<(i32, i32)> = self.strong.iter().take(20).map(|(n, _)| (2 * n.0, 2 * n.1)).collect();
        let middle = scene.options.zero_hint.map_or_else(|| middle_of_brightness(scene, growth), |h| h.at);
        let Some([h0, h1, k0, k1]) = order_box(&self.point.keys().copied().collect()) else { return found };
        let place = |(h, k): (i32, i32)| growth.fit.warp.place(0.5 * f64::from(h), 0.5 * f64::from(k));
        let Some(order) = growth.fit.warp.order_at(middle) else { return found };
        let around = |x: f64| super::grow::whole(2.0 * x).unwrap_or(0);
        let (ch, ck) = (around(order[0]), if self.line { 0 } else { around(order[1]) });
        let mut near = Vec::new();
        for h in (ch - 9).max(2 * h0 - 2)..=(ch + 9).min(2 * h1 + 2) {
            for k in (ck - 9).max(2 * k0 - 2)..=(ck + 9).min(2 * k1 + 2) {
                if !self.line || k == 0 {
                    near.push((h, k));
                }
            }
        }
        near.sort_by(|a, b| norm(minus(place(*a), middle)).total_cmp(&norm(minus(place(*b), middle))).then(a.cmp(b)));
        found.extend(near.into_iter().take(CANDIDATES));
        found.sort_unstable();
        found.dedup();
        found
    }

    fn score(&self, scene: &Scene<'_>, growth: &Growth, doubled: (i32, i32)) -> f64 {
        let place = growth.fit.warp.place(0.5 * f64::from(doubled.0), 0.5 * f64::from(doubled.1));
        let whole = doubled.0 % 2 == 0 && doubled.1 % 2 == 0;
        let seen = if whole { self.point.get(&(doubled.0 / 2, doubled.1 / 2)).copied() } else { None };
        let brightness = match seen {
            Some(i) => {
                let rest = if scene.ln_weight[i] >= self.brightest[0] { self.brightest[1] } else { self.brightest[0] };
                (2.0 * (scene.ln_weight[i] - rest) - NOT_BRIGHTER).clamp(-UNSEEN, 8.0) + scene.zero_log_odds[i]
            }
            None if (scene.visible)(place) => -UNSEEN,
            None => -0.5 * UNSEEN,
        };
        let between = if whole { 0.0 } else { -BETWEEN };
        let hint = scene.options.zero_hint.map_or(0.0, |h| (-0.5 * (norm(minus(place, h.at)) / h.u.max(1e-12)).powi(2)).max(-30.0));
        let off_middle = (OFF_MIDDLE * (norm(minus(place, self.middle)) / self.extent).powi(2)).min(FARTHEST);
        brightness + between + hint - off_middle + TEMPER * self.symmetry(scene, growth, doubled)
    }

    /// Log likelihood ratio of the pairs about a middle, symmetric against unrelated.
    fn symmetry(&self, scene: &Scene<'_>, growth: &Growth, doubled: (i32, i32)) -> f64 {
        let mut total = 0.0;
        for &(node, ln_weight) in &self.strong {
            let partner = (doubled.0 - node.0, doubled.1 - node.1);
            if partner == node {
                continue;
            }
            total += match self.point.get(&partner) {
                Some(&j) => 0.5 * (self.pair(ln_weight - scene.ln_weight[j]) - self.fill.ln()),
                None if (scene.visible)(growth.fit.warp.place(f64::from(partner.0), f64::from(partner.1))) => {
                    // The brighter the one that is seen, the less its partner can have been missed.
                    -((ln_weight - self.faint_limit) / PAIR_SPREAD).clamp(0.0, 3.0)
                }
                None => 0.0,
            };
        }
        total
    }

    fn pair(&self, difference: f64) -> f64 {
        let unrelated = std::f64::consts::SQRT_2 * self.spread;
        let log_normal = |sd: f64| -0.5 * (difference / sd).powi(2) - sd.ln();
        (log_normal(PAIR_SPREAD) - log_normal(unrelated)).max(-4.0)
    }
}
