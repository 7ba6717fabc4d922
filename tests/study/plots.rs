//! Two plots: how the pulls are spread, and how often the intervals hold the truth.

use super::{
    classes::CLASSES,
    tally::{Case, count},
};
use plotters::prelude::*;

const SIZE: (u32, u32) = (760, 420);
const STEP: f64 = 0.25;

/// Histogram of z = (found − true) / u with the normal density.
pub(crate) fn pulls(cases: &[Case]) -> String {
    let z: Vec<f64> = cases.iter().flat_map(Case::pulls).map(|pull| pull.z).collect();
    let density = |low: f64| z.iter().filter(|z| (low..low + STEP).contains(*z)).count() as f64 / (STEP * z.len().max(1) as f64);
    let normal = |z: f64| (-0.5 * z * z).exp() / (2.0 * std::f64::consts::PI).sqrt();
    let bins = (-16..16).map(|i| f64::from(i) * STEP);
    let mut text = String::new();
    {
        let root = SVGBackend::with_string(&mut text, SIZE).into_drawing_area();
        root.fill(&WHITE).unwrap();
        let title = format!("(found - true) / u of {} values; line: standard normal", z.len());
        let mut chart = ChartBuilder::on(&root)
            .caption(title, ("sans-serif", 18))
            .margin(12)
            .x_label_area_size(40)
            .y_label_area_size(50)
            .build_cartesian_2d(-4.0..4.0, 0.0..0.6)
            .unwrap();
        chart.configure_mesh().disable_mesh().x_desc("(found - true) / u").y_desc("density").draw().unwrap();
        chart
            .draw_series(bins.map(|low| Rectangle::new([(low, 0.0), (low + STEP, density(low))], RGBColor(150, 150, 150).filled())))
            .unwrap();
        chart
            .draw_series(LineSeries::new((-160..=160).map(|i| f64::from(i) / 40.0).map(|z| (z, normal(z))), BLACK.stroke_width(2)))
            .unwrap();
        root.present().unwrap();
    }
    text
}

/// Share of intervals that hold the truth, per class, with two standard deviations of the binomial law around the nominal share.
pub(crate) fn coverage(cases: &[Case]) -> String {
    let nominal = 95.45;
    let mut text = String::new();
    {
        let root = SVGBackend::with_string(&mut text, SIZE).into_drawing_area();
        root.fill(&WHITE).unwrap();
        let rows = CLASSES.len() as f64;
        let mut chart = ChartBuilder::on(&root)
            .caption("Intervals U that hold the truth; bars: 95.45 % and two standard deviations by chance", ("sans-serif", 18))
            .margin(12)
            .x_label_area_size(40)
            .y_label_area_size(20)
            .build_cartesian_2d(60.0..104.0, 0.0..rows)
            .unwrap();
        chart.configure_mesh().disable_mesh().disable_y_axis().x_desc("share of values inside value ± U, %").draw().unwrap();
        for (i, (class, _)) in CLASSES.iter().enumerate() {
            let count = count(cases.iter().filter(|case| case.class == *class));
            let (y, n) = (rows - 0.5 - i as f64, count.values.max(1) as f64);
            let half = 2.0 * (nominal * (100.0 - nominal) / n).sqrt();
            let share = 100.0 * count.inside as f64 / n;
            let bar = Rectangle::new([(nominal - half, y - 0.3), ((nominal + half).min(100.0), y + 0.3)], RGBColor(205, 205, 205).filled());
            chart.draw_series([bar]).unwrap();
            chart.draw_series([Circle::new((share, y), 5, BLACK.filled())]).unwrap();
            chart.draw_series([Text::new((*class).to_owned(), (61.0, y + 0.25), ("sans-serif", 14))]).unwrap();
        }
        root.present().unwrap();
    }
    text
}
