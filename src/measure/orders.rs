//! Gives every spot of a photo its order, through the rough geometry.

use super::rough::Rough;
use crate::{
    frames::{PixelCovariance, PixelPoint},
    lattice::{self, Expected, IndexOptions, Indexed, LatticeError, Point, Reason, ZeroHint},
    math::robust::median,
    spots::Spot,
};
use std::collections::BTreeMap;

/// Spots of one photo with their orders; everything refers to the photo's list of spots.
#[derive(Debug, Clone)]
pub(super) struct Ordered {
    pub(super) indexed: Indexed,
    /// Which spot each point given to `lattice` was.
    pub(super) spot_of_point: Vec<usize>,
    /// Spots not given to `lattice`, and why.
    left_out: BTreeMap<usize, &'static str>,
    /// The rough geometry with the zero order in its place.
    pub(super) rough: Rough,
}

/// How rough the geometry is, for [`lattice::index`].
#[derive(Debug, Clone, Copy)]
pub(super) struct Roughness {
    pub(super) expected: Expected,
    pub(super) bend: f64,
}

/// A zero order that leads by this much in a lattice of this much evidence needs no rival hypothesis, nats.
const SURE_ZERO: f64 = 3.0;
const SURE_EVIDENCE: f64 = 30.0;
/// Most that brightness and symmetry may say for or against a zero order beside the regularity of the places, nats.
const ZERO_SAY: f64 = 8.0;
/// How near, in px, a zero order lies to the place where it was supposed.
const SAME_PLACE_PX: f64 = 3.0;
/// Hypotheses tried at most; those that indexing itself proposes included.
const MOST_HYPOTHESES: usize = 9;

/// Indexes the spots of a photo. Which spot the zero order is decides how wide angles are mapped, so it is a hypothesis: likely
/// spots are tried in turn, with what indexing proposes from them, and unless one leaves no doubt the one is kept about which
/// the orders are most regular and the pattern most symmetric.
pub(super) fn order_spots(
    spots: &[Spot],
    rough: &Rough,
    roughness: Roughness,
    on_screen: &dyn Fn(&Spot) -> bool,
) -> Result<Ordered, LatticeError> {
    let mut hypotheses = likely_zero_orders(spots, rough);
    let mut best: Option<(f64, Ordered)> = None;
    let mut refusal: Option<LatticeError> = None;
    let mut next = 0;
    while let Some(&zero) = hypotheses.get(next) {
        next += 1;
        let free = match order_about(spots, rough, zero, Zero::Open, roughness, on_screen) {
            Ok(free) => free,
            // Where no lattice is seen with the zero order open, none is with it here.
            Err(error) => {
                refusal = refusal.or(Some(error));
                continue;
            }
        };
        let proposed = free.rough.pixel(free.indexed.zero).map(|place| (place, free.indexed.evidence));
        let agrees = proposed.is_some_and(|(place, _)| place.distance_px(zero) < SAME_PLACE_PX);
        if agrees && proposed.is_some_and(|(_, e)| e.zero_lead > SURE_ZERO && e.log_evidence > SURE_EVIDENCE) {
            return Ok(free);
        }
        if let Some((place, _)) = proposed.filter(|_| hypotheses.len() < MOST_HYPOTHESES)
            && hypotheses.iter().all(|known| known.distance_px(place) >= SAME_PLACE_PX)
        {
            hypotheses.insert(next, place);
        }
        match if agrees { Ok(free) } else { order_about(spots, rough, zero, Zero::Here, roughness, on_screen) } {
            Ok(ordered) => {
                let evidence = ordered.indexed.evidence;
                let total = evidence.log_evidence + evidence.zero_score.clamp(-ZERO_SAY, ZERO_SAY);
                if best.as_ref().is_none_or(|(lead, _)| total > *lead) {
                    best = Some((total, ordered));
                }
            }
            Err(error) => refusal = refusal.or(Some(error)),
        }
    }
    let none = || refusal.unwrap_or(LatticeError::TooFewSpots { found: 0, needed: 3 });
    best.map(|(_, ordered)| ordered).ok_or_else(none)
}

