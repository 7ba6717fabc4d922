//! The zero order is a hypothesis: where the fit strains what the operator knows of screen and sample, other spots are tried in its place.
//!
//! At wide angles a wrong zero order shows as tilt or incidence far from what was stated; at narrow angles every choice fits, the pitch hardly
//! depends on it, and brightness decides as before.

use super::{
    assemble::assemble,
    cameras::Cameras,
    look::Seen,
    orders::{Ordered, light_of},
};
use crate::{
    bench::Bench,
    fit::{Fit, FitError, Joint, Outliers, Source, solve},
    frames::PixelPoint,
    quantity::Quantity,
};

/// Priors of the geometry strained beyond this chi-square (6 values, 1 in 1000 by chance) make us look for another zero order.
const STRAIN: f64 = 22.0;
/// Spots that scatter more than their own uncertainties by this factor make us look as well: a wrong zero order bends the rows.
const SCATTER: f64 = 2.5;
/// How many of the brightest spots are tried, and how many must lead before the choice is changed, nats.
const CANDIDATES: usize = 8;
const LEAD: f64 = 4.0;

/// The fit with the zero order that explains photo, brightness and bench best.
pub(super) fn best_zero_order(
    seen: &Seen,
    bench: &Bench,
    cameras: &Cameras,
    ordered: Vec<Ordered>,
    wavelengths_m: &[Quantity],
    fit: Fit,
) -> Result<(Vec<Ordered>, Fit), FitError> {
    let regular = fit.joint.spot_scale < SCATTER;
    if strain(&fit) < STRAIN && regular {
        return Ok((ordered, fit));
    }
    let mut best = (score(seen, &fit, (0, 0)) - LEAD, ordered.clone(), fit.clone());
    for order in candidates(seen, &fit) {
        let Some(moved) = moved_zero(&ordered, &fit, order) else { continue };
        let joint = assemble(seen, bench, cameras, &moved, wavelengths_m);
        let Ok(tried) = solve(joint, Outliers::Rejected) else { continue };
        let found = score(seen, &tried, (0, 0));
        if found < best.0 {
            best = (found, moved, tried);
        }
    }
    Ok((best.1, best.2))
}

/// Chi-square of what is known of throw, tilt, incidence and the print's turn.
fn strain(fit: &Fit) -> f64 {
    let rows = fit.joint.row_sources();
    let geometry = |source: &Source| {
        matches!(source, Source::Throw | Source::ScreenTilt | Source::Incidence { .. } | Source::TargetTurn | Source::Calibration)
    };
    rows.iter().zip(fit.residuals.iter()).filter(|(source, _)| geometry(source)).map(|(_, residual)| residual * residual).sum()
}

/// Half the chi-square of everything, plus what is lost when the zero order is not the brightest spot (nats); smaller is better.
fn score(seen: &Seen, fit: &Fit, zero: (i32, i32)) -> f64 {
    // Without Birge's factor: it would reward a bad fit.
    let sources = fit.joint.row_sources();
    let scale = |source: &Source| match source {
        Source::Spots => fit.joint.spot_scale.powi(2),
        Source::Dots | Source::Ruling | Source::SheetEdges | Source::Marks | Source::Scale => fit.joint.print_scale.powi(2),
        _ => 1.0,
    };
    let chi2: f64 = sources.iter().zip(fit.residuals.iter()).map(|(source, r)| r * r * scale(source)).sum();
    let rejected = fit.joint.spots.iter().filter(|spot| spot.weight < 0.5).count();
    #[expect(clippy::cast_precision_loss, reason = "a photo has thousands of spots, not 2^53")]
    let rejected = 9.0 * rejected as f64;
    chi2 / 2.0 + rejected + dimness(seen, &fit.joint, zero)
}

fn dimness(seen: &Seen, joint: &Joint, zero: (i32, i32)) -> f64 {
    let spots = &seen.patterns[0].spots.spots;
    let brightest = spots.iter().map(light_of).fold(0.0, f64::max);
    let light = joint.spots.iter().find(|spot| spot.photo == 0 && spot.order == zero).map(|spot| light_of(&spots[spot.spot]));
    // An unseen zero order (hole, beam stop) is unusual, not impossible.
    light.map_or(3.0, |light| (brightest / light.max(1e-12)).ln().clamp(0.0, 3.0))
}

/// Orders of the brightest spots of the first photo, and the neighbours of the present zero order.
fn candidates(seen: &Seen, fit: &Fit) -> Vec<(i32, i32)> {
    let spots = &seen.patterns[0].spots.spots;
    let mut bright: Vec<_> = fit.joint.spots.iter().filter(|spot| spot.photo == 0).collect();
    bright.sort_by(|a, b| light_of(&spots[b.spot]).total_cmp(&light_of(&spots[a.spot])));
    let mut orders: Vec<(i32, i32)> = bright.iter().take(CANDIDATES).map(|spot| spot.order).collect();
    orders.extend((-1..=1).flat_map(|h| (-1..=1).map(move |k| (h, k))));
    let centroid = fit
        .joint
        .spots
        .iter()
        .filter(|spot| spot.photo == 0)
        .fold((0.0, 0.0, 0.0), |(n, h, k), spot| (n + 1.0, h + f64::from(spot.order.0), k + f64::from(spot.order.1)));
    if centroid.0 > 0.0 {
        #[expect(clippy::cast_possible_truncation, reason = "a mean of orders lies between them")]
        orders.push(((centroid.1 / centroid.0).round() as i32, (centroid.2 / centroid.0).round() as i32));
    }
    orders.retain(|&order| order != (0, 0));
    orders.sort_unstable();
    orders.dedup();
    orders
}

/// All photos renumbered so that the place of `order` in the first photo becomes the zero order.
fn moved_zero(ordered: &[Ordered], fit: &Fit, order: (i32, i32)) -> Option<Vec<Ordered>> {
    let values = fit.joint.values();
    let [x_px, y_px] = (*fit.joint.predict(&values, 0, &[order]).first()?)?;
    let place = PixelPoint { x_px, y_px };
    let mut moved = ordered.to_vec();
    for (photo, ordered) in moved.iter_mut().enumerate() {
        let orders: Vec<(i32, i32)> =
            fit.joint.spots.iter().filter(|spot| spot.photo == photo).map(|spot| spot.order).chain([order]).collect();
        let predicted = fit.joint.predict(&values, photo, &orders);
        let nearest =
            orders.iter().zip(predicted).filter_map(|(&o, p)| p.map(|[x_px, y_px]| (o, place.distance_px(PixelPoint { x_px, y_px }))));
        let (zero, _) = nearest.min_by(|a, b| a.1.total_cmp(&b.1))?;
        for order in ordered.indexed.order.iter_mut().flatten() {
            *order = (order.0 - zero.0, order.1 - zero.1);
        }
        if !ordered.rough.put_zero_order(place) {
            return None;
        }
    }
    Some(moved)
}
