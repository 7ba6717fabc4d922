//! How the number comes about, for a reader who meets diffraction for the first time.

use crate::{
    measure::Measurement,
    report::{
        significant,
        units::{self, NANOMETRE},
        words::pattern_name,
    },
};
use maud::{Markup, html};

pub(super) fn how_it_works(measurement: &Measurement) -> Markup {
    let wavelength = significant(measurement.reciprocal.wavelength_m * NANOMETRE.per_si, 6);
    let is_line = pattern_name(&measurement.sample) == "line";
    html! {
        section {
            h2 { "How the number comes about" }
            p {
                "Light of one colour (wavelength λ = " (wavelength) " nm) meets a sample that repeats itself. In most directions the light from neighbouring "
                "periods cancels; in a few it adds up, and a bright spot, an order, appears on the screen. For a sample that faces the beam the m-th order leaves at the angle θ with "
                "d sin θ = m λ, where d is the distance of neighbouring rows. " strong { "The finer the sample, the wider its pattern." }
            }
            p {
                "The spots' places on the photo are turned into angles with the help of what is known of the bench (distance to the screen, tilts, printed target), and all orders together "
                "are fitted at once. "
                @if is_line { "Each order has one number, h; the zero order is the undeflected beam." }
                @else { "Each order has two numbers, (h,k), counted along two directions; the zero order (0,0) is the undeflected beam." }
            }
            @if let Some(angle) = first_order_angle(measurement) {
                p class="small" { "Check by hand: with d = " (angle.0) " the first order stands " (angle.1) "° off the zero order when the sample faces the beam." }
            }
        }
    }
}

/// Row spacing and first-order angle, as text; `None` where no first order leaves the sample.
fn first_order_angle(measurement: &Measurement) -> Option<(String, String)> {
    let spacing_m = measurement.sample.row_spacing_m.first()?.value;
    let sine = measurement.reciprocal.wavelength_m / spacing_m;
    let unit = units::for_pitch(spacing_m);
    let spacing = format!("{}{}", significant(spacing_m * unit.per_si, 4), unit.suffix());
    (sine > 0.0 && sine < 1.0).then(|| (spacing, significant(sine.asin() * units::DEGREE.per_si, 3)))
}
