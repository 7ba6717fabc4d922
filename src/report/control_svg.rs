//! A control chart as an SVG file: individuals with their uncertainty above, moving ranges below.

use super::rounding::significant;
use crate::control::{ControlChart, Test};
use plotters::{coord::Shift, drawing::DrawingAreaErrorKind, element::PathElement, prelude::*};

const SIZE: (u32, u32) = (960, 600);
/// Share of the height that the individuals take, percent.
const UPPER_PERCENT: u32 = 66;
const INK: RGBColor = RGBColor(0x1c, 0x23, 0x30);
const FAINT: RGBColor = RGBColor(0xd8, 0xdc, 0xe2);
/// Okabe and Ito's blue and vermilion.
const BLUE: RGBColor = RGBColor(0x00, 0x72, 0xb2);
const VERMILION: RGBColor = RGBColor(0xd5, 0x5e, 0x00);

/// One point of a control chart.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct ControlPoint {
    /// Number of its entry in the log.
    pub entry: u64,
    /// Reading.
    pub value: f64,
    /// Expanded uncertainty, drawn as a bar.
    pub expanded: f64,
}

type Area<'a> = DrawingArea<SVGBackend<'a>, Shift>;
type Drawn = Result<(), DrawingAreaErrorKind<std::io::Error>>;

/// The chart of `points`, from which `chart` was computed; `quantity` with its unit names the axis. A title and a description stand in for the picture.
///
/// `None` when it cannot be drawn: no points, or numbers that are not finite.
#[must_use]
pub fn control_svg(points: &[ControlPoint], chart: &ControlChart, quantity: &str) -> Option<String> {
    let mut svg = String::new();
    {
        let area = SVGBackend::with_string(&mut svg, SIZE).into_drawing_area();
        area.fill(&WHITE).ok()?;
        let (upper, lower) = area.split_vertically(SIZE.1 * UPPER_PERCENT / 100);
        individuals(&upper, points, chart, quantity).ok()?;
        ranges(&lower, chart).ok()?;
        area.present().ok()?;
    }
    let marked = chart.violations.len();
    let words = format!(
        "Control chart of {} readings of {quantity}: mean {}, control limits {} and {}; {marked} signs of an assignable cause.",
        points.len(),
        significant(chart.centre, 6),
        significant(chart.lower, 6),
        significant(chart.upper, 6)
    );
    let (open, rest) = svg.split_at(svg.find('>')? + 1);
    Some(format!("{open}<title>Control chart</title><desc>{}</desc>{rest}", escaped(&words)))
}

fn escaped(text: &str) -> String {
    text.replace('&', "&amp;").replace('<', "&lt;").replace('>', "&gt;")
}

fn individuals(area: &Area<'_>, points: &[ControlPoint], chart: &ControlChart, quantity: &str) -> Drawn {
    let ends = points.iter().flat_map(|point| [point.value - point.expanded, point.value + point.expanded]);
    let all = || ends.clone().chain([chart.lower, chart.upper]);
    let (low, high) = (all().fold(f64::INFINITY, f64::min), all().fold(f64::NEG_INFINITY, f64::max));
    let room = 0.08 * (high - low);
    let mut plot = ChartBuilder::on(area)
        .margin(10)
        .x_label_area_size(24)
        .y_label_area_size(90)
        .build_cartesian_2d(-0.6..points.len() as f64 - 0.4, (low - room)..(high + room))?;
    let entry = |index: &f64| entry_at(points, *index);
    plot.configure_mesh()
        .disable_x_mesh()
        .bold_line_style(FAINT)
        .light_line_style(TRANSPARENT)
        .x_labels(10)
        .y_labels(6)
        .x_label_formatter(&entry)
        .y_label_formatter(&|value| significant(*value, 7))
        .y_desc(quantity)
        .label_style(("sans-serif", 14, &INK))
        .axis_style(INK)
        .draw()?;
    let across = |value: f64| vec![(-0.6, value), (points.len() as f64 - 0.4, value)];
    plot.draw_series([PathElement::new(across(chart.centre), INK.stroke_width(1))])?;
    for limit in [chart.lower, chart.upper] {
        plot.draw_series(dashes(points.len(), limit).map(|dash| PathElement::new(dash, VERMILION.stroke_width(2))))?;
    }
    let places: Vec<(f64, f64)> = points.iter().enumerate().map(|(i, point)| (i as f64, point.value)).collect();
    let bars = points
        .iter()
        .enumerate()
        .map(|(i, point)| vec![(i as f64, point.value - point.expanded), (i as f64, point.value + point.expanded)]);
    plot.draw_series(bars.map(|bar| PathElement::new(bar, FAINT.stroke_width(3))))?;
    plot.draw_series([PathElement::new(places.clone(), BLUE.stroke_width(1))])?;
    let is_marked = |i: usize| chart.violations.iter().any(|violation| violation.test != Test::Range && violation.last == i);
    plot.draw_series(places.iter().enumerate().filter(|(i, _)| !is_marked(*i)).map(|(_, place)| Circle::new(*place, 4, BLUE.filled())))?;
    plot.draw_series(
        places.iter().enumerate().filter(|(i, _)| is_marked(*i)).map(|(_, place)| TriangleMarker::new(*place, 8, VERMILION.filled())),
    )?;
    Ok(())
}

