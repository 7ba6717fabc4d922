//! Invented photos with hand-made measurements, to look at the overlay.

use crate::{
    frames::{PixelCovariance, PixelPoint},
    measure::{Measurement, OrderRow, RejectedSpot},
    photo::{Exif, Photo, Samples},
    report::example,
};

/// A hexagonal pattern with strays, a ghost, a clipped centre and two orders left out of the fit.
pub(super) fn hexagonal(width: usize) -> (Photo, Measurement) {
    plane(width, 0.11, 3)
}

/// So many orders that not every label finds room.
pub(super) fn dense(width: usize) -> (Photo, Measurement) {
    plane(width, 0.03, 14)
}

/// A line grating across the photo, zero order not seen.
pub(super) fn line(width: usize) -> (Photo, Measurement) {
    let mut measurement = example::line();
    let side = width as f64;
    let centre = [0.52 * side, 0.37 * side];
    measurement.orders = (-4..=4)
        .filter(|&h| h != 0)
        .map(|h| order(h, 0, [centre[0] + 0.108 * side * f64::from(h), centre[1] + 0.012 * side * f64::from(h)]))
        .collect();
    measurement.zero_order.at = point(centre);
    measurement.zero_order.seen = false;
    measurement.photos[0].axes_px = vec![point([centre[0] + 0.108 * side, centre[1] + 0.012 * side])];
    (photo(width, &measurement), measurement)
}

fn plane(width: usize, step: f64, reach: i32) -> (Photo, Measurement) {
    let mut measurement = example::plane();
    let side = width as f64;
    let centre = [0.49 * side, 0.38 * side];
    let at = |h: i32, k: i32| {
        let (h, k) = (f64::from(h), f64::from(k));
        let (x, y) = (h + 0.5 * k, -0.866 * k);
        [centre[0] + step * side * (x - 0.15 * y), centre[1] + step * side * (y + 0.15 * x)]
    };
    let inside = |[x, y]: [f64; 2]| x > 0.0 && x < side && y > 0.0 && y < 0.75 * side;
    let pairs = (-reach..=reach).flat_map(|h| (-reach..=reach).map(move |k| (h, k))).filter(|(h, k)| (h + k).abs() <= reach);
    measurement.orders = pairs.filter(|&(h, k)| inside(at(h, k))).map(|(h, k)| order(h, k, at(h, k))).collect();
    measurement.rejected = vec![
        stray([0.87 * side, 0.11 * side], "2.3 px from order (3,1): reflection of the screen's rear face"),
        stray([0.08 * side, 0.66 * side], "no order near"),
        stray([0.60 * side, 0.335 * side], "ghost of the zero order"),
    ];
    measurement.zero_order.at = point(centre);
    measurement.photos[0].axes_px = vec![point(at(1, 0)), point(at(0, 1))];
    (photo(width, &measurement), measurement)
}

fn point([x_px, y_px]: [f64; 2]) -> PixelPoint {
    PixelPoint { x_px, y_px }
}

fn order(h: i32, k: i32, at: [f64; 2]) -> OrderRow {
    // Any fixed scatter will do; the sine of the indices is one.
    let scatter = |phase: f64| 0.06 * (f64::from(7 * h + 3 * k) + phase).sin();
    let used = !matches!((h, k), (2, -3) | (-1, 3));
    let residual_px = if used { [scatter(0.0), scatter(2.0)] } else { [1.4, -0.9] };
    let clipped = h.abs() + k.abs() <= 1;
    OrderRow { photo: 0, h, k, at: point(at), covariance: PixelCovariance::isotropic(0.04), residual_px, used, clipped }
}

fn stray(at: [f64; 2], reason: &str) -> RejectedSpot {
    RejectedSpot { photo: 0, at: point(at), reason: reason.to_owned(), detail: String::new() }
}

/// Spots that fade outwards on an uneven noisy ground, red laser, 4:3.
fn photo(width: usize, measurement: &Measurement) -> Photo {
    let height = width * 3 / 4;
    let side = width as f64;
    let mut light: Vec<f64> = (0..width * height).map(|i| 14.0 + 10.0 * (i % width) as f64 / side + noise(i)).collect();
    let orders = measurement.orders.iter().map(|order| (order.at, 420.0 * (-0.45 * f64::from(order.h.abs() + order.k.abs())).exp() + 6.0));
    for (at, peak) in orders.chain(measurement.rejected.iter().map(|spot| (spot.at, 60.0))) {
        let sigma = 0.0028 * side + 0.3;
        let reach = 5.0 * sigma;
        for y in range(at.y_px, reach, height) {
            for x in range(at.x_px, reach, width) {
                let r2 = (x as f64 - at.x_px).powi(2) + (y as f64 - at.y_px).powi(2);
                light[y * width + x] += peak * (-r2 / (2.0 * sigma * sigma)).exp();
            }
        }
    }
    let samples =
        light.iter().flat_map(|&red| [super::canvas::level(red), super::canvas::level(0.2 * red), super::canvas::level(0.1 * red)]);
    Photo { width, height, channels: 3, samples: Samples::U8(samples.collect()), exif: Exif::default() }
}

fn range(centre: f64, reach: f64, limit: usize) -> std::ops::Range<usize> {
    let limit = u32::try_from(limit).unwrap();
    let side = |x: f64| usize::try_from(super::canvas::index(x, limit)).unwrap();
    side(centre - reach)..side(centre + reach)
}

/// A fixed pattern that looks like noise, about 2 levels.
fn noise(i: usize) -> f64 {
    let mixed = (i as u64).wrapping_mul(0x9E37_79B9_7F4A_7C15).rotate_left(31).wrapping_mul(0xBF58_476D_1CE4_E5B9) >> 40;
    mixed as f64 / f64::from(1 << 24) * 6.0 - 3.0
}
