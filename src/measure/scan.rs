//! Orders for all photos. Where nothing fixes the scale of the screen, the right scale is the one that makes the orders regular.

use super::{
    GAUGE_THROW_M, MeasureError, align,
    assemble::{expected, rough},
    bounds::Reach,
    cameras::Cameras,
    look::Seen,
    orders::{Ordered, Roughness, order_spots},
};
use crate::{Error, bench::Bench, lattice::LatticeError};
use rayon::prelude::*;

/// With a print the mapping is good to a few per cent at the edge.
const BEND_WITH_PRINT: f64 = 0.1;
/// Without one, focal length and lean of the camera are guesses.
const BEND_WITHOUT_PRINT: f64 = 0.3;
/// What is tried where that finds no lattice is this many times stiffer: few spots at wide angles do not bear a mapping that bends freely.
const STIFFER: f64 = 3.0;
/// Trial scales: throw over picture width as the camera sees it, from a pattern that spans 140° to one that spans a few degrees.
const TRIAL_SCALES: usize = 24;
const FIRST_SCALE: f64 = 0.15;
const SCALE_STEP: f64 = 1.2;

/// How freely the mapping from pixels to orders may bend.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Stiffness {
    /// As roughly as a bench is known.
    Usual,
    /// As well as a careful bench is known.
    Stiff,
}

/// Gives the spots of every photo their orders, in one common basis per sample.
pub(super) fn order_all(seen: &Seen, bench: &Bench, cameras: &Cameras, stiffness: Stiffness) -> Result<(Cameras, Vec<Ordered>), Error> {
    if seen.patterns.is_empty() {
        return Err(MeasureError::NoPhoto.into());
    }
    let scale_known = cameras.screen_known || (bench.camera.scale.is_some() && bench.screen.throw_m.is_some());
    let (cameras, mut ordered) = if scale_known {
        (cameras.clone(), order_at(seen, bench, cameras, stiffness)?)
    } else {
        best_scale(seen, bench, cameras, stiffness)?
    };
    align::to_common_bases(&mut ordered, bench);
    Ok((cameras, ordered))
}

fn order_at(seen: &Seen, bench: &Bench, cameras: &Cameras, stiffness: Stiffness) -> Result<Vec<Ordered>, LatticeError> {
    let usual = if cameras.screen_known { BEND_WITH_PRINT } else { BEND_WITHOUT_PRINT };
    let bend = if stiffness == Stiffness::Stiff { usual / STIFFER } else { usual };
    let order = |(photo, pattern): (usize, &super::look::SeenPattern)| {
        let roughness = Roughness { expected: expected(bench, photo), bend };
        let reach = Reach::of(photo, cameras.view_of_photo[photo], seen, bench);
        order_spots(&pattern.spots.spots, &rough(cameras, bench, photo, pattern.size_px), roughness, &|spot| reach.holds(spot))
    };
    seen.patterns.par_iter().enumerate().map(order).collect()
}

/// Tries camera distances that span all plausible patterns and keeps the one whose lattice has the strongest evidence.
fn best_scale(seen: &Seen, bench: &Bench, cameras: &Cameras, stiffness: Stiffness) -> Result<(Cameras, Vec<Ordered>), Error> {
    let throw_m = bench.screen.throw_m.map_or(GAUGE_THROW_M, |throw| throw.value);
    // A stiffer mapping asks for a better scale.
    let (step, count) = if stiffness == Stiffness::Stiff { (SCALE_STEP.sqrt(), 2 * TRIAL_SCALES) } else { (SCALE_STEP, TRIAL_SCALES) };
    let trial = |number: usize| {
        // throw as the camera sees it, in picture widths
        let scale = FIRST_SCALE * step.powi(i32::try_from(number).unwrap_or(0));
        let distance_m = cameras.lens.focal_px * throw_m / (scale * cameras.lens.size_px[0]);
        let moved = cameras.at_distance(distance_m);
        order_at(seen, bench, &moved, stiffness).map(|ordered| (moved, ordered))
    };
    let trials: Vec<Result<(Cameras, Vec<Ordered>), LatticeError>> = (0..count).into_par_iter().map(trial).collect();
    let evidence = |ordered: &[Ordered]| ordered.iter().map(|o| o.indexed.evidence.log_evidence).sum::<f64>();
    let mut first_error = None;
    let mut best: Option<(f64, (Cameras, Vec<Ordered>))> = None;
    for trial in trials {
        match trial {
            Ok(found) => {
                let score = evidence(&found.1);
                if best.as_ref().is_none_or(|(lead, _)| score > *lead) {
                    best = Some((score, found));
                }
            }
            Err(error) => first_error = first_error.or(Some(error)),
        }
    }
    match (best, first_error) {
        (Some((_, found)), _) => Ok(found),
        (None, Some(error)) => Err(error.into()),
        (None, None) => Err(MeasureError::NoPhoto.into()),
    }
}
