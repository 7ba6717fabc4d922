//! A result that a person reads at a glance in a terminal: at most 100 columns, no colours.

use super::{
    budget_table::budget_table,
    columns::{Align, WIDTH, columns, paragraph, shortened},
    context::{Context, LogEntry},
    limits_text::limits_text,
    rounding::{concise, percent, rounded, significant},
    trials::trials_text,
    units::{self, Unit},
    words::{NO_CERTIFICATE, kind_name, mode_name, numbered, orientation_words, pattern_name, reason_counts},
};
use crate::measure::{FitSummary, Measurement, ParameterRow, SampleResult, Value};

/// A parameter that ends further than this many prior uncertainties from its prior is worth a look at the bench.
const MOVED_BY_U: f64 = 2.0;

/// Most lines of reasons for rejected spots; the JSON lists every spot.
const REASONS_SHOWN: usize = 5;

/// The measurement as text for a terminal, ending with a line break.
#[must_use]
pub fn text(measurement: &Measurement, context: &Context) -> String {
    let sections = [
        headline(measurement),
        results(measurement),
        limits_text(context.verdict.as_ref()),
        lattice_kind(&measurement.sample),
        evidence(measurement),
        budget(&measurement.sample),
        trials_text(measurement),
        moved_parameters(&measurement.parameters),
        other_samples(&measurement.other_samples),
        notes(measurement),
        logged(context),
        format!("{NO_CERTIFICATE}\n"),
    ];
    sections.into_iter().filter(|section| !section.is_empty()).collect::<Vec<_>>().join("\n")
}

/// A refusal as text for a terminal: why there is no result, and the short name of the reason.
#[must_use]
pub fn refusal_text(code: &str, text: &str) -> String {
    paragraph("No result: ", text, WIDTH) + &paragraph("   reason: ", code, WIDTH)
}

fn headline(measurement: &Measurement) -> String {
    let pattern = match pattern_name(&measurement.sample) {
        "line" => "line grating",
        _ => "plane lattice",
    };
    let named = match measurement.sample.name.as_str() {
        "" => String::new(),
        name => format!("{name}: "),
    };
    let photos: Vec<String> =
        measurement.photos.iter().map(|photo| format!("{} ({} x {} px)", photo.file, photo.size_px[0], photo.size_px[1])).collect();
    let from = if photos.is_empty() { String::new() } else { format!(", from {}", photos.join(", ")) };
    paragraph("", &format!("{named}{pattern} in {}{from}", mode_name(measurement.mode)), WIDTH)
}

fn results(measurement: &Measurement) -> String {
    let sample = &measurement.sample;
    let mut rows = vec![["", "value", "U (about 95 %)", "k", "u", "u relative"].map(str::to_owned).to_vec()];
    let count = sample.pitch_m.len();
    for (i, pitch_m) in sample.pitch_m.iter().enumerate() {
        rows.push(relative_row(&numbered("pitch", i, count), *pitch_m, units::for_pitch(pitch_m.value)));
    }
    rows.extend(sample.lattice_angle_rad.map(|angle| value_row("lattice angle", angle, units::DEGREE)));
    rows.push(value_row("orientation", sample.orientation_rad, units::DEGREE));
    let rows_of = sample.row_spacing_m.len();
    for (i, spacing_m) in sample.row_spacing_m.iter().enumerate().filter(|_| count > 1) {
        rows.push(relative_row(&numbered("row spacing", i, rows_of), *spacing_m, units::for_pitch(spacing_m.value)));
    }
    for (i, density) in sample.row_spacing_m.iter().filter_map(|spacing_m| units::line_density_per_m(*spacing_m)).enumerate() {
        rows.push(relative_row(&numbered("line density", i, rows_of), density, units::LINES_PER_MILLIMETRE));
    }
    rows.extend(sample.cell_area_m2.map(|area| relative_row("cell area", area, units::for_area(sample))));
    let align = [Align::Left, Align::Right, Align::Right, Align::Right, Align::Right, Align::Right];
    columns(&rows, &align) + &explanation(measurement)
}

