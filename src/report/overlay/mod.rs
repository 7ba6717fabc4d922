//! The photo with everything that was found in it: orders, rejected spots, residuals, zero order, axes, and a legend.

mod canvas;
mod face;
mod ground;
mod labels;
mod legend;
mod marks;
#[cfg(test)]
mod scene;
mod spacing;

use image::{
    RgbImage,
    codecs::png::{CompressionType, FilterType, PngEncoder},
};

use self::{
    canvas::{Canvas, Place},
    labels::{Crowded, Occupied},
    legend::Entry,
    marks::{Mark, arrow},
    spacing::Layout,
};
use super::{
    columns::shortened,
    rounding::{rounded, significant},
    units,
    words::{NO_CERTIFICATE, numbered, pattern_name, reason_counts},
};
use crate::{
    frames::PixelPoint,
    measure::{Measurement, OrderRow, Value},
    photo::Photo,
};

/// Longest reason written beside a rejected spot.
const REASON_WIDTH: usize = 26;

/// Orders up to this far from the zero order (|h| + |k|) are labelled even where it is crowded.
const ALWAYS_LABELLED: u64 = 2;

/// Reasons for rejected spots in the legend; the JSON lists every spot.
const REASONS_SHOWN: usize = 4;

/// The photo, dimmed, with marks on it and a legend strip below.
///
/// `photo` must be the one that `measurement` calls `photo_index`. Photos below 900 px are enlarged by a whole factor; else the pixels of the photo
/// keep their places. What lies outside the frame is left out.
#[must_use]
pub fn overlay(photo: &Photo, measurement: &Measurement, photo_index: usize) -> RgbImage {
    let layout = Layout::new(photo, measurement, photo_index);
    let mut canvas = Canvas::new(ground::ground(photo, layout.enlarge), layout.scale);
    let size_px = [f64::from(canvas.image.width()), f64::from(canvas.image.height())];
    let mut scene = Scene { occupied: Occupied::new(size_px, layout.unit()), layout, measurement, photo_index };
    scene.draw_axes(&mut canvas);
    scene.draw_marks(&mut canvas);
    scene.draw_residuals(&mut canvas);
    scene.label_zero_order_and_axes(&mut canvas);
    scene.label_orders(&mut canvas);
    scene.label_rejected(&mut canvas);
    legend::with_strip(&canvas.image, scene.layout.scale, &scene.legend())
}

/// A picture as the bytes of a PNG file.
///
/// # Errors
/// When the picture has no pixels or is larger than the format allows.
pub fn png(picture: &RgbImage) -> Result<Vec<u8>, image::ImageError> {
    let mut bytes = vec![];
    // The ground has few greys: unfiltered they pack better than their differences.
    picture.write_with_encoder(PngEncoder::new_with_quality(&mut bytes, CompressionType::Default, FilterType::NoFilter))?;
    Ok(bytes)
}

struct Scene<'a> {
    occupied: Occupied,
    layout: Layout,
    measurement: &'a Measurement,
    photo_index: usize,
}

