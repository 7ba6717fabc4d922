//! In: [`Measurement`](crate::measure::Measurement), for the picture also the photo. Out: text for people, JSON for scripts, an overlay PNG.
//! Must never know: how a number came about. Formats only: units and rounding, no physics.
//! Start reading at [`text()`] and [`json()`].

mod budget_table;
mod calibration_text;
mod camera_json;
mod camera_text;
mod columns;
#[cfg(test)]
mod example;
mod json;
mod overlay;
mod rounding;
mod sample_json;
mod text;
mod trials;
mod units;
mod words;

pub use calibration_text::calibration_text;
pub use camera_json::camera_json;
pub use camera_text::camera_text;
pub use json::{Program, json, refused_json};
pub use overlay::{overlay, png};
pub use rounding::{Rounded, concise, percent, rounded, significant};
pub use text::{refusal_text, text};
