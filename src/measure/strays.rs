//! After the fit the model predicts every order to a fraction of a pixel: spots that indexing left aside are taken in where it says so.

use super::{bounds::Reach, look::Seen, orders::CommonSize};
use crate::{
    bench::Bench,
    fit::{Fit, FitError, Outliers, SpotObservation, solve},
    frames::PixelPoint,
};
use std::collections::BTreeSet;

/// A stray within this many standard uncertainties of a vacant order belongs to it.
const TAKE_AT: f64 = 4.0;
/// Orders this far beyond the outermost indexed one are looked for.
const BEYOND: i32 = 4;

/// Fits again with the strays that fall on vacant orders, until there are none.
pub(super) fn taken_in(seen: &Seen, bench: &Bench, mut fit: Fit) -> Result<Fit, FitError> {
    for _ in 0..3 {
        let found = strays(seen, bench, &fit);
        if found.is_empty() {
            break;
        }
        let mut joint = fit.joint;
        // The Birge factors belong to the old selection.
        (joint.spot_scale, joint.print_scale) = (1.0, 1.0);
        joint.spots.extend(found);
        fit = solve(joint, Outliers::Rechecked)?;
    }
    Ok(fit)
}

fn strays(seen: &Seen, bench: &Bench, fit: &Fit) -> Vec<SpotObservation> {
    let values = fit.joint.values();
    let mut found = Vec::new();
    for (photo, pattern) in seen.patterns.iter().enumerate() {
        let of_photo: Vec<&SpotObservation> = fit.joint.spots.iter().filter(|spot| spot.photo == photo).collect();
        let mut taken: BTreeSet<(i32, i32)> = of_photo.iter().filter(|spot| spot.weight > 0.5).map(|spot| spot.order).collect();
        let orders = vacant(&of_photo, &taken);
        let predicted = fit.joint.predict(&values, photo, &orders);
        let reach = Reach::of(photo, fit.joint.shape.photos[photo].view, seen, bench);
        let common = CommonSize::of(&pattern.spots.spots);
        for (number, spot) in pattern.spots.spots.iter().enumerate() {
            if of_photo.iter().any(|used| used.spot == number) || !reach.holds(spot) || !common.fits(spot) {
                continue;
            }
            let nearest = orders.iter().zip(&predicted).filter_map(|(&order, place)| {
                let [x_px, y_px] = (*place)?;
                Some((order, spot.at.distance_px(PixelPoint { x_px, y_px }), [spot.at.x_px - x_px, spot.at.y_px - y_px]))
            });
            let Some((order, _, offset)) = nearest.min_by(|a, b| a.1.total_cmp(&b.1)) else { continue };
            let observation = SpotObservation { photo, spot: number, at: spot.at, covariance: spot.covariance, order, weight: 1.0 };
            if !taken.contains(&order) && observation.length(offset).is_some_and(|length| length < TAKE_AT * fit.joint.spot_scale) {
                taken.insert(order);
                found.push(observation);
            }
        }
    }
    found
}

/// All orders of the box around the indexed ones that carry no spot.
fn vacant(spots: &[&SpotObservation], taken: &BTreeSet<(i32, i32)>) -> Vec<(i32, i32)> {
    let reach = |index: fn(&(i32, i32)) -> i32| {
        let all = || spots.iter().map(|spot| index(&spot.order));
        let (low, high) = (all().min().unwrap_or(0), all().max().unwrap_or(0));
        if low == 0 && high == 0 { 0..=0 } else { low.saturating_sub(BEYOND)..=high.saturating_add(BEYOND) }
    };
    let (rows, columns) = (reach(|order| order.0), reach(|order| order.1));
    rows.flat_map(|h| columns.clone().map(move |k| (h, k))).filter(|order| !taken.contains(order)).collect()
}
