//! A measured sample against its limits.

use super::{CAPABLE, Characteristic, Limits, LimitsError, Rule, Subject, Tolerance, probability::conformance_probability};
use crate::{budget::Value, measure::SampleResult};

/// What the decision rule says.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub enum Outcome {
    /// Within the limits.
    Inside,
    /// A limit lies within the uncertainty, or the measurement is too coarse for the rule.
    Undecided,
    /// Beyond a limit.
    Outside,
}

impl Outcome {
    /// "inside", "undecided" or "outside".
    #[must_use]
    pub fn name(self) -> &'static str {
        match self {
            Self::Inside => "inside",
            Self::Undecided => "undecided",
            Self::Outside => "outside",
        }
    }
}

/// One value against its limits, SI.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Judgement {
    /// What was judged.
    pub characteristic: Characteristic,
    /// Limits.
    pub tolerance: Tolerance,
    /// What was measured.
    pub value: Value,
    /// Width of the guard band on the inside of each limit; 0 where the rule has none.
    pub guard_band: f64,
    /// Probability that the true value conforms.
    pub conformance_probability: f64,
    /// `C_m = T / (4 u)`; `None` when one-sided or without uncertainty.
    pub capability: Option<f64>,
    /// What the rule says.
    pub outcome: Outcome,
}

/// All judgements of a sample. The whole is outside if anything is, else undecided if anything is.
#[derive(Debug, Clone, PartialEq)]
pub struct Verdict {
    /// The limits as they were written.
    pub limits: String,
    /// The rule.
    pub rule: Rule,
    /// One judgement per limited value: pitches in order, then the lattice angle.
    pub judgements: Vec<Judgement>,
    /// The worst of them.
    pub outcome: Outcome,
}

/// Judges the sample by the rule.
///
/// # Errors
/// [`LimitsError::Absent`] when something is limited that the sample does not have.
pub fn judge(limits: &Limits, rule: Rule, sample: &SampleResult) -> Result<Verdict, LimitsError> {
    let mut judgements = Vec::new();
    for &(subject, tolerance) in &limits.parts {
        let characteristics = match subject {
            Subject::EveryPitch => (0..sample.pitch_m.len()).map(Characteristic::Pitch).collect(),
            Subject::One(characteristic) => vec![characteristic],
        };
        for characteristic in characteristics {
            let value = measured(sample, characteristic)?;
            judgements.push(judgement(characteristic, tolerance, value, rule));
        }
    }
    judgements.sort_by_key(|judgement| judgement.characteristic);
    let outcome = judgements.iter().map(|judgement| judgement.outcome).max().unwrap_or(Outcome::Undecided);
    Ok(Verdict { limits: limits.text.clone(), rule, judgements, outcome })
}

fn measured(sample: &SampleResult, characteristic: Characteristic) -> Result<Value, LimitsError> {
    let found = match characteristic {
        Characteristic::Pitch(index) => sample.pitch_m.get(index).copied(),
        Characteristic::LatticeAngle => sample.lattice_angle_rad,
    };
    found.ok_or_else(|| LimitsError::Absent { what: characteristic.name(2), sample: "line grating", instead: "\"pitch\"" })
}

