//! The pattern in reciprocal space, with the limit beyond which no order leaves the sample.

use super::{BLUE, Chart, Drawn, FAINT, INK, LETTERS, SOFT, VERMILION, reach, svg, tick};
use crate::{
    measure::{Measurement, OrderRow, ReciprocalView},
    report::{significant, units::LINES_PER_MILLIMETRE},
};
use plotters::{
    element::PathElement,
    prelude::*,
    style::text_anchor::{HPos, Pos, VPos},
};

/// Most lattice points drawn along each direction from the zero order.
const MOST_STEPS: i32 = 40;

/// Corners of the circle.
const CORNERS: u32 = 180;

type Plane = Cartesian2d<plotters::coord::types::RangedCoordf64, plotters::coord::types::RangedCoordf64>;
type Chart2d<'a, 'b> = ChartContext<'a, SVGBackend<'b>, Plane>;

/// Orders of the sample's photos as points h g1 + k g2, seen along the beam, in lines per millimetre.
pub(in crate::report::html) fn reciprocal(measurement: &Measurement) -> Option<Chart> {
    let view = &measurement.reciprocal;
    let orders: Vec<&OrderRow> = measurement.orders.iter().collect();
    let seen = orders.iter().filter_map(|order| place(view, order.h, order.k));
    let vectors = (0..view.vectors_per_m.len()).filter_map(|vector| place(view, i32::from(vector == 0), i32::from(vector == 1)));
    let orders_reach = reach(seen.chain(vectors), 0.0);
    if !(orders_reach > 0.0 && orders_reach.is_finite()) {
        return None;
    }
    let limit = Limit::of(view)?;
    // A limit not far outside the orders is shown whole; one far out would make the pattern a blot.
    let whole = reach(limit.corners(), 0.0);
    let half = if whole < 1.6 * orders_reach { whole } else { orders_reach };
    let drawing = svg(super::WIDTH, |area| draw(area, view, &orders, &limit, half))?;
    Some(Chart { svg: drawing, words: words(view, &orders, &limit, half) })
}

/// The Ewald limit: centre and radius, lines per millimetre.
struct Limit {
    centre: [f64; 2],
    radius: f64,
}

impl Limit {
    fn of(view: &ReciprocalView) -> Option<Self> {
        let per_mm = LINES_PER_MILLIMETRE.per_si / view.wavelength_m;
        per_mm.is_finite().then(|| Self { centre: view.zero_order.map(|part| -part * per_mm), radius: per_mm })
    }

    /// Whether any of the circle lies in the square view.
    fn is_in(&self, half: f64) -> bool {
        self.corners().any(|corner| corner.iter().all(|part| part.abs() < half))
    }

    fn corners(&self) -> impl Iterator<Item = [f64; 2]> {
        (0..=CORNERS).map(|corner| {
            let (sin, cos) = (f64::from(corner) * std::f64::consts::TAU / f64::from(CORNERS)).sin_cos();
            [self.centre[0] + self.radius * cos, self.centre[1] + self.radius * sin]
        })
    }
}

fn place(view: &ReciprocalView, h: i32, k: i32) -> Option<[f64; 2]> {
    let first = view.vectors_per_m.first()?;
    let second = view.vectors_per_m.get(1).copied().unwrap_or([0.0; 2]);
    let part = |axis: usize| (f64::from(h) * first[axis] + f64::from(k) * second[axis]) * LINES_PER_MILLIMETRE.per_si;
    Some([part(0), part(1)])
}

fn draw(area: &super::Area<'_>, view: &ReciprocalView, orders: &[&OrderRow], limit: &Limit, half: f64) -> Drawn {
    let mut chart =
        ChartBuilder::on(area).margin(8).x_label_area_size(44).y_label_area_size(58).build_cartesian_2d(-half..half, -half..half)?;
    chart
        .configure_mesh()
        .disable_mesh()
        .x_labels(5)
        .y_labels(5)
        .x_label_formatter(&tick)
        .y_label_formatter(&tick)
        .x_desc("to the right, lines per mm")
        .y_desc("up, lines per mm")
        .label_style(("sans-serif", LETTERS, &INK))
        .axis_style(INK)
        .draw()?;
    if limit.is_in(half) {
        let circle: Vec<(f64, f64)> = limit.corners().map(|corner| (corner[0], corner[1])).collect();
        let is_in = |ends: &&[(f64, f64)]| ends.iter().all(|(x, y)| x.abs() < half && y.abs() < half);
        chart.draw_series(circle.windows(2).filter(is_in).map(|ends| PathElement::new(ends.to_vec(), VERMILION.stroke_width(2))))?;
    }
    draw_lattice(&mut chart, view, limit, half)?;
    draw_orders(&mut chart, view, orders)
}

