//! Sizes on the overlay, all derived from the picture and the distance between its spots.

use super::canvas::{Place, index};
use crate::{
    frames::PixelPoint,
    measure::{Measurement, OrderRow},
    photo::Photo,
};

/// Photos whose longer side is below this are enlarged, px.
const SMALLEST_SIDE_PX: f64 = 900.0;

/// One letter pixel per this many pixels of the picture's mean side.
const SIDE_PER_SCALE_PX: f64 = 700.0;

/// Orders looked at for the distance between neighbours.
const SAMPLED_ORDERS: usize = 400;

/// Sizes of one overlay.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Layout {
    /// Canvas pixels per photo pixel.
    pub(super) enlarge: u32,
    /// Canvas pixels per letter pixel.
    pub(super) scale: u32,
    /// Median distance of an order to its nearest neighbour, canvas px.
    pub(super) spacing_px: f64,
    /// Radius of an order's ring, canvas px.
    pub(super) radius_px: f64,
    /// Factor by which residual arrows are longer than the residuals.
    pub(super) magnification: f64,
    /// Longest arrow drawn, canvas px.
    longest_px: f64,
}

impl Layout {
    pub(super) fn new(photo: &Photo, measurement: &Measurement, photo_index: usize) -> Self {
        let [width, height] = [photo.width, photo.height].map(|side| u32::try_from(side).map_or(1.0, f64::from).max(1.0));
        let enlarge = index((SMALLEST_SIDE_PX / width.max(height)).ceil(), 16).max(1);
        let side_px = (width * height).sqrt() * f64::from(enlarge);
        let scale = index((side_px / SIDE_PER_SCALE_PX).round(), 100).max(1);
        let unit = f64::from(scale);
        let orders: Vec<OrderRow> = measurement.orders.iter().filter(|order| order.photo == photo_index).copied().collect();
        let spacing_px = neighbour_distance_px(&orders).map_or(side_px / 8.0, |px| px * f64::from(enlarge));
        let arrow_px = (0.35 * spacing_px).clamp(4.0 * unit, 16.0 * unit);
        Self {
            enlarge,
            scale,
            spacing_px,
            radius_px: (0.25 * spacing_px).clamp(2.5 * unit, 9.0 * unit),
            magnification: magnification(&orders, arrow_px / f64::from(enlarge)),
            longest_px: 3.0 * arrow_px,
        }
    }

    /// Canvas pixels of the unit in which marks are drawn.
    pub(super) fn unit(&self) -> f64 {
        f64::from(self.scale)
    }

    /// A place of the photo on the canvas; in both an integer is a pixel centre.
    pub(super) fn place(&self, at: PixelPoint) -> Place {
        [at.x_px, at.y_px].map(|x| (x + 0.5) * f64::from(self.enlarge) - 0.5)
    }

    /// Whether the arrow of an order would be too long for the picture.
    pub(super) fn is_cut(&self, order: &OrderRow) -> bool {
        order.residual_px[0].hypot(order.residual_px[1]) * self.magnification * f64::from(self.enlarge) > self.longest_px
    }

    /// From the spot in the direction seen minus predicted; overlong ones are cut.
    pub(super) fn residual_arrow(&self, order: &OrderRow) -> [Place; 2] {
        let from = self.place(order.at);
        let [dx, dy] = order.residual_px.map(|residual| residual * self.magnification * f64::from(self.enlarge));
        let cut = if self.is_cut(order) { self.longest_px / dx.hypot(dy) } else { 1.0 };
        [from, [from[0] + cut * dx, from[1] + cut * dy]]
    }
}

/// Median distance of an order to its nearest neighbour, photo px; `None` with fewer than two orders.
fn neighbour_distance_px(orders: &[OrderRow]) -> Option<f64> {
    let some = &orders[..orders.len().min(SAMPLED_ORDERS)];
    let nearest = |(i, order): (usize, &OrderRow)| {
        let others = some.iter().enumerate().filter(|&(j, _)| j != i);
        others.map(|(_, other)| order.at.distance_px(other.at)).filter(|px| px.is_finite()).min_by(f64::total_cmp)
    };
    median(some.iter().enumerate().filter_map(nearest).collect())
}

/// The largest of 1, 2, 5, 10 ... that keeps nine of ten arrows of used orders within `longest_px` photo pixels.
fn magnification(orders: &[OrderRow], longest_px: f64) -> f64 {
    let used = orders.iter().filter(|order| order.used).map(|order| order.residual_px[0].hypot(order.residual_px[1]));
    let mut residuals: Vec<f64> = used.filter(|px| px.is_finite()).collect();
    residuals.sort_by(f64::total_cmp);
    let typical = residuals.get(residuals.len() * 9 / 10).copied().unwrap_or(0.0);
    let steps = (0..6).flat_map(|power| [1.0, 2.0, 5.0].map(|step| step * 10f64.powi(power)));
    steps.take_while(|step| step * typical <= longest_px).last().unwrap_or(1.0)
}

fn median(mut values: Vec<f64>) -> Option<f64> {
    values.sort_by(f64::total_cmp);
    values.get(values.len() / 2).copied()
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::{
        photo::{Exif, Samples},
        report::example,
    };

    fn photo(width: usize, height: usize) -> Photo {
        Photo { width, height, channels: 1, samples: Samples::U8(vec![]), exif: Exif::default() }
    }

    #[test]
    fn small_photos_are_enlarged_large_ones_get_larger_marks() {
        let measurement = example::plane();
        let small = Layout::new(&photo(300, 200), &measurement, 0);
        let large = Layout::new(&photo(8000, 6000), &measurement, 0);
        assert_eq!((small.enlarge, large.enlarge), (3, 1));
        assert_eq!((small.scale, large.scale), (1, 10));
    }

    #[test]
    fn places_keep_pixel_centres() {
        let layout = Layout { enlarge: 3, ..Layout::new(&photo(300, 200), &example::plane(), 0) };
        let [x, y] = layout.place(PixelPoint { x_px: 0.0, y_px: 2.0 });
        assert!((x - 1.0).abs() < 1e-12 && (y - 7.0).abs() < 1e-12, "{x} {y}");
    }

    #[test]
    fn arrows_are_magnified_by_a_round_factor_and_cut_when_overlong() {
        let mut measurement = example::plane();
        let layout = Layout::new(&photo(1600, 1200), &measurement, 0);
        assert!((layout.magnification / 200.0 - 1.0).abs() < 1e-12, "{}", layout.magnification);
        measurement.orders[0].residual_px = [1e6, 0.0];
        let [from, to] = layout.residual_arrow(&measurement.orders[0]);
        assert!((to[0] - from[0] - layout.longest_px).abs() < 1e-6);
        let still: Vec<OrderRow> = measurement.orders.iter().map(|order| OrderRow { residual_px: [0.0; 2], ..*order }).collect();
        assert!((magnification(&still, 10.0) / 500_000.0 - 1.0).abs() < 1e-12);
    }
}
