//! Gives every spot of a photo its order, through the rough geometry.

use super::rough::Rough;
use crate::{
    frames::PixelPoint,
    lattice::{self, Expected, IndexOptions, Indexed, LatticeError, Point, Reason},
    math::robust::median,
    spots::Spot,
};

/// Spots of one photo with their orders; everything refers to the photo's list of spots.
#[derive(Debug, Clone)]
pub(super) struct Ordered {
    pub(super) indexed: Indexed,
    /// Which spot each point given to `lattice` was.
    pub(super) spot_of_point: Vec<usize>,
    /// The rough geometry with the zero order in its place.
    pub(super) rough: Rough,
}

/// How rough the geometry is, for [`lattice::index`].
#[derive(Debug, Clone, Copy)]
pub(super) struct Roughness {
    pub(super) expected: Expected,
    pub(super) bend: f64,
}

/// The zero order moves the origin of the wide-angle mapping, so indexing is repeated until it stays where it was put.
const ZERO_ORDER_PASSES: usize = 3;
/// Zero order and log evidence this sure need no second hypothesis, nats.
const SURE_ZERO: f64 = 3.0;
const SURE_EVIDENCE: f64 = 30.0;

/// Indexes the spots of a photo. Which spot the zero order is decides how wide angles are mapped, so it is a hypothesis: the
/// likely spots are tried in turn, and unless the first leaves no doubt the one with the strongest evidence is kept.
pub(super) fn order_spots(
    spots: &[Spot],
    rough: &Rough,
    roughness: Roughness,
    on_screen: &dyn Fn(&Spot) -> bool,
) -> Result<Ordered, LatticeError> {
    let mut best: Option<Ordered> = None;
    let mut refusal: Option<LatticeError> = None;
    for zero in likely_zero_orders(spots, rough) {
        match order_about(spots, rough.clone(), zero, roughness, on_screen) {
            Ok(ordered) => {
                let evidence = &ordered.indexed.evidence;
                let sure = evidence.zero_lead > SURE_ZERO && evidence.log_evidence > SURE_EVIDENCE;
                if best.as_ref().is_none_or(|b| evidence.log_evidence > b.indexed.evidence.log_evidence) {
                    best = Some(ordered);
                }
                if sure {
                    break;
                }
            }
            Err(error) => refusal = refusal.or(Some(error)),
        }
    }
    best.ok_or_else(|| refusal.unwrap_or(LatticeError::TooFewSpots { found: 0, needed: 3 }))
}

/// Indexes the spots with the zero order first taken to be at `zero`.
fn order_about(
    spots: &[Spot],
    mut rough: Rough,
    mut zero: PixelPoint,
    roughness: Roughness,
    on_screen: &dyn Fn(&Spot) -> bool,
) -> Result<Ordered, LatticeError> {
    let mut last = None;
    for _ in 0..ZERO_ORDER_PASSES {
        if !rough.put_zero_order(zero) {
            break;
        }
        let (points, spot_of_point) = points(spots, &rough, on_screen);
        let options = IndexOptions { expected: roughness.expected, bend: roughness.bend, ..IndexOptions::default() };
        let indexed = lattice::index(&points, &options, &|place| rough.in_frame(place))?;
        let found = rough.pixel(indexed.zero);
        last = Some(Ordered { indexed, spot_of_point, rough: rough.clone() });
        match found {
            Some(found) if found.distance_px(zero) > 2.0 => zero = found,
            _ => break,
        }
    }
    last.ok_or(LatticeError::TooFewSpots { found: 0, needed: 3 })
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

fn points(spots: &[Spot], rough: &Rough, on_screen: &dyn Fn(&Spot) -> bool) -> (Vec<Point>, Vec<usize>) {
    let common = CommonSize::of(spots);
    let point = |(i, spot): (usize, &Spot)| {
        let at = rough.lattice_place(spot.at)?;
        let u = rough.lattice_u(spot.at, spot.covariance)?;
        Some((Point::new(at, u, light_of(spot).max(1e-12)), i))
    };
    spots.iter().enumerate().filter(|(_, spot)| on_screen(spot) && common.fits(spot)).filter_map(point).unzip()
}

impl Ordered {
    /// Why a spot carries no order, in words.
    pub(super) fn reason(&self, spot: usize) -> String {
        let Some(point) = self.spot_of_point.iter().position(|&s| s == spot) else {
            return "beyond the marks, or far from the common size of the spots".to_owned();
        };
        let reason = self.indexed.rejected.iter().find(|(rejected, _)| *rejected == point);
        reason.map_or_else(|| "off the model".to_owned(), |(_, reason)| in_words(reason))
    }

    /// Pairs of spot number and order.
    pub(super) fn orders(&self) -> impl Iterator<Item = (usize, (i32, i32))> + '_ {
        self.spot_of_point.iter().zip(&self.indexed.order).filter_map(|(&spot, order)| order.map(|order| (spot, order)))
    }
}

/// A reason for the overlay and the order table.
fn in_words(reason: &Reason) -> String {
    match reason {
        Reason::NotANumber => "no usable place".to_owned(),
        Reason::OffLattice { offset } => format!("between orders ({:+.2}, {:+.2})", offset[0], offset[1]),
        Reason::OffLine { distance } => format!("off the row by {distance:.2} orders"),
        Reason::Duplicate { .. } => "a better spot holds this order".to_owned(),
        Reason::Ghost { copies, .. } => format!("ghost, one of {copies} with the same offset"),
        Reason::SecondLattice => "on a second lattice".to_owned(),
        Reason::OutOfReach => "too far out to number".to_owned(),
        _ => "off the lattice".to_owned(),
    }
}
