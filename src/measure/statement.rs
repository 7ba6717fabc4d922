//! What can be said beside the numbers: colour of the laser, kind of lattice, doubts about the numbering.

use super::{
    MeasureError,
    look::Seen,
    measurement::KindStatement,
    orders::Ordered,
};
use crate::{
    Note,
    bench::Bench,
    fit::{Cell, Fit, FitError, Joint},
    quantity::Quantity,
};

/// Checks what the photos show of the laser against what the bench file says.
pub(super) fn capture_notes(seen: &Seen, bench: &Bench, wavelengths_m: &[Quantity]) -> Result<Vec<Note>, MeasureError> {
    let mut notes = Vec::new();
    for (photo, pattern) in seen.patterns.iter().enumerate() {
        notes.extend(pattern.spots.notes.iter().cloned());
        let wavelength_m = wavelengths_m[super::assemble::assignment(bench, photo).laser].value;
        colour_agrees(wavelength_m, pattern.spots.colour)?;
    }
    for target in &seen.targets {
        notes.extend(target.reading.notes.iter().cloned());
    }
    Ok(notes)
}

/// Limits between the laser colours that a camera's channels tell apart with certainty, m.
const BLUE_BELOW_M: f64 = 485e-9;
const GREEN_M: std::ops::Range<f64> = 505e-9..565e-9;
const RED_ABOVE_M: f64 = 605e-9;
/// A channel that carries more than this share of the light names the colour.
const DOMINANT_SHARE: f64 = 0.6;

/// Refuses a wavelength whose colour is plainly not the colour of the spots. Between the clear ranges (cyan, yellow, orange) and for grey
/// photos nothing is said.
fn colour_agrees(wavelength_m: f64, shares: [f64; 3]) -> Result<(), MeasureError> {
    const NAMES: [&str; 3] = ["red", "green", "blue"];
    let expected = match wavelength_m {
        w if w > RED_ABOVE_M => 0,
        w if GREEN_M.contains(&w) => 1,
        w if w < BLUE_BELOW_M => 2,
        _ => return Ok(()),
    };
    match shares.iter().position(|&share| share > DOMINANT_SHARE) {
        Some(seen) if seen != expected => {
            Err(MeasureError::ColourMismatch { wavelength_m, stated: NAMES[expected], seen: NAMES[seen], shares })
        }
        _ => Ok(()),
    }
}

/// A line needs three spots and a plane four before anything checks the numbering.
pub(super) fn enough_spots(joint: &Joint) -> Result<(), FitError> {
    for photo in 0..joint.shape.photos.len() {
        let orders = || joint.spots.iter().filter(move |spot| spot.photo == photo).map(|spot| spot.order);
        let needed = if orders().any(|(_, k)| k != 0) { 4 } else { 3 };
        let indexed = orders().count();
        if indexed < needed {
            return Err(FitError::TooFewSpots { indexed, needed });
        }
    }
    Ok(())
}

/// The kind of plane lattice.
pub(super) fn kind_statement(_fit: &Fit, _found: &Cell) -> Option<KindStatement> {
    None
}

/// Doubts about the numbering.
pub(super) fn numbering_notes(_ordered: &[Ordered]) -> Vec<Note> {
    Vec::new()
}
