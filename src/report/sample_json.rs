//! What one sample gives in the JSON result, as versioned structs of this room.

use schemars::JsonSchema;
use serde::Serialize;

use super::{
    units::{self, Unit},
    words::{kind_name, pattern_name},
};
use crate::measure::{BudgetLine, SampleResult, Value};

/// Significant digits of u that reach the file: what is cut off is a millionth of u.
const U_DIGITS: i32 = 6;

/// Significant digits of a number without uncertainty.
const NUMBER_DIGITS: usize = 12;

#[derive(Debug, Serialize, JsonSchema)]
pub(super) struct SampleJson {
    #[schemars(extend("enum" = ["line", "plane"]))]
    pattern: &'static str,
    pitch: Vec<ValueJson>,
    #[serde(skip_serializing_if = "Option::is_none")]
    lattice_angle: Option<ValueJson>,
    orientation: Option<ValueJson>,
    #[serde(skip_serializing_if = "Option::is_none")]
    #[schemars(extend("enum" = ["oblique", "rectangular", "centred rectangular", "square", "hexagonal"]))]
    lattice_kind: Option<&'static str>,
    #[serde(skip_serializing_if = "Option::is_none")]
    lattice_kind_p_value: Option<f64>,
    #[serde(skip_serializing_if = "Option::is_none")]
    lattice_kind_text: Option<String>,
    row_spacing: Vec<ValueJson>,
    line_density: Vec<ValueJson>,
    #[serde(skip_serializing_if = "Option::is_none")]
    cell_area: Option<ValueJson>,
    budget: Vec<BudgetJson>,
}

#[derive(Debug, Serialize, JsonSchema)]
pub(super) struct ValueJson {
    value: f64,
    u: f64,
    #[serde(rename = "U")]
    expanded: f64,
    k: f64,
    unit: &'static str,
    /// Left out when infinite.
    #[serde(skip_serializing_if = "Option::is_none")]
    degrees_of_freedom: Option<f64>,
}

#[derive(Debug, Serialize, JsonSchema)]
struct BudgetJson {
    source: String,
    share: Vec<f64>,
    u: Vec<f64>,
    unit: &'static str,
    #[serde(skip_serializing_if = "Option::is_none")]
    angle_share: Option<f64>,
}

pub(super) fn sample_json(sample: &SampleResult) -> SampleJson {
    let values = |values: &[Value], unit: Unit| values.iter().filter_map(|&value| value_json(value, unit)).collect();
    let densities: Vec<Value> = sample.row_spacing_m.iter().filter_map(|&spacing_m| units::line_density_per_m(spacing_m)).collect();
    SampleJson {
        pattern: pattern_name(sample),
        pitch: values(&sample.pitch_m, units::MICROMETRE),
        lattice_angle: sample.lattice_angle_rad.and_then(|angle| value_json(angle, units::DEGREE)),
        orientation: value_json(sample.orientation_rad, units::DEGREE),
        lattice_kind: sample.kind.as_ref().map(|kind| kind_name(kind.kind)),
        lattice_kind_p_value: sample.kind.as_ref().and_then(|kind| number(kind.p_value)),
        lattice_kind_text: sample.kind.as_ref().map(|kind| kind.sentence.clone()),
        row_spacing: values(&sample.row_spacing_m, units::MICROMETRE),
        line_density: values(&densities, units::LINES_PER_MILLIMETRE),
        cell_area: sample.cell_area_m2.and_then(|area| value_json(area, units::SQUARE_MICROMETRE)),
        budget: sample.budget.iter().map(budget_json).collect(),
    }
}

fn budget_json(line: &BudgetLine) -> BudgetJson {
    let u = line.u_pitch_m.iter().map(|u_pitch_m| number(u_pitch_m * units::MICROMETRE.per_si).unwrap_or(0.0)).collect();
    BudgetJson {
        source: line.source.clone(),
        share: line.share.iter().map(|&share| number(share).unwrap_or(0.0)).collect(),
        u,
        unit: units::MICROMETRE.ascii,
        angle_share: line.angle_share.and_then(number),
    }
}

/// `None` when value or u is not finite: such a number must not reach a file.
fn value_json(si: Value, unit: Unit) -> Option<ValueJson> {
    let shown = unit.of(si);
    let (value, u) = measured(shown.value, shown.u)?;
    Some(ValueJson {
        value,
        u,
        expanded: measured(shown.value, shown.expanded())?.1,
        k: number(shown.coverage_factor)?,
        unit: unit.ascii,
        degrees_of_freedom: number(shown.effective_degrees_of_freedom),
    })
}

/// A value and its u without the digits that mean nothing, so that files compare across machines; `None` when not finite.
pub(super) fn measured(value: f64, u: f64) -> Option<(f64, f64)> {
    let (value, u) = (number(value)?, number(u)?);
    if u <= 0.0 {
        return Some((value, 0.0));
    }
    let exponent: i32 = format!("{u:.0e}").split_once('e')?.1.parse().ok()?;
    let decimals = usize::try_from(U_DIGITS - 1 - exponent).ok().filter(|&decimals| decimals <= 17);
    let tidy = |x: f64| decimals.map_or(Some(x), |decimals| format!("{x:.decimals$}").parse::<f64>().ok()).filter(|x| x.is_finite());
    Some((tidy(value)?, tidy(u)?))
}

/// A plain number to twelve significant digits; `None` when not finite.
pub(super) fn number(value: f64) -> Option<f64> {
    let tidy: f64 = format!("{value:.*e}", NUMBER_DIGITS - 1).parse().ok()?;
    // `+ 0.0` turns -0 into 0.
    tidy.is_finite().then_some(tidy + 0.0)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn digits_without_meaning_are_dropped_and_no_more() {
        assert_eq!(measured(2.001_300_000_000_1, 0.000_4), Some((2.0013, 0.0004)));
        assert_eq!(measured(0.1 + 0.2, 0.0), Some((0.3, 0.0)));
        assert_eq!(measured(1.0, 1e-30), Some((1.0, 1e-30)));
        assert_eq!(measured(1.0, 1e30), Some((1.0, 1e30)));
        for (value, u) in [(f64::NAN, 1.0), (1.0, f64::INFINITY), (f64::NEG_INFINITY, 0.0)] {
            assert_eq!(measured(value, u), None, "{value} {u}");
        }
    }

    #[test]
    fn a_millionth_of_u_is_kept() {
        let (value, u) = measured(4.000_312_345_678_9, 0.000_428_765_432).unwrap();
        assert!((value - 4.000_312_345_678_9).abs() < 1e-5 * u && (u / 0.000_428_765_432 - 1.0).abs() < 1e-5, "{value} {u}");
    }
}