/// Name, value rounded to two digits of U, U, k, u.
fn value_row(name: &str, si: Value, unit: Unit) -> Vec<String> {
    let value = unit.of(si);
    let with = |text: String| format!("{text}{}", unit.suffix());
    let shown = rounded(value.value, value.expanded());
    if value.u <= 0.0 {
        return vec![name.to_owned(), with(shown.value), "exact".to_owned()];
    }
    let factor = format!("{:.2}", value.coverage_factor);
    vec![name.to_owned(), with(shown.value), with(shown.u), factor, with(rounded(value.value, value.u).u)]
}

fn relative_row(name: &str, si: Value, unit: Unit) -> Vec<String> {
    let mut row = value_row(name, si, unit);
    if si.u > 0.0 {
        row.push(percent(si.u / si.value));
    }
    row
}

fn explanation(measurement: &Measurement) -> String {
    let expanded = "U = k u is the expanded uncertainty: value - U to value + U holds the quantity with a probability of about 95 %. \
                    u is the standard uncertainty (one standard deviation).";
    paragraph("  ", expanded, WIDTH) + &paragraph("  ", &orientation_words(measurement), WIDTH)
}

fn lattice_kind(sample: &SampleResult) -> String {
    let Some(kind) = &sample.kind else { return String::new() };
    let words = if kind.sentence.is_empty() { kind_name(kind.kind) } else { &kind.sentence };
    paragraph("Lattice: ", words, WIDTH)
}

/// What the result rests on: spots and fit.
fn evidence(measurement: &Measurement) -> String {
    let with_order = measurement.orders.len();
    let used = measurement.orders.iter().filter(|order| order.used).count();
    let clipped = measurement.orders.iter().filter(|order| order.used && order.clipped).count();
    let mut spots = format!("{used} used of {with_order} with an order (h,k)");
    if clipped > 0 {
        spots += &format!(", {clipped} of them clipped");
    }
    spots += &format!("; {} rejected", measurement.rejected.len());
    spots += if measurement.zero_order.seen { "; zero order seen" } else { "; zero order not seen, its place comes from the fit" };
    paragraph("Spots: ", &spots, WIDTH) + &rejection_reasons(measurement) + &paragraph("Fit:   ", &fit_words(&measurement.fit), WIDTH)
}

fn rejection_reasons(measurement: &Measurement) -> String {
    let reasons = reason_counts(measurement.rejected.iter());
    let mut lines: String =
        reasons.iter().take(REASONS_SHOWN).map(|(reason, count)| paragraph("       ", &format!("{count} x {reason}"), WIDTH)).collect();
    if reasons.len() > REASONS_SHOWN {
        lines += &paragraph("       ", &format!("and {} more reasons", reasons.len() - REASONS_SHOWN), WIDTH);
    }
    lines
}

fn fit_words(fit: &FitSummary) -> String {
    let mut words = format!(
        "spots lie {} px (rms) from where the model puts them; reduced chi-square {} with {} degree{} of freedom",
        significant(fit.rms_px, 2),
        significant(fit.chi2_reduced, 3),
        significant(fit.degrees_of_freedom, 4),
        if (fit.degrees_of_freedom - 1.0).abs() < 1e-9 { "" } else { "s" },
    );
    words += &if fit.birge_factor > 1.0 {
        format!(": more scatter than the spots' own uncertainties, which were therefore raised by {}", significant(fit.birge_factor, 3))
    } else {
        ": no more than the spots' own uncertainties".to_owned()
    };
    if fit.dots_used > 0 {
        words += &format!("; {} target dots or marks used", fit.dots_used);
    }
    words + "."
}

fn budget(sample: &SampleResult) -> String {
    match budget_table(sample) {
        table if table.is_empty() => table,
        table => {
            let title = if sample.pitch_m.len() > 1 { "each pitch" } else { "the pitch" };
            format!("Where the uncertainty of {title} comes from (share of its variance; u from this source alone):\n{table}")
        }
    }
}