/// Whether the zero order is where the mapping has its origin, or wherever indexing puts it.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum Zero {
    Here,
    Open,
}

/// Indexes the spots by the mapping that has its origin at `place`.
fn order_about(
    spots: &[Spot],
    rough: &Rough,
    place: PixelPoint,
    zero: Zero,
    roughness: Roughness,
    on_screen: &dyn Fn(&Spot) -> bool,
) -> Result<Ordered, LatticeError> {
    let mut rough = rough.clone();
    if !rough.put_zero_order(place) {
        return Err(LatticeError::TooFewSpots { found: 0, needed: 3 });
    }
    let left_out = left_out(spots, on_screen);
    let (points, spot_of_point) = points(spots, &rough, &left_out);
    let here = rough.lattice_u(place, PixelCovariance::isotropic(SAME_PLACE_PX)).map(|u| ZeroHint { at: [0.0; 2], u });
    let zero_hint = here.filter(|_| zero == Zero::Here);
    let options = IndexOptions { expected: roughness.expected, bend: roughness.bend, zero_hint, ..IndexOptions::default() };
    let indexed = lattice::index(&points, &options, &|place| rough.in_frame(place))?;
    Ok(Ordered { indexed, spot_of_point, left_out, rough })
}

/// Bright spots tried as the zero order.
const BRIGHT_HYPOTHESES: usize = 4;
/// Spots in the middle of the pattern tried as the zero order.
const CENTRAL_HYPOTHESES: usize = 2;

/// Where a calibration knows the zero order, that place; then the brightest spots, then those nearest the middle of the pattern: clipping and halo make light a poor witness, symmetry a fair one.
fn likely_zero_orders(spots: &[Spot], rough: &Rough) -> Vec<PixelPoint> {
    let mut bright: Vec<&Spot> = spots.iter().collect();
    bright.sort_by(|a, b| light_of(b).total_cmp(&light_of(a)));
    let median_of = |f: fn(&Spot) -> f64| median(&spots.iter().map(f).collect::<Vec<f64>>());
    let frame_middle = PixelPoint { x_px: rough.size_px[0] / 2.0, y_px: rough.size_px[1] / 2.0 };
    let middle = PixelPoint {
        x_px: median_of(|spot| spot.at.x_px).unwrap_or(frame_middle.x_px),
        y_px: median_of(|spot| spot.at.y_px).unwrap_or(frame_middle.y_px),
    };
    let mut central = bright.clone();
    central.sort_by(|a, b| a.at.distance_px(middle).total_cmp(&b.at.distance_px(middle)));
    let mut places: Vec<PixelPoint> = rough.zero_order.iter().map(|&[x_px, y_px]| PixelPoint { x_px, y_px }).collect();
    for spot in bright.iter().take(BRIGHT_HYPOTHESES).chain(central.iter().take(CENTRAL_HYPOTHESES)) {
        if !places.contains(&spot.at) {
            places.push(spot.at);
        }
    }
    if places.is_empty() { vec![frame_middle] } else { places }
}

/// How large the pattern's spots are: all orders carry the same footprint of the beam, drawn out by no more than the slant of screen and camera.
pub(super) struct CommonSize {
    sigma_px: f64,
}

/// The size is taken from this many of the brightest spots.
const BRIGHTEST: usize = 15;
/// Sizes beyond this factor are hot pixels, grains of speckle, blobs: the slant of the widest orders changes a spot by less.
const SIZE_FACTOR: f64 = 3.5;

