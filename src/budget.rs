//! In: a [`Fit`] and derived values. Out: each value with its combined uncertainty, and one budget line per source with its exact share.
//! Must never know: photos, spots, reports.
//! Start reading at [`value`].

use crate::{
    fit::{Derived, Fit, Source},
    math::{
        gum::{Contribution, welch_satterthwaite},
        statistics,
    },
};
use std::collections::BTreeMap;

/// Coverage probability of expanded uncertainties: k = 2 for a normal law (JCGM 100, G.6.6).
pub const COVERAGE: f64 = 0.9545;

/// A value with its uncertainty, SI.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Value {
    /// Best estimate.
    pub value: f64,
    /// Standard uncertainty.
    pub u: f64,
    /// Coverage factor for about 95 % (Student's t at 95.45 % for the effective degrees of freedom).
    pub coverage_factor: f64,
    /// Effective degrees of freedom (Welch-Satterthwaite); infinite when nothing was estimated from scatter.
    pub effective_degrees_of_freedom: f64,
}

impl Value {
    /// Expanded uncertainty U = k u.
    #[must_use]
    pub fn expanded(&self) -> f64 {
        self.coverage_factor * self.u
    }
}

/// One line of the uncertainty budget.
#[derive(Debug, Clone, PartialEq)]
pub struct BudgetLine {
    /// Name of the source.
    pub source: String,
    /// Exact share of each pitch's variance; over all lines they add up to 1.
    pub share: Vec<f64>,
    /// Standard uncertainty that this source alone gives each pitch, m.
    pub u_pitch_m: Vec<f64>,
    /// Its share of the variance of the lattice angle; `None` for a line grating.
    pub angle_share: Option<f64>,
}

/// A derived value with its uncertainty.
#[must_use]
pub fn value(fit: &Fit, derived: &Derived) -> Value {
    let (variance, parts) = fit.variance_by_source(&derived.slopes);
    let effective_degrees_of_freedom = effective_freedom(fit, &parts);
    Value {
        value: derived.value,
        u: variance.sqrt(),
        coverage_factor: coverage_factor(effective_degrees_of_freedom),
        effective_degrees_of_freedom,
    }
}

/// The budget of the pitches (and of the lattice angle): one line per source that owns anything, largest first.
#[must_use]
pub fn budget(fit: &Fit, pitches: &[Derived], angle: Option<&Derived>, name: impl Fn(Source) -> String) -> Vec<BudgetLine> {
    let pitch_parts: Vec<(f64, BTreeMap<Source, f64>)> = pitches.iter().map(|pitch| fit.variance_by_source(&pitch.slopes)).collect();
    let angle_parts = angle.map(|angle| fit.variance_by_source(&angle.slopes));
    let mut sources: Vec<Source> = pitch_parts.iter().flat_map(|(_, parts)| parts.keys().copied()).collect();
    sources.sort_unstable();
    sources.dedup();
    let share = |(variance, parts): &(f64, BTreeMap<Source, f64>), source: &Source| parts.get(source).map_or(0.0, |part| part / variance);
    let line = |source: Source| BudgetLine {
        source: name(source),
        share: pitch_parts.iter().map(|parts| share(parts, &source)).collect(),
        u_pitch_m: pitch_parts.iter().map(|(_, parts)| parts.get(&source).copied().unwrap_or(0.0).sqrt()).collect(),
        angle_share: angle_parts.as_ref().map(|parts| share(parts, &source)),
    };
    let mut lines: Vec<BudgetLine> = sources.into_iter().map(line).collect();
    let size = |line: &BudgetLine| line.share.iter().sum::<f64>();
    lines.sort_by(|a, b| size(b).total_cmp(&size(a)));
    lines
}

/// Welch-Satterthwaite over the sources whose uncertainty was itself estimated from scatter (a Birge factor above 1); all others count
/// as known. The parts are independent by construction, as the formula asks. Source: JCGM 100:2008, G.4.1, formula (G.2b).
fn effective_freedom(fit: &Fit, parts: &BTreeMap<Source, f64>) -> f64 {
    let scattered = |source: &Source| match source {
        Source::Spots if fit.joint.spot_scale > 1.0 => Some(fit.spot_freedom),
        Source::Dots | Source::Ruling | Source::SheetEdges | Source::Marks if fit.joint.print_scale > 1.0 => Some(fit.print_freedom),
        _ => None,
    };
    let contributions: Vec<Contribution> = parts
        .iter()
        .map(|(source, &part)| Contribution { variance: part, degrees_of_freedom: scattered(source).unwrap_or(f64::INFINITY).max(1.0) })
        .collect();
    welch_satterthwaite(&contributions).unwrap_or(f64::INFINITY)
}

fn coverage_factor(freedom: f64) -> f64 {
    statistics::coverage_factor(COVERAGE, freedom).unwrap_or(2.0)
}
