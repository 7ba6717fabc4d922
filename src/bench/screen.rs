//! `[screen]`: how far, how tilted, seen from where.

use super::{
    BenchError, Screen, Side,
    section::{Section, Sense, Stated},
    tree::Table,
};
use crate::quantity::{Dimension, Quantity};

/// The screen; what is not stated is not known.
pub(super) fn read_screen(root: &Table) -> Result<Screen, BenchError> {
    const THROW: Sense = Sense { what: "throw", range: 0.005..=100.0, low: "5 mm", high: "100 m" };
    let section = Section::at(root, "screen")?;
    section.allow_only(&["throw", "tilt", "seen_from"])?;
    let throw_m = section.quantity("throw", Dimension::Length)?.map(|stated| stated.sensible_and_known(&THROW)).transpose()?;
    let tilt_rad = section.pair("tilt", Dimension::Angle)?.map(|pair| tilt_pair(pair, "tilt")).transpose()?;
    let seen_from = section.choice("seen_from", &[("front", Side::Front), ("behind", Side::Behind)])?.unwrap_or(Side::Front);
    Ok(Screen { throw_m, tilt_rad, seen_from })
}

/// Two turns below grazing.
pub(super) fn tilt_pair([x, y]: [Stated; 2], what: &'static str) -> Result<[Quantity; 2], BenchError> {
    let most = 85f64.to_radians();
    let sense = Sense { what, range: -most..=most, low: "-85 deg", high: "85 deg" };
    Ok([x.sensible(&sense)?, y.sensible(&sense)?])
}

/// A turn in a plane, at most one whole turn.
pub(super) fn turn(stated: Stated) -> Result<Quantity, BenchError> {
    let most = std::f64::consts::TAU;
    stated.sensible(&Sense { what: "turn", range: -most..=most, low: "-360 deg", high: "360 deg" })
}