fn ranges(area: &Area<'_>, chart: &ControlChart) -> Drawn {
    let high = chart.ranges.iter().copied().fold(chart.range_upper, f64::max) * 1.08;
    let count = chart.ranges.len() + 1;
    let mut plot = ChartBuilder::on(area)
        .margin(10)
        .x_label_area_size(8)
        .y_label_area_size(90)
        .build_cartesian_2d(-0.6..count as f64 - 0.4, 0.0..high)?;
    plot.configure_mesh()
        .disable_x_mesh()
        .disable_x_axis()
        .bold_line_style(FAINT)
        .light_line_style(TRANSPARENT)
        .y_labels(4)
        .y_label_formatter(&|value| significant(*value, 4))
        .y_desc("moving range")
        .label_style(("sans-serif", 14, &INK))
        .axis_style(INK)
        .draw()?;
    plot.draw_series([PathElement::new(vec![(-0.6, chart.range_centre), (count as f64 - 0.4, chart.range_centre)], INK.stroke_width(1))])?;
    plot.draw_series(dashes(count, chart.range_upper).map(|dash| PathElement::new(dash, VERMILION.stroke_width(2))))?;
    let places: Vec<(f64, f64)> = chart.ranges.iter().enumerate().map(|(i, range)| ((i + 1) as f64, *range)).collect();
    plot.draw_series([PathElement::new(places.clone(), BLUE.stroke_width(1))])?;
    plot.draw_series(places.iter().filter(|place| place.1 <= chart.range_upper).map(|place| Circle::new(*place, 3, BLUE.filled())))?;
    plot.draw_series(
        places.iter().filter(|place| place.1 > chart.range_upper).map(|place| TriangleMarker::new(*place, 8, VERMILION.filled())),
    )?;
    Ok(())
}

/// A dashed line across the chart.
fn dashes(count: usize, value: f64) -> impl Iterator<Item = Vec<(f64, f64)>> {
    const DASHES: u32 = 60;
    let step = count as f64 / f64::from(DASHES);
    (0..DASHES).map(move |i| {
        let start = -0.6 + f64::from(i) * step;
        vec![(start, value), (start + 0.6 * step, value)]
    })
}

/// Number of the entry at a whole place of the axis.
#[expect(clippy::cast_possible_truncation, clippy::cast_sign_loss, reason = "a whole number within the points, or none")]
fn entry_at(points: &[ControlPoint], index: f64) -> String {
    let whole = index.round();
    if (index - whole).abs() > 1e-6 || whole < 0.0 {
        return String::new();
    }
    points.get(whole as usize).map(|point| point.entry.to_string()).unwrap_or_default()
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::control::individuals as computed;

    #[test]
    fn draws_every_reading_and_describes_itself() {
        let values = [10.0, 10.2, 9.9, 10.1, 10.0, 13.0];
        let points: Vec<ControlPoint> = (1..).zip(values).map(|(entry, value)| ControlPoint { entry, value, expanded: 0.1 }).collect();
        let svg = control_svg(&points, &computed(&values).unwrap(), "pitch <1>, µm").unwrap();
        assert!(svg.contains("6 readings of pitch &lt;1&gt;, µm") && !svg.contains("<1>"), "{svg}");
        assert!(svg.matches("<circle").count() >= 5);
    }
}
