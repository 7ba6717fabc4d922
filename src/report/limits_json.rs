//! The verdict in the JSON result.

use schemars::JsonSchema;
use serde::Serialize;

use super::{
    sample_json::{measured, number},
    units,
};
use crate::limits::{Characteristic, Judgement, Verdict};

#[derive(Debug, Serialize, JsonSchema)]
pub(super) struct LimitsJson {
    /// The limits as they were written.
    text: String,
    /// Name of the decision rule.
    #[schemars(extend("enum" = ["guarded", "simple", "shared"]))]
    rule: &'static str,
    /// `inside`, `undecided` or `outside`: the worst of the checks.
    #[schemars(extend("enum" = ["inside", "undecided", "outside"]))]
    outcome: &'static str,
    checks: Vec<CheckJson>,
}

#[derive(Debug, Serialize, JsonSchema)]
struct CheckJson {
    /// `pitch`, `pitch 1`, `pitch 2` or `lattice angle`.
    quantity: String,
    unit: &'static str,
    #[serde(skip_serializing_if = "Option::is_none")]
    lower: Option<f64>,
    #[serde(skip_serializing_if = "Option::is_none")]
    upper: Option<f64>,
    value: f64,
    #[serde(rename = "U")]
    expanded: f64,
    /// Width of the guard band inside each limit; 0 where the rule has none.
    guard_band: f64,
    /// Probability that the true value lies within the limits.
    conformance_probability: f64,
    /// T / (4 u); two-sided limits only.
    #[serde(skip_serializing_if = "Option::is_none")]
    capability_index: Option<f64>,
    #[schemars(extend("enum" = ["inside", "undecided", "outside"]))]
    outcome: &'static str,
}

pub(super) fn limits_json(verdict: &Verdict) -> LimitsJson {
    let pitches = super::limits_text::pitches(verdict);
    LimitsJson {
        text: verdict.limits.clone(),
        rule: verdict.rule.name(),
        outcome: verdict.outcome.name(),
        checks: verdict.judgements.iter().filter_map(|judgement| check(judgement, pitches)).collect(),
    }
}

fn check(judgement: &Judgement, pitches: usize) -> Option<CheckJson> {
    let unit = match judgement.characteristic {
        Characteristic::Pitch(_) => units::MICROMETRE,
        Characteristic::LatticeAngle => units::DEGREE,
    };
    let value = unit.of(judgement.value);
    let limit = |limit: Option<f64>| limit.and_then(|limit| number(limit * unit.per_si));
    Some(CheckJson {
        quantity: judgement.characteristic.name(pitches),
        unit: unit.ascii,
        lower: limit(judgement.tolerance.lower),
        upper: limit(judgement.tolerance.upper),
        value: measured(value.value, value.u)?.0,
        expanded: measured(value.value, value.expanded())?.1,
        guard_band: number(judgement.guard_band * unit.per_si)?,
        conformance_probability: number(judgement.conformance_probability)?,
        capability_index: judgement.capability.and_then(number),
        outcome: judgement.outcome.name(),
    })
}