impl Scene<'_> {
    fn orders(&self) -> impl Iterator<Item = &OrderRow> + use<'_> {
        self.measurement.orders.iter().filter(|order| order.photo == self.photo_index)
    }

    fn is_line(&self) -> bool {
        pattern_name(&self.measurement.sample) == "line"
    }

    /// Whether a label is about as wide as the distance between spots, so that most labels would cover others.
    fn is_dense(&self, canvas: &Canvas) -> bool {
        canvas.letters_size("(1,-1)")[0] + 2.0 * self.layout.radius_px > 1.2 * self.layout.spacing_px
    }

    /// Without the label of this order the indexing could not be read; in a dense pattern one order per axis must do.
    fn is_essential(&self, order: &OrderRow, is_dense: bool) -> bool {
        if is_dense { matches!((order.h, order.k), (1, 0) | (0, 1)) } else { rank(order) <= ALWAYS_LABELLED }
    }

    fn zero_order(&self) -> Option<Place> {
        zero_order(self.measurement, self.photo_index).map(|at| self.layout.place(at))
    }

    /// From the zero order to beyond the first order of each axis: start and tip.
    fn axes(&self) -> Vec<[Place; 2]> {
        let Some(zero) = self.zero_order() else { return vec![] };
        let firsts = self.measurement.photos.get(self.photo_index).map(|photo| photo.axes_px.as_slice()).unwrap_or_default();
        let axis = |&first: &PixelPoint| {
            let first = self.layout.place(first);
            let step = [first[0] - zero[0], first[1] - zero[1]];
            let length = step[0].hypot(step[1]);
            // At least as long as can be seen, and ending between two orders.
            let orders = 0.5 + (60.0 * self.layout.unit() / length).ceil().max(1.0);
            let start = 1.6 * self.layout.radius_px / length;
            let at = |t: f64| [zero[0] + t * step[0], zero[1] + t * step[1]];
            (length > 1.0 && length.is_finite()).then(|| [at(start), at(orders)])
        };
        firsts.iter().filter_map(axis).collect()
    }

    fn draw_axes(&mut self, canvas: &mut Canvas) {
        for [start, tip] in self.axes() {
            arrow(canvas, Mark::Axis, start, tip);
            self.occupied.take_line(start, tip);
        }
    }

    fn draw_marks(&mut self, canvas: &mut Canvas) {
        let radius_px = self.layout.radius_px;
        let mut marks: Vec<(Mark, Place)> = self.orders().map(|order| (mark_of(order), self.layout.place(order.at))).collect();
        let rejected = self.measurement.rejected.iter().filter(|spot| spot.photo == self.photo_index);
        marks.extend(rejected.map(|spot| (Mark::Rejected, self.layout.place(spot.at))));
        marks.extend(self.zero_order().map(|at| (Mark::ZeroOrder, at)));
        for (mark, at) in marks {
            let radius_px = if mark == Mark::Rejected { 0.8 * radius_px } else { radius_px };
            mark.draw(canvas, at, radius_px);
            let reach = match mark {
                Mark::ZeroOrder => radius_px * marks::ZERO_ORDER_TICKS[1],
                Mark::UsedClipped => radius_px + 4.0 * self.layout.unit(),
                _ => radius_px + self.layout.unit(),
            };
            self.occupied.take([at[0] - reach, at[1] - reach], [at[0] + reach, at[1] + reach]);
        }
    }

    fn draw_residuals(&mut self, canvas: &mut Canvas) {
        let arrows: Vec<[Place; 2]> = self.orders().map(|order| self.layout.residual_arrow(order)).collect();
        for [from, to] in arrows {
            arrow(canvas, Mark::Residual, from, to);
            self.occupied.take_line(from, to);
        }
    }

    fn label_zero_order_and_axes(&mut self, canvas: &mut Canvas) {
        let names: &[&str] = if self.is_line() { &["m"] } else { &["h", "k"] };
        for ([_, tip], name) in self.axes().into_iter().zip(names) {
            self.label(canvas, name, Spot { at: tip, gap_px: 3.0 * self.layout.unit(), mark: Mark::Axis }, Crowded::LeastCovered);
        }
        let text =
            if self.measurement.zero_order.seen || self.measurement.photos.len() > 1 { "zero order" } else { "zero order (not seen)" };
        if let Some(at) = self.zero_order() {
            let gap_px = self.layout.radius_px * marks::ZERO_ORDER_TICKS[1] + 2.0 * self.layout.unit();
            let crowded = if self.is_dense(canvas) { Crowded::Skip } else { Crowded::LeastCovered };
            self.label(canvas, text, Spot { at, gap_px, mark: Mark::ZeroOrder }, crowded);
        }
    }

    /// Inner orders first: they tell the indexing.
    fn label_orders(&mut self, canvas: &mut Canvas) {
        let (is_line, is_dense) = (self.is_line(), self.is_dense(canvas));
        let mut orders: Vec<OrderRow> = self.orders().filter(|order| (order.h, order.k) != (0, 0)).copied().collect();
        orders.sort_by_key(|order| (rank(order), order.h, order.k));
        for order in orders {
            let text = if is_line { format!("{:+}", order.h) } else { format!("({},{})", order.h, order.k) };
            let mark = mark_of(&order);
            let gap_px = self.layout.radius_px + self.layout.unit() * if mark == Mark::UsedClipped { 6.0 } else { 3.0 };
            let crowded = if self.is_essential(&order, is_dense) { Crowded::LeastCovered } else { Crowded::Skip };
            self.label(canvas, &text, Spot { at: self.layout.place(order.at), gap_px, mark }, crowded);
        }
    }

    fn label_rejected(&mut self, canvas: &mut Canvas) {
        let (measurement, photo_index) = (self.measurement, self.photo_index);
        for spot in measurement.rejected.iter().filter(|spot| spot.photo == photo_index) {
            let gap_px = self.layout.radius_px + 3.0 * self.layout.unit();
            let text = shortened(&spot.reason, REASON_WIDTH);
            self.label(canvas, &text, Spot { at: self.layout.place(spot.at), gap_px, mark: Mark::Rejected }, Crowded::Skip);
        }
    }

    /// The arrow with its magnification; nothing where no order has a residual to show.
    fn residual_meaning(&self) -> Option<Entry> {
        let times = significant(self.layout.magnification, 3);
        let cut = if self.orders().any(|order| self.layout.is_cut(order)) { ", overlong ones cut" } else { "" };
        let text = format!("residual, seen minus predicted, {times} times magnified{cut}");
        let is_shown = self.orders().any(|order| order.residual_px[0].hypot(order.residual_px[1]) > 0.0);
        is_shown.then_some(Entry { mark: Some(Mark::Residual), text })
    }

    /// The cross with the number of rejected spots and their commonest reasons.
    fn rejected_meaning(&self) -> Option<Entry> {
        let reasons = reason_counts(self.measurement.rejected.iter().filter(|spot| spot.photo == self.photo_index));
        let count: usize = reasons.iter().map(|(_, count)| count).sum();
        let times = |count: usize| if count > 1 { format!("{count} × ") } else { String::new() };
        let mut words: Vec<String> = reasons.iter().take(REASONS_SHOWN).map(|&(reason, count)| times(count) + reason).collect();
        if reasons.len() > REASONS_SHOWN {
            words.push(format!("{} more reasons", reasons.len() - REASONS_SHOWN));
        }
        (count > 0).then(|| Entry { mark: Some(Mark::Rejected), text: format!("no order: {count} ({})", words.join("; ")) })
    }

    fn label(&mut self, canvas: &mut Canvas, text: &str, spot: Spot, crowded: Crowded) {
        let size_px = canvas.letters_size(text);
        if let Some(at) = self.occupied.place(spot.at, size_px, spot.gap_px, crowded) {
            canvas.letters(text, at, spot.mark.colour());
        }
    }

    fn legend(&self) -> Vec<Entry> {
        let sample = &self.measurement.sample;
        let line = |text: String| Entry { mark: None, text };
        let mut entries = vec![];
        for (i, &pitch_m) in sample.pitch_m.iter().enumerate() {
            entries.push(line(result_line(&numbered("pitch", i, sample.pitch_m.len()), pitch_m, units::for_pitch(pitch_m.value))));
        }
        entries.extend(sample.lattice_angle_rad.map(|angle| line(result_line("lattice angle", angle, units::DEGREE))));
        entries.extend(self.mark_meanings());
        if self.layout.enlarge > 1 {
            entries.push(line(format!("The photo is enlarged {} times.", self.layout.enlarge)));
        }
        entries.push(line(NO_CERTIFICATE.to_owned()));
        entries
    }

    /// Only the marks that occur, with their number.
    fn mark_meanings(&self) -> Vec<Entry> {
        let mut entries = vec![];
        for (mark, meaning) in [
            (Mark::Used, if self.is_line() { "order m, used" } else { "order (h,k), used" }),
            (Mark::UsedClipped, "order, used, core clipped"),
            (Mark::Unused, "order, not used"),
        ] {
            let count = self.orders().filter(|order| mark_of(order) == mark).count();
            if count > 0 {
                entries.push(Entry { mark: Some(mark), text: format!("{meaning}: {count}") });
            }
        }
        entries.extend(self.rejected_meaning());
        if self.zero_order().is_some() {
            entries.push(Entry { mark: Some(Mark::ZeroOrder), text: "zero order".to_owned() });
            let axis = if self.is_line() { "direction of the orders" } else { "axes of the lattice" };
            entries.push(Entry { mark: Some(Mark::Axis), text: axis.to_owned() });
        }
        entries.extend(self.residual_meaning());
        entries
    }
}