fn judgement(characteristic: Characteristic, tolerance: Tolerance, value: Value, rule: Rule) -> Judgement {
    let guard_band = if rule == Rule::Guarded { value.expanded() } else { 0.0 };
    let capability = tolerance.width().filter(|_| value.u > 0.0).map(|width| width / (4.0 * value.u));
    let by_value = if tolerance.holds(value.value) { Outcome::Inside } else { Outcome::Outside };
    let outcome = match rule {
        Rule::Simple => by_value,
        Rule::Shared if capability.is_some_and(|index| index < CAPABLE) => Outcome::Undecided,
        Rule::Shared => by_value,
        Rule::Guarded if tolerance.inset(guard_band).holds(value.value) => Outcome::Inside,
        Rule::Guarded if tolerance.inset(-guard_band).holds(value.value) => Outcome::Undecided,
        Rule::Guarded => Outcome::Outside,
    };
    // A measurement holds finite numbers only; should one not be, nothing speaks for conformance.
    let conformance_probability = conformance_probability(value, tolerance).unwrap_or(0.0);
    Judgement { characteristic, tolerance, value, guard_band, conformance_probability, capability, outcome }
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    fn value(value: f64, u: f64) -> Value {
        Value { value, u, coverage_factor: 2.0, effective_degrees_of_freedom: f64::INFINITY }
    }

    fn sample(pitches: &[f64], angle: Option<f64>) -> SampleResult {
        SampleResult {
            name: String::new(),
            pitch_m: pitches.iter().map(|&pitch_m| value(pitch_m, 0.01e-6)).collect(),
            lattice_angle_rad: angle.map(|degrees| value(degrees.to_radians(), 0.05f64.to_radians())),
            orientation_rad: value(0.0, 0.1),
            row_spacing_m: vec![],
            cell_area_m2: None,
            kind: None,
            budget: vec![],
        }
    }

    fn outcome(text: &str, rule: Rule, pitches: &[f64], angle: Option<f64>) -> Outcome {
        judge(&Limits::parse(text).unwrap(), rule, &sample(pitches, angle)).unwrap().outcome
    }

    /// U = 0.02 µm throughout: the guard band reaches from 19.97 to 20.03 inside and from 19.93 to 20.07 outside.
    #[test]
    fn each_rule_at_each_place() {
        use Outcome::{Inside, Outside, Undecided};
        let cases = [
            (20.000e-6, Inside, Inside),
            (20.029e-6, Inside, Inside),
            (20.031e-6, Undecided, Inside),
            (20.049e-6, Undecided, Inside),
            (20.051e-6, Undecided, Outside),
            (20.069e-6, Undecided, Outside),
            (20.071e-6, Outside, Outside),
            (19.929e-6, Outside, Outside),
            (19.931e-6, Undecided, Outside),
        ];
        for (pitch_m, guarded, simple) in cases {
            assert_eq!(outcome("20.00 ± 0.05 um", Rule::Guarded, &[pitch_m], None), guarded, "{pitch_m}");
            assert_eq!(outcome("20.00 ± 0.05 um", Rule::Simple, &[pitch_m], None), simple, "{pitch_m}");
            // T / (4u) = 0.1 / 0.04 = 2.5: not capable
            assert_eq!(outcome("20.00 ± 0.05 um", Rule::Shared, &[pitch_m], None), Undecided, "{pitch_m}");
            // T / (4u) = 0.2 / 0.04 = 5
            assert_eq!(outcome("20.00 ± 0.10 um", Rule::Shared, &[pitch_m], None), Inside, "{pitch_m}");
        }
        assert_eq!(outcome("<= 20.05 um", Rule::Shared, &[20.06e-6], None), Outside);
        assert_eq!(outcome("<= 20.05 um", Rule::Guarded, &[5e-6], None), Inside);
        assert_eq!(outcome(">= 20.05 um", Rule::Guarded, &[5e-6], None), Outside);
    }

    #[test]
    fn a_tolerance_narrower_than_the_uncertainty_is_never_inside_and_still_outside_far_away() {
        assert_eq!(outcome("20.000 ± 0.001 um", Rule::Guarded, &[20e-6], None), Outcome::Undecided);
        assert_eq!(outcome("20.000 ± 0.001 um", Rule::Guarded, &[20.1e-6], None), Outcome::Outside);
    }

    #[test]
    fn the_worst_of_all_decides() {
        let text = "pitch 1: 20.00 ± 0.05 um; pitch 2: 21.00 ± 0.05 um; angle: 90.0 ± 0.5 deg";
        assert_eq!(outcome(text, Rule::Guarded, &[20e-6, 21e-6], Some(90.1)), Outcome::Inside);
        assert_eq!(outcome(text, Rule::Guarded, &[20e-6, 21.04e-6], Some(90.1)), Outcome::Undecided);
        assert_eq!(outcome(text, Rule::Guarded, &[20e-6, 21.04e-6], Some(91.0)), Outcome::Outside);
        assert_eq!(outcome("20.5 ± 0.6 um", Rule::Guarded, &[20e-6, 22e-6], Some(90.0)), Outcome::Outside, "both pitches are meant");
    }

    #[test]
    fn what_is_not_there_cannot_be_judged() {
        for text in ["pitch 2: 20.00 ± 0.05 um", "angle: 90.0 ± 0.2 deg"] {
            let error = judge(&Limits::parse(text).unwrap(), Rule::Guarded, &sample(&[20e-6], None)).unwrap_err();
            assert!(error.to_string().contains("line grating"), "{error}");
        }
    }

    proptest! {
        /// The guarded rule is sure: inside and outside leave at most 2.3 % (one tail beyond 2u) for the opposite, and two tails for "inside".
        #[test]
        fn guarded_verdicts_keep_their_risk(pitch in 19.8e-6..20.2e-6f64, half in 0.001e-6..0.15e-6f64) {
            let tolerance = Tolerance { lower: Some(20e-6 - half), upper: Some(20e-6 + half) };
            let judged = judgement(Characteristic::Pitch(0), tolerance, value(pitch, 0.01e-6), Rule::Guarded);
            match judged.outcome {
                Outcome::Inside => prop_assert!(judged.conformance_probability >= 0.9544),
                Outcome::Outside => prop_assert!(judged.conformance_probability <= 0.02276),
                Outcome::Undecided => {}
            }
        }
    }
}
