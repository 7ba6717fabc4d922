//! In: directions, lattices, poses. Out: directions, screen points, pixels. Pure functions, generic over the number type.
//! Must never know: brightness, files, uncertainty.
//! Start reading at [`order_direction`]; the equations stand in `docs/model.md`.

pub mod air;
mod camera;
mod order;
mod screen;

pub use camera::{Camera, Distortion};
pub use order::{Attitude, in_sample_plane, order_direction, zero_order_in_sample_plane};
pub use screen::{PrintPose, ScreenPose, direction_to, screen_hit};
