//! What is missing where photo and bench file leave the pitch open: which unknowns it is tied to, and what to measure.

use super::conclude::described;
use crate::{
    bench::Bench,
    fit::{Derived, Fit, Parameter},
};

/// A parameter that takes this share of the pitch's variance with it, were it known, is named.
const TIED: f64 = 0.5;
/// Most parameters named.
const NAMED: usize = 3;

/// A sentence: the pitch is known only together with these, and what to state.
pub(super) fn in_words(bench: &Bench, fit: &Fit, pitch: &Derived) -> String {
    let layout = &fit.joint.layout;
    let variance = fit.covariance_of(pitch, pitch);
    let mut tied: Vec<(f64, Parameter)> = Vec::new();
    for (place, entry) in layout.entries().iter().enumerate() {
        let is_lattice = matches!(entry.parameter, Parameter::Lattice { .. });
        let Some(column) = layout.column(place).filter(|_| !is_lattice) else { continue };
        let itself = Derived { value: entry.value, slopes: vec![(place, 1.0)] };
        // The share of the pitch's variance that knowing this parameter would remove: the squared correlation.
        let share = fit.covariance_of(pitch, &itself).powi(2) / (variance * fit.covariance[(column, column)]);
        if share > TIED {
            tied.push((share, entry.parameter));
        }
    }
    tied.sort_by(|a, b| b.0.total_cmp(&a.0));
    let Some((_, first)) = tied.first() else {
        return "no single quantity would fix it: photograph more and wider orders".to_owned();
    };
    let names: Vec<String> = tied.iter().take(NAMED).map(|(_, parameter)| described(bench, *parameter).0).collect();
    format!("it is known only together with {}; what helps most: {}", names.join(", "), what_to_state(*first))
}

fn what_to_state(parameter: Parameter) -> &'static str {
    match parameter {
        Parameter::Lattice { .. } => "more and wider orders",
        Parameter::Incidence { .. } => "state [sample] incidence",
        Parameter::Wavelength { .. } => "state [laser] wavelength more closely",
        Parameter::Throw | Parameter::Step { .. } => "measure [screen] throw, or photograph wider orders",
        Parameter::ScreenTilt { .. } => "state [screen] tilt",
        Parameter::TargetPitch => "measure [target] pitch on the print",
        Parameter::SheetSide { .. } | Parameter::SheetBow { .. } => "measure the sheet and state its corners as [target] marks",
        Parameter::ScaleEnd { .. } | Parameter::CameraPlace { .. } | Parameter::LogFocalLength => {
            "give a scale in the plane of the screen ([target], or [camera] scale)"
        }
        Parameter::CameraTurn { .. } => "give a [target], or state [camera] square_on",
        Parameter::PrincipalPoint { .. } | Parameter::RadialDistortion { .. } | Parameter::TangentialDistortion { .. } => {
            "photograph a [target] that fills the frame"
        }
        Parameter::ZeroOrderOnPrint { .. } | Parameter::PrintTurn => "let the zero order be seen",
    }
}
