//! A measurement up to its solved problem: what measuring a sample and calibrating a bench have in common.

use super::{
    Inputs, Refusal, assemble, calibrated, cameras,
    cameras::Cameras,
    deciders,
    look::{self, Seen},
    orders::Ordered,
    scan::{self, Stiffness},
    statement, strain, strays, zero_order,
};
use crate::{
    Error, Note,
    bench::Bench,
    fit::{Fit, Outliers, solve},
    quantity::Quantity,
};

/// Photos looked at, spots with their orders, and the solved joint problem.
#[derive(Debug)]
pub(super) struct Fitted<'a> {
    pub(super) inputs: &'a Inputs<'a>,
    pub(super) seen: Seen,
    pub(super) ordered: Vec<Ordered>,
    pub(super) fit: Fit,
    pub(super) notes: Vec<Note>,
}

/// Looks at the photos and solves the joint problem.
pub(super) fn fitted<'a>(inputs: &'a Inputs<'a>, bench: &Bench) -> Result<Fitted<'a>, Refusal> {
    let seen = look::look(inputs, bench)?;
    let mut notes = calibrated::check(inputs, &seen, bench)?;
    let targets: Vec<&str> = inputs.targets.iter().map(|file| file.name).collect();
    let wavelengths_m = assemble::wavelengths_in_air(bench)?;
    notes.extend(statement::capture_notes(&seen, bench, &wavelengths_m)?);
    let cameras = cameras::cameras(&seen, bench, &targets)?;
    let (ordered, fit) = numbered(&seen, bench, &cameras, &wavelengths_m, Stiffness::Usual).or_else(|refusal| {
        match seen.patterns.iter().all(|pattern| pattern.spots.spots.len() <= FEW_SPOTS) {
            true => numbered(&seen, bench, &cameras, &wavelengths_m, Stiffness::Stiff).map_err(|_| refusal),
            false => Err(refusal),
        }
    })?;
    notes.extend(statement::numbering_notes(&ordered));
    notes.extend(strain::strained_statements(bench, &fit));
    notes.extend(strain::strained_calibration(bench, &fit));
    notes.extend(strain::shifted_pattern(&fit));
    Ok(Fitted { inputs, seen, ordered, fit, notes })
}

/// So many spots show their lattice under any mapping; fewer are given a second try.
const FEW_SPOTS: usize = 60;

/// Orders for all spots, and the joint problem solved with them.
fn numbered(
    seen: &Seen,
    bench: &Bench,
    cameras: &Cameras,
    wavelengths_m: &[Quantity],
    stiffness: Stiffness,
) -> Result<(Vec<Ordered>, Fit), Error> {
    let (cameras, mut ordered) = scan::order_all(seen, bench, cameras, stiffness)?;
    let solved = |ordered: &[Ordered]| -> Result<Fit, Error> {
        let joint = assemble::assemble(seen, bench, &cameras, ordered, wavelengths_m);
        statement::enough_spots(&joint)?;
        Ok(solve(joint, Outliers::Rejected)?)
    };
    let mut fit = solved(&ordered)?;
    if let Some(coarser) = deciders::coarser_numbering(bench, &ordered, &fit) {
        fit = solved(&coarser)?;
        ordered = coarser;
    }
    let (ordered, fit) = zero_order::best_zero_order(seen, bench, &cameras, ordered, wavelengths_m, fit)?;
    let fit = strays::taken_in(seen, bench, fit)?;
    statement::regular_enough(&fit)?;
    Ok((ordered, fit))
}