/// Parameters whose fitted value contradicts what was stated beforehand.
fn moved_parameters(parameters: &[ParameterRow]) -> String {
    let mut rows = vec![];
    for parameter in parameters {
        let Some((prior, u_prior)) = parameter.prior.filter(|&(prior, u)| (parameter.value - prior).abs() > MOVED_BY_U * u && u > 0.0)
        else {
            continue;
        };
        let unit = units::for_parameter(parameter.unit);
        let shown = |value: f64, u: f64| format!("{}{}", concise(value * unit.per_si, u * unit.per_si), unit.suffix());
        let moved = significant((parameter.value - prior).abs() / u_prior, 2);
        rows.push(vec![
            shortened(&parameter.name, 34),
            format!("stated {}", shown(prior, u_prior)),
            format!("fitted {}", shown(parameter.value, parameter.u)),
            format!("moved by {moved} u"),
        ]);
    }
    if rows.is_empty() {
        return String::new();
    }
    let advice = "The photos contradict what was stated of the bench; check these readings:";
    format!("{advice}\n{}", columns(&rows, &[Align::Left; 4]))
}

fn other_samples(samples: &[SampleResult]) -> String {
    let line = |sample: &SampleResult| {
        let pitches: Vec<String> = sample
            .pitch_m
            .iter()
            .map(|&pitch_m| {
                let unit = units::for_pitch(pitch_m.value);
                let pitch = unit.of(pitch_m);
                format!("{}{}", concise(pitch.value, pitch.u), unit.suffix())
            })
            .collect();
        let angle = sample.lattice_angle_rad.map(|angle| units::DEGREE.of(angle));
        let angle = angle.map(|angle| format!(", lattice angle {}°", concise(angle.value, angle.u))).unwrap_or_default();
        paragraph(&format!("  {}: ", shortened(&sample.name, 30)), &format!("pitch {}{angle}", pitches.join(" and ")), WIDTH)
    };
    if samples.is_empty() {
        return String::new();
    }
    let title = "Other samples of the series (in parentheses: u in units of the last digits):\n";
    title.to_owned() + &samples.iter().map(line).collect::<String>()
}

fn notes(measurement: &Measurement) -> String {
    if measurement.notes.is_empty() {
        return String::new();
    }
    let lines: String = measurement.notes.iter().map(|note| paragraph("  - ", &note.to_string(), WIDTH)).collect();
    format!("Please note:\n{lines}")
}

/// The place in the log; with its hash a paper copy is a witness of the log.
fn logged(context: &Context) -> String {
    let line =
        |entry: &LogEntry| paragraph("Logged: ", &format!("entry {} of {}, SHA-256 {}", entry.entry, entry.log, entry.sha256), WIDTH);
    context.entry.as_ref().map(line).unwrap_or_default()
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::report::example;

    fn assert_fits(text: &str) {
        for line in text.lines() {
            assert!(line.chars().count() <= WIDTH, "{} columns: {line}", line.chars().count());
            assert!(!line.contains("NaN") && !line.contains("inf "), "{line}");
        }
    }

    #[test]
    fn every_line_fits_a_terminal() {
        assert_fits(&text(&example::plane(), &Context::default()));
        assert_fits(&text(&example::line(), &Context::default()));
        assert_fits(&refusal_text("no-spots", &"a very long reason ".repeat(20)));
    }

    #[test]
    fn value_and_u_end_at_the_same_place() {
        let report = text(&example::plane(), &Context::default());
        let line = report.lines().find(|line| line.trim_start().starts_with("pitch 1")).unwrap();
        let cells: Vec<&str> = line.split_whitespace().collect();
        assert_eq!(&cells[2..8], ["4.00031", "µm", "0.00086", "µm", "2.01", "0.00043"], "{line}");
        assert!(line.ends_with("0.011 %"), "{line}");
    }

    #[test]
    fn only_parameters_that_moved_are_named() {
        let report = text(&example::plane(), &Context::default());
        assert!(report.contains("throw") && report.contains("moved by 3.5 u"), "{report}");
        assert!(!report.contains("fitted 632."), "the wavelength did not move:\n{report}");
    }

    #[test]
    fn ends_with_what_it_is_not() {
        assert!(text(&example::line(), &Context::default()).trim_end().ends_with(NO_CERTIFICATE));
    }

    #[test]
    fn survives_what_should_never_come() {
        let mut broken = example::plane();
        broken.sample.pitch_m.clear();
        broken.fit.rms_px = f64::NAN;
        broken.sample.budget[0].share = vec![];
        broken.parameters[0].prior = Some((f64::NAN, 0.0));
        assert_fits(&text(&broken, &Context::default()));
    }
}