/// A spot to label: its place, the distance that the label keeps, and the mark whose colour it takes.
#[derive(Clone, Copy)]
struct Spot {
    at: Place,
    gap_px: f64,
    mark: Mark,
}

fn mark_of(order: &OrderRow) -> Mark {
    match (order.used, order.clipped) {
        (true, false) => Mark::Used,
        (true, true) => Mark::UsedClipped,
        (false, _) => Mark::Unused,
    }
}

/// |h| + |k|: how far out an order lies.
fn rank(order: &OrderRow) -> u64 {
    u64::from(order.h.unsigned_abs()) + u64::from(order.k.unsigned_abs())
}

/// Where the zero order lies in a photo: its spot, or for the only photo the place from the fit.
fn zero_order(measurement: &Measurement, photo_index: usize) -> Option<PixelPoint> {
    let spot = measurement.orders.iter().find(|order| order.photo == photo_index && (order.h, order.k) == (0, 0));
    let fitted = (measurement.photos.len() <= 1).then_some(measurement.zero_order.at);
    fitted.or(spot.map(|spot| spot.at))
}

fn result_line(name: &str, si: Value, unit: units::Unit) -> String {
    let value = unit.of(si);
    let shown = rounded(value.value, value.expanded());
    let suffix = unit.suffix();
    if value.u <= 0.0 {
        return format!("{name} = {}{suffix} (exact)", shown.value);
    }
    format!("{name} = {}{suffix}, U = {}{suffix} (k = {:.2}, about 95 %)", shown.value, shown.u, value.coverage_factor)
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::{
        photo::{Exif, Samples},
        report::example,
    };

    /// Draws a scene and, where `SPOTRULE_PICTURES` names a folder, leaves the picture there to be looked at.
    fn draw(name: &str, photo: &Photo, measurement: &Measurement) -> RgbImage {
        let picture = overlay(photo, measurement, 0);
        if let Some(folder) = std::env::var_os("SPOTRULE_PICTURES").filter(|folder| !folder.is_empty()) {
            std::fs::write(std::path::Path::new(&folder).join(format!("{name}.png")), png(&picture).unwrap()).unwrap();
        }
        picture
    }

    #[test]
    fn scenes_of_every_size_are_drawn() {
        for (name, width) in [("tiny", 300), ("usual", 1600), ("large", 4000)] {
            let (photo, measurement) = scene::hexagonal(width);
            let picture = draw(name, &photo, &measurement);
            assert!(usize::try_from(picture.width()).unwrap() >= width && picture.height() > picture.width() / 2);
        }
        let (photo, measurement) = scene::dense(1600);
        draw("dense", &photo, &measurement);
        let (photo, measurement) = scene::line(1600);
        draw("line", &photo, &measurement);
    }

    #[test]
    fn each_kind_of_finding_changes_the_picture_near_its_spot() {
        let (photo, measurement) = scene::hexagonal(1600);
        let bare = ground::ground(&photo, 1);
        let picture = overlay(&photo, &measurement, 0);
        let places = measurement.orders.iter().map(|order| order.at).chain(measurement.rejected.iter().map(|spot| spot.at));
        for at in places {
            let [x, y] = [at.x_px, at.y_px].map(|x| canvas::index(x.round(), 1500));
            let changed = (0..60).any(|dx| bare.get_pixel(x + dx, y) != picture.get_pixel(x + dx, y));
            assert!(changed, "no mark at {at:?}");
        }
    }

    #[test]
    fn nothing_panics_out_of_the_frame_or_without_a_photo() {
        let empty = Photo { width: 0, height: 0, channels: 1, samples: Samples::U8(vec![]), exif: Exif::default() };
        let mut measurement = example::plane();
        assert!(png(&overlay(&empty, &measurement, 0)).is_ok());
        for far in [-1e9, 1e9, 1e300, f64::NAN, f64::INFINITY] {
            measurement.orders[0].at.x_px = far;
            measurement.orders[1].residual_px = [far, far];
            measurement.rejected[0].at.y_px = far;
            measurement.zero_order.at.x_px = far;
            measurement.photos[0].axes_px[0].y_px = far;
            let (photo, _) = scene::hexagonal(300);
            for index in [0, 7] {
                assert!(overlay(&photo, &measurement, index).height() > 225);
            }
        }
    }
}
