//! How far each spot lies from where the model puts it.

use super::{BLUE, Chart, Drawn, FAINT, INK, LETTERS, ORANGE, VERMILION, reach, svg, tick};
use crate::{
    measure::{Measurement, OrderRow},
    report::significant,
};
use plotters::{element::PathElement, prelude::*};

const HEIGHT: u32 = 320;

/// Residuals to the right and down against the distance from the zero order on the photo, px.
pub(in crate::report::html) fn residuals(measurement: &Measurement) -> Option<Chart> {
    let zero = measurement.zero_order.at;
    let finite = |order: &&OrderRow| order.residual_px.iter().all(|part| part.is_finite());
    let orders: Vec<(f64, &OrderRow)> = measurement
        .orders
        .iter()
        .filter(finite)
        .map(|order| (order.at.distance_px(zero), order))
        .filter(|(distance, _)| distance.is_finite())
        .collect();
    let farthest = orders.iter().map(|(distance, _)| *distance).fold(0.0, f64::max);
    // The spots used set the scale; one far off the others may leave the picture.
    let half = reach(orders.iter().filter(|(_, order)| order.used).map(|(_, order)| order.residual_px), 1e-3);
    if farthest <= 0.0 {
        return None;
    }
    let drawing = svg(HEIGHT, |area| draw(area, &orders, farthest * 1.04, half))?;
    let beyond = orders.iter().filter(|(_, order)| order.residual_px.iter().any(|part| part.abs() > half)).count();
    Some(Chart { svg: drawing, words: words(measurement, &orders, beyond) })
}

fn draw(area: &super::Area<'_>, orders: &[(f64, &OrderRow)], farthest: f64, half: f64) -> Drawn {
    let mut chart =
        ChartBuilder::on(area).margin(8).x_label_area_size(44).y_label_area_size(58).build_cartesian_2d(0.0..farthest, -half..half)?;
    chart
        .configure_mesh()
        .disable_x_mesh()
        .bold_line_style(FAINT)
        .light_line_style(TRANSPARENT)
        .x_labels(5)
        .y_labels(5)
        .x_label_formatter(&tick)
        .y_label_formatter(&tick)
        .x_desc("distance from the zero order, px")
        .y_desc("seen - predicted, px")
        .label_style(("sans-serif", LETTERS, &INK))
        .axis_style(INK)
        .draw()?;
    chart.draw_series([PathElement::new(vec![(0.0, 0.0), (farthest, 0.0)], INK)])?;
    let points = |axis: usize, used: bool| {
        let wanted = orders.iter().filter(move |(_, order)| order.used == used && order.residual_px[axis].abs() <= half);
        wanted.map(move |(distance, order)| (*distance, order.residual_px[axis]))
    };
    chart.draw_series(points(0, true).map(|point| Circle::new(point, 4, BLUE.filled())))?;
    chart.draw_series(points(1, true).map(|point| TriangleMarker::new(point, 6, ORANGE.filled())))?;
    for axis in [0, 1] {
        chart.draw_series(points(axis, false).map(|point| Cross::new(point, 4, VERMILION.stroke_width(2))))?;
    }
    Ok(())
}

fn words(measurement: &Measurement, orders: &[(f64, &OrderRow)], beyond: usize) -> String {
    let left_out = orders.iter().filter(|(_, order)| !order.used).count();
    let mut words = format!(
        "Residuals of {} spots against their distance from the zero order. Dark circles: to the right. Light triangles: down. Crosses: {left_out} spots \
         that were not used. Root mean square of the spots used: {} px.",
        orders.len(),
        significant(measurement.fit.rms_px, 2)
    );
    if beyond > 0 {
        words += &format!(" {beyond} spots lie outside the picture.");
    }
    words + " Without a systematic error the marks scatter about the line, with no trend."
}
