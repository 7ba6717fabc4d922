//! In: [`Measurement`](crate::measure::Measurement) and its [`Context`], for the picture also the photo. Out: text for people, JSON for scripts, an overlay PNG.
//! Must never know: how a number came about. Formats only: units and rounding, no physics.
//! Start reading at [`text()`] and [`json()`].

mod budget_table;
mod calibration_text;
mod camera_json;
mod camera_text;
mod columns;
mod context;
mod control_svg;
#[cfg(test)]
mod example;
mod html;
mod json;
mod limits_json;
mod limits_text;
mod orders_csv;
mod overlay;
mod provenance_json;
mod rounding;
mod sample_json;
mod text;
mod trials;
mod units;
mod words;

pub use calibration_text::calibration_text;
pub use camera_json::camera_json;
pub use camera_text::camera_text;
pub use context::{BenchText, Context, LogEntry, PhotoDigest, PhotoRole, Provenance};
pub use control_svg::{ControlPoint, control_svg};
pub use html::{Embeddable, Picture, embeddable, html_report, refused_html_report};
pub use json::{Program, json, refused_json, result_schema};
pub use orders_csv::orders_csv;
pub use overlay::{overlay, png};
pub use rounding::{Rounded, concise, percent, rounded, significant};
pub use text::{refusal_text, text};