impl CommonSize {
    pub(super) fn of(spots: &[Spot]) -> Self {
        let mut bright: Vec<&Spot> = spots.iter().collect();
        // Clipped spots show mostly halo and come last.
        bright.sort_by(|a, b| (a.clipped_px > 0).cmp(&(b.clipped_px > 0)).then(light_of(b).total_cmp(&light_of(a))));
        let sizes: Vec<f64> = bright.iter().take(BRIGHTEST).map(|spot| sigma_px(spot)).collect();
        Self { sigma_px: median(&sizes).unwrap_or(1.0) }
    }

    pub(super) fn fits(&self, spot: &Spot) -> bool {
        spot.clipped_px > 0 || (sigma_px(spot) / self.sigma_px).ln().abs() < SIZE_FACTOR.ln()
    }
}

/// Geometric mean of the half-axes of a spot's profile.
fn sigma_px(spot: &Spot) -> f64 {
    (spot.shape.xx * spot.shape.yy - spot.shape.xy.powi(2)).max(1e-12).powf(0.25)
}

/// Light in a spot: peak times area of the profile.
pub(super) fn light_of(spot: &Spot) -> f64 {
    spot.peak * (spot.shape.xx * spot.shape.yy - spot.shape.xy.powi(2)).max(0.0).sqrt()
}

/// Spots that cannot be orders, whatever the lattice.
fn left_out(spots: &[Spot], on_screen: &dyn Fn(&Spot) -> bool) -> BTreeMap<usize, &'static str> {
    let common = CommonSize::of(spots);
    let reason = |spot: &Spot| match () {
        () if !on_screen(spot) => Some("beyond the marks or the sheet"),
        () if !common.fits(spot) => Some("far from the common size of the spots"),
        () => None,
    };
    spots.iter().enumerate().filter_map(|(number, spot)| reason(spot).map(|reason| (number, reason))).collect()
}

fn points(spots: &[Spot], rough: &Rough, left_out: &BTreeMap<usize, &'static str>) -> (Vec<Point>, Vec<usize>) {
    let point = |(i, spot): (usize, &Spot)| {
        let at = rough.lattice_place(spot.at)?;
        let u = rough.lattice_u(spot.at, spot.covariance)?;
        Some((Point::new(at, u, light_of(spot).max(1e-12)), i))
    };
    spots.iter().enumerate().filter(|(number, _)| !left_out.contains_key(number)).filter_map(point).unzip()
}

impl Ordered {
    /// Why a spot carries no order, in words, and how far off it is.
    pub(super) fn reason(&self, spot: usize) -> (&'static str, String) {
        if let Some(reason) = self.left_out.get(&spot) {
            return (reason, String::new());
        }
        let point = self.spot_of_point.iter().position(|&s| s == spot);
        let reason = self.indexed.rejected.iter().find(|(rejected, _)| Some(*rejected) == point);
        reason.map_or_else(|| ("off the model", String::new()), |(_, reason)| in_words(reason))
    }

    /// Pairs of spot number and order.
    pub(super) fn orders(&self) -> impl Iterator<Item = (usize, (i32, i32))> + '_ {
        self.spot_of_point.iter().zip(&self.indexed.order).filter_map(|(&spot, order)| order.map(|order| (spot, order)))
    }
}

/// A reason for the overlay and the order table.
fn in_words(reason: &Reason) -> (&'static str, String) {
    match reason {
        Reason::NotANumber => ("no usable place", String::new()),
        Reason::OffLattice { offset } => ("between orders", format!("off by ({:+.2}, {:+.2}) orders", offset[0], offset[1])),
        Reason::OffLine { distance } => ("off the row", format!("by {distance:.2} orders")),
        Reason::Duplicate { .. } => ("a better spot holds this order", String::new()),
        Reason::Ghost { copies, .. } => ("ghost", format!("one of {copies} with the same offset")),
        Reason::SecondLattice => ("on a second lattice", String::new()),
        Reason::OutOfReach => ("too far out to number", String::new()),
        _ => ("off the lattice", String::new()),
    }
}
