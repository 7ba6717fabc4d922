//! What can be said beside the numbers: colour of the laser, kind of lattice, doubts about the numbering.

use super::{
    MeasureError,
    look::{Print, Seen},
    measurement::KindStatement,
    orders::Ordered,
};
use crate::{
    Note,
    bench::Bench,
    fit::{Cell, Fit, FitError, Joint},
    lattice::{CellEstimate, KindOptions, LatticeKind, Warning, kind_of_lattice},
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
        if let Print::Dots(reading) = &target.print {
            notes.extend(reading.notes.iter().cloned());
        }
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

/// Orders further off than this share of their spacing, rms, leave neighbours open to doubt: spots strewn at random inside the gate of
/// indexing have about twice as much.
const IRREGULAR: f64 = 0.1;

/// Refuses a lattice that its own spots do not follow.
pub(super) fn regular_enough(fit: &Fit) -> Result<(), MeasureError> {
    let values = fit.joint.values();
    let spacing = |photo: usize| {
        let mut used: Vec<(i32, i32)> =
            fit.joint.spots.iter().filter(|spot| spot.photo == photo && spot.weight > 0.5).map(|spot| spot.order).collect();
        used.sort_unstable_by_key(|(h, k)| (h.abs() + k.abs(), *h, *k));
        let middle = *used.first()?;
        let places = fit.joint.predict(&values, photo, &[middle, (middle.0 + 1, middle.1), (middle.0, middle.1 + 1)]);
        let [x, y] = (*places.first()?)?;
        let steps = places.iter().skip(1).flatten().map(|[x1, y1]| (x1 - x).hypot(y1 - y));
        // A row has no second step: its prediction stays where it is.
        steps.filter(|step| *step > 1e-6).min_by(f64::total_cmp)
    };
    let spacing_px = (0..fit.joint.shape.photos.len()).filter_map(spacing).fold(f64::INFINITY, f64::min);
    let rms_px = fit.spot_rms_px;
    if rms_px > IRREGULAR * spacing_px { Err(MeasureError::Irregular { rms_px, spacing_px }) } else { Ok(()) }
}

/// The kind of plane lattice, as a statistical statement; `None` for a line grating.
pub(super) fn kind_statement(fit: &Fit, found: &Cell) -> Option<KindStatement> {
    let [p1, p2] = found.pitch_m.as_slice() else { return None };
    let values = [p1, p2, found.angle_rad.as_ref()?];
    let covariance = values.map(|a| values.map(|b| fit.covariance_of(a, b)));
    let estimate = CellEstimate { p1: p1.value, p2: p2.value, angle_rad: values[2].value, covariance, degrees_of_freedom: f64::INFINITY };
    let options = KindOptions::default();
    let statement = kind_of_lattice(&estimate, &options).ok()?;
    let test = statement.tests.iter().find(|test| test.kind == statement.kind);
    let name = kind_name(statement.kind);
    let sentence = match test {
        None => "oblique: every higher symmetry is rejected at the 1 % level".to_owned(),
        Some(test) if statement.telling => {
            format!("{name} within its uncertainty (p = {:.2}); a deviation of {} would have shown", test.p_value, percent(test.detectable))
        }
        Some(test) => format!(
            "{name} is not contradicted, but the uncertainty is too wide to tell: only a deviation beyond {} would have shown",
            percent(test.detectable)
        ),
    };
    Some(KindStatement { kind: statement.kind, p_value: test.map_or(1.0, |test| test.p_value), sentence })
}

fn percent(share: f64) -> String {
    if share < 1e-3 { format!("{:.3} %", share * 100.0) } else { format!("{:.1} %", share * 100.0) }
}

/// Name of a lattice kind in reports.
fn kind_name(kind: LatticeKind) -> &'static str {
    match kind {
        LatticeKind::Oblique => "oblique",
        LatticeKind::Rectangular => "rectangular",
        LatticeKind::CentredRectangular => "centred rectangular",
        LatticeKind::Square => "square",
        LatticeKind::Hexagonal => "hexagonal",
    }
}

/// Doubts about the numbering.
pub(super) fn numbering_notes(ordered: &[Ordered]) -> Vec<Note> {
    ordered.iter().flat_map(|photo| &photo.indexed.warnings).filter_map(numbering_note).collect()
}

fn numbering_note(warning: &Warning) -> Option<Note> {
    Some(match *warning {
        Warning::ThinNumbering { cell_ratio, lead } => Note::ThinNumbering { cell_ratio, lead },
        Warning::FewDeciders { factor, deciders } => Note::FewDeciders { factor, deciders },
        Warning::FaintBetween { factor, brightness_ratio } => Note::FaintBetween { factor, brightness_ratio },
        Warning::ZeroUnseen => Note::ZeroOrderUnseen,
        Warning::ZeroUncertain { lead, other } => Note::ZeroOrderUncertain { lead, other },
        Warning::FewPoints { explained } => Note::FewSpots { indexed: explained },
        Warning::SecondLattice { points, .. } => Note::SecondLattice { spots: points },
        Warning::Ghosts { points } => Note::Ghosts { spots: points },
        Warning::ShapeUncertain { lead } => Note::ShapeUncertain { lead },
        _ => return None,
    })
}
