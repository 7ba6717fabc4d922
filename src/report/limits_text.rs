//! The verdict as a text table.

use super::{
    columns::{Align, WIDTH, columns, paragraph},
    rounding::{rounded, significant},
    units::{self, Unit},
};
use crate::limits::{Characteristic, Judgement, Rule, Tolerance, Verdict};

/// Digits of a limit: enough for any that is written by hand.
const LIMIT_DIGITS: usize = 9;

/// The verdict with its rule; empty where there are no limits.
pub(super) fn limits_text(verdict: Option<&Verdict>) -> String {
    let Some(verdict) = verdict else { return String::new() };
    let mut rows = vec![["", "allowed", "measured", "probability of conformance", "verdict"].map(str::to_owned).to_vec()];
    rows.extend(verdict.judgements.iter().map(|judgement| row(judgement, verdict)));
    let title = format!("{} ({} rule), limits {}", verdict.outcome.name().to_uppercase(), verdict.rule.name(), verdict.limits);
    let align = [Align::Left, Align::Right, Align::Right, Align::Right, Align::Left];
    paragraph("Verdict: ", &title, WIDTH) + &columns(&rows, &align) + &paragraph("  ", verdict.rule.sentence(), WIDTH) + &incapable(verdict)
}

fn row(judgement: &Judgement, verdict: &Verdict) -> Vec<String> {
    let unit = unit_of(judgement);
    vec![
        judgement.characteristic.name(pitches(verdict)),
        allowed(judgement.tolerance, unit),
        measured(judgement),
        probability(judgement.conformance_probability),
        judgement.outcome.name().to_owned(),
    ]
}

/// Value ± U with the unit.
pub(super) fn measured(judgement: &Judgement) -> String {
    let unit = unit_of(judgement);
    let value = unit.of(judgement.value);
    let shown = rounded(value.value, value.expanded());
    format!("{} ± {}{}", shown.value, shown.u, unit.suffix())
}

/// A lone pitch goes without number.
pub(super) fn pitches(verdict: &Verdict) -> usize {
    verdict.judgements.iter().filter(|judgement| judgement.characteristic != Characteristic::LatticeAngle).count()
}

pub(super) fn unit_of(judgement: &Judgement) -> Unit {
    match judgement.characteristic {
        Characteristic::Pitch(_) => units::for_pitch(judgement.value.value),
        Characteristic::LatticeAngle => units::DEGREE,
    }
}

/// "19.95 to 20.05 µm", "at most 20.05 µm", "at least 19.95 µm".
pub(super) fn allowed(tolerance: Tolerance, unit: Unit) -> String {
    let shown = |limit: f64| significant(limit * unit.per_si, LIMIT_DIGITS);
    let limits = match (tolerance.lower, tolerance.upper) {
        (Some(lower), Some(upper)) => format!("{} to {}", shown(lower), shown(upper)),
        (None, Some(upper)) => format!("at most {}", shown(upper)),
        (Some(lower), None) => format!("at least {}", shown(lower)),
        (None, None) => "anything".to_owned(),
    };
    limits + &unit.suffix()
}

/// A probability as percent; what is nearly sure is said so.
pub(super) fn probability(p: f64) -> String {
    match p {
        p if p > 0.9999 => "more than 99.99 %".to_owned(),
        p if p < 0.0001 => "less than 0.01 %".to_owned(),
        p => format!("{:.2} %", p * 100.0),
    }
}

/// Why shared risk did not decide.
pub(super) fn incapable(verdict: &Verdict) -> String {
    let index = |judgement: &Judgement| judgement.capability.filter(|index| *index < crate::limits::CAPABLE);
    if verdict.rule != Rule::Shared {
        return String::new();
    }
    verdict
        .judgements
        .iter()
        .filter_map(|judgement| Some((judgement.characteristic.name(pitches(verdict)), index(judgement)?)))
        .map(|(name, index)| {
            let words = format!(
                "{name}: T / (4 u) = {}, less than 4: measure with a smaller uncertainty, or agree on another rule.",
                significant(index, 2)
            );
            paragraph("  ", &words, WIDTH)
        })
        .collect()
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::{
        limits::{Limits, judge},
        report::example,
    };

    fn text(limits: &str, rule: Rule) -> String {
        limits_text(Some(&judge(&Limits::parse(limits).unwrap(), rule, &example::plane().sample).unwrap()))
    }

    #[test]
    fn says_what_is_allowed_and_how_sure_the_verdict_is() {
        let shown = text("4.000 ± 0.003 um; angle: >= 119.9 deg", Rule::Guarded);
        assert!(shown.starts_with("Verdict: INSIDE (guarded rule)"), "{shown}");
        assert!(shown.contains("3.997 to 4.003 µm") && shown.contains("at least 119.9°"), "{shown}");
        assert!(shown.contains("more than 99.99 %") && shown.contains("4.00031 ± 0.00086 µm"), "{shown}");
        assert!(shown.lines().all(|line| line.chars().count() <= WIDTH), "{shown}");
        assert_eq!(limits_text(None), "");
    }

    #[test]
    fn a_coarse_measurement_cannot_share_the_risk() {
        let shown = text("pitch 1: 4.000 ± 0.002 um", Rule::Shared);
        assert!(shown.contains("UNDECIDED") && shown.contains("T / (4 u) = 2.3"), "{shown}");
    }

    #[test]
    fn probabilities_near_the_ends_are_not_rounded_to_certainty() {
        assert_eq!([0.999_96, 0.5, 0.000_01].map(probability), ["more than 99.99 %", "50.00 %", "less than 0.01 %"]);
    }
}
