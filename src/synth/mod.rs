//! Photos made from known truth, seeded; for demos, tests and benches.
//! In: [`Scene`], plain data. Out: [`RenderedPhoto`] (samples as a camera stores them, and the truth behind them) and the bytes of its file.
//! Must never know: how spots are found or fitted.
//! Start reading at [`Scene`], then [`render_pattern`].

mod checks;
mod demo;
mod dots;
mod encode;
mod exif;
mod field;
mod known;
mod opening;
mod orders;
mod pixels;
mod render;
mod scene;
mod sensor;
mod spot_shape;
mod spotlight;
mod truth;

pub use demo::{DEMO_NAMES, demo_scene};
pub use encode::encode;
pub use known::{Known, Stated};
pub use opening::Opening;
pub use orders::{Order, orders};
pub use render::{RenderedPhoto, render_marked, render_pattern, render_target};
pub use scene::{
    Beam, CameraSetup, Dots, ExifData, FileFormat, FileKind, Glare, Laser, Lattice, Lens, Light, PatternCopy, Print, Room, Sample, Scene,
    ScreenSetup, SecondLattice, SecondLobe, Sensor, SensorColour, SensorNoise, Sheet, Speckle, Stray,
};
pub use truth::{Answer, OrderTruth, Truth};

/// Why a scene gives no photo.
#[derive(Debug, thiserror::Error)]
#[non_exhaustive]
pub enum SynthError {
    /// The scene file is no valid TOML, lacks a key or holds an unknown one.
    #[error("the scene file cannot be read: {0}")]
    SceneText(#[from] toml::de::Error),
    /// A value of the scene lies outside the range that can be drawn.
    #[error("scene: {key} = {value}: must be {expected}")]
    Value {
        /// Key as in the scene file.
        key: &'static str,
        /// Value seen.
        value: f64,
        /// Range or condition that holds for it.
        expected: &'static str,
    },
    /// The sample throws no order into the photo.
    #[error("no order of the sample falls into the photo; check throw, pitch and where the camera looks")]
    NothingInFrame,
    /// There is no demo of this name.
    #[error("there is no demo scene named '{name}'; the names are {}", DEMO_NAMES.join(", "))]
    UnknownDemo {
        /// Name asked for.
        name: String,
    },
    /// The truth holds a number that JSON cannot carry.
    #[error("the truth cannot be written as JSON: {0}")]
    Truth(#[from] serde_json::Error),
    /// The image encoder refused.
    #[error("the photo cannot be encoded: {0}")]
    Encode(#[from] image::ImageError),
}
