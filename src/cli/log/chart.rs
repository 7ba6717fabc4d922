//! `spotrule log chart`.

use super::{
    arguments::{ChartArguments, ChartedValue},
    filter,
};
use crate::{
    cli::{
        Failure, failure,
        files::{self, Existing},
    },
    control::{ControlChart, FEWEST, individuals},
    log::{Entry, Log, Reading},
    report::{ControlPoint, control_svg, significant},
};
use std::{collections::BTreeSet, fmt::Write, process::ExitCode};

/// Limits from fewer readings are provisional (common practice).
const SETTLED: usize = 20;

/// Entries read at a time.
const PAGE: usize = 500;

pub(super) fn chart(arguments: &ChartArguments) -> Result<ExitCode, Failure> {
    let found = newest(arguments)?;
    let readings: Vec<(u64, &Reading)> = found.iter().filter_map(|entry| Some((entry.entry, charted(entry, arguments.value)?))).collect();
    let points: Vec<ControlPoint> =
        readings.iter().map(|(entry, reading)| ControlPoint { entry: *entry, value: reading.value, expanded: reading.expanded }).collect();
    let values: Vec<f64> = points.iter().map(|point| point.value).collect();
    let Some(chart) = individuals(&values) else {
        files::print(&format!("{} readings fit, a chart needs {FEWEST} that are not all equal; widen the filter\n", values.len()))?;
        return Ok(ExitCode::from(failure::REFUSED));
    };
    let unit = readings.first().map_or("", |(_, reading)| reading.unit.as_str());
    let quantity = format!("{}, {}", name(arguments.value), if unit == "um" { "µm" } else { unit });
    let unwritable = || Failure::Unwritable { path: arguments.out.clone(), cause: std::io::Error::other("the chart cannot be drawn") };
    let svg = control_svg(&points, &chart, &quantity).ok_or_else(unwritable)?;
    files::write(&arguments.out, svg.as_bytes(), Existing::Replaced)?;
    files::print(&summary(&points, &chart, &quantity))?;
    let samples: BTreeSet<&str> = found.iter().map(|entry| entry.sample.as_str()).collect();
    if samples.len() > 1 {
        files::print(&format!(
            "to note: {} names of samples among the entries; a chart means something for one sample: --sample\n",
            samples.len()
        ))?;
    }
    Ok(ExitCode::SUCCESS)
}

/// The newest entries that have the value and were not corrected, oldest first; page by page, so that a long log costs no more than a short one.
fn newest(arguments: &ChartArguments) -> Result<Vec<Entry>, Failure> {
    let log = Log::read(&arguments.log)?;
    let mut wanted = filter::filter(&arguments.filter)?;
    let mut entries = Vec::new();
    while entries.len() < arguments.last {
        let page = log.list(&wanted, PAGE)?;
        let Some(oldest) = page.last() else { break };
        wanted.below = Some(oldest.entry.entry);
        let sound = page.into_iter().filter(|listed| listed.corrected_by.is_none()).map(|listed| listed.entry);
        entries.extend(sound.filter(|entry| charted(entry, arguments.value).is_some()));
    }
    entries.truncate(arguments.last);
    entries.reverse();
    Ok(entries)
}

fn charted(entry: &Entry, value: ChartedValue) -> Option<&Reading> {
    match value {
        ChartedValue::FirstPitch => entry.pitch.first(),
        ChartedValue::SecondPitch => entry.pitch.get(1),
        ChartedValue::Angle => entry.lattice_angle.as_ref(),
    }
}

fn name(value: ChartedValue) -> &'static str {
    match value {
        ChartedValue::FirstPitch => "pitch 1",
        ChartedValue::SecondPitch => "pitch 2",
        ChartedValue::Angle => "lattice angle",
    }
}

fn summary(points: &[ControlPoint], chart: &ControlChart, quantity: &str) -> String {
    let shown = |value: f64| significant(value, 7);
    let mut text = format!(
        "{quantity}: {} readings, mean {}, control limits {} to {} (3 sigma, sigma = {} from moving ranges)\n",
        points.len(),
        shown(chart.centre),
        shown(chart.lower),
        shown(chart.upper),
        significant(chart.sigma, 3)
    );
    if points.len() < SETTLED {
        let _ = writeln!(text, "limits from fewer than {SETTLED} readings are provisional");
    }
    for violation in &chart.violations {
        let entry = points.get(violation.last).map_or(0, |point| point.entry);
        let _ = writeln!(text, "  entry {entry}: {}", violation.test.sentence());
    }
    if chart.violations.is_empty() {
        text += "no sign of an assignable cause\n";
    }
    text
}