/// Lattice points where an order could stand, as faint dots.
fn draw_lattice(chart: &mut Chart2d<'_, '_>, view: &ReciprocalView, limit: &Limit, half: f64) -> Drawn {
    let rows = if view.vectors_per_m.len() > 1 { -MOST_STEPS..=MOST_STEPS } else { 0..=0 };
    let points = rows.flat_map(|k| (-MOST_STEPS..=MOST_STEPS).map(move |h| (h, k))).filter_map(|(h, k)| place(view, h, k));
    let propagates = |point: &[f64; 2]| (point[0] - limit.centre[0]).hypot(point[1] - limit.centre[1]) < limit.radius;
    let shown = points.filter(|point| point.iter().all(|part| part.abs() < half)).filter(propagates);
    chart.draw_series(shown.map(|point| Circle::new((point[0], point[1]), 2, FAINT.filled()))).map(drop)
}

fn draw_orders(chart: &mut Chart2d<'_, '_>, view: &ReciprocalView, orders: &[&OrderRow]) -> Drawn {
    let points = |used: bool| {
        let wanted = orders.iter().filter(move |order| order.used == used);
        wanted.filter_map(|order| place(view, order.h, order.k)).map(|point| (point[0], point[1]))
    };
    chart.draw_series(points(true).map(|point| Circle::new(point, 4, BLUE.filled())))?;
    chart.draw_series(points(false).map(|point| Cross::new(point, 5, VERMILION.stroke_width(2))))?;
    chart.draw_series([Circle::new((0.0, 0.0), 9, INK.stroke_width(2))])?;
    for (vector, name) in [(0, "(1,0)"), (1, "(0,1)")].into_iter().take(view.vectors_per_m.len()) {
        let Some(tip) = place(view, i32::from(vector == 0), i32::from(vector == 1)) else { continue };
        let (x, y) = (tip[0], tip[1]);
        chart.draw_series([PathElement::new(vec![(0.0, 0.0), (x, y)], INK.stroke_width(2))])?;
        // Beyond the tip, on the side that it points to.
        let pos = match (x < 0.0, y < 0.0) {
            (true, true) => Pos::new(HPos::Right, VPos::Top),
            (true, false) => Pos::new(HPos::Right, VPos::Bottom),
            (false, true) => Pos::new(HPos::Left, VPos::Top),
            (false, false) => Pos::new(HPos::Left, VPos::Bottom),
        };
        let away = [if x < 0.0 { -6 } else { 6 }, if y < 0.0 { 6 } else { -6 }];
        let style = ("sans-serif", LETTERS).into_font().color(&SOFT).pos(pos);
        chart.draw_series([EmptyElement::at((x, y)) + Text::new(name, (away[0], away[1]), style)])?;
    }
    Ok(())
}

fn words(view: &ReciprocalView, orders: &[&OrderRow], limit: &Limit, half: f64) -> String {
    let used = orders.iter().filter(|order| order.used).count();
    let radius = significant(limit.radius, 4);
    let limit_words = if limit.is_in(half) {
        format!("The circle is the Ewald limit, radius 1/λ = {radius} lines per mm: beyond it no order leaves the sample.")
    } else {
        format!("The Ewald limit (radius 1/λ = {radius} lines per mm, beyond which no order leaves the sample) lies outside the picture.")
    };
    let kind = if view.vectors_per_m.len() > 1 { "plane lattice" } else { "row of orders" };
    format!(
        "Reciprocal space of the sample, seen along the beam: a {kind}. Ring: zero order. Filled circles: {used} orders used. Crosses: {} orders \
         seen but not used. Faint dots: places where an order could stand. Lines: the vectors of the orders (1,0) and (0,1). {limit_words}",
        orders.len() - used
    )
}
