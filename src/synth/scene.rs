//! A bench as plain data: everything that decides how the photo comes out. The file form (TOML) has the same names.
//!
//! SI throughout, the unit in the name; frames as in [`crate::frames`]. Every key is checked, unknown ones are refused.

use super::{SynthError, known::Known, opening::Opening};
use crate::{
    bench::Mode,
    frames::Side,
    math::rotation::turned_about_x_then_y,
    optics::{Attitude, Camera, Distortion, PrintPose, ScreenPose},
};
use nalgebra::{Matrix3, Rotation3, Vector3};
use serde::{Deserialize, Serialize};

/// One bench and one camera, with the photo that they give.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Scene {
    /// Seed of everything random: speckle, paper, noise, scatter of the orders' brightness.
    pub seed: u64,
    /// Lasers that shine at the same time; usually one.
    #[serde(rename = "laser")]
    pub lasers: Vec<Laser>,
    /// Shape of the beam.
    pub beam: Beam,
    /// The periodic sample.
    pub sample: Sample,
    /// The screen.
    pub screen: ScreenSetup,
    /// The printed dots in the plane of the screen.
    pub print: Print,
    /// The camera.
    pub camera: CameraSetup,
    /// Levels of light.
    pub light: Light,
    /// The sensor.
    pub sensor: Sensor,
    /// Light and dirt that is no order.
    #[serde(default)]
    pub stray: Stray,
    /// The photo file.
    pub file: FileFormat,
    /// What the operator knows; becomes the bench file.
    #[serde(default)]
    pub known: Known,
}

/// A laser line and what the camera makes of it.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Laser {
    /// Wavelength in the air at the sample, m.
    pub wavelength_m: f64,
    /// Response of red, green and blue after white balance; the largest is 1.
    pub colour: [f64; 3],
}

/// A Gaussian beam, where it matters: on the sample and in the far field.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Beam {
    /// 1/e² radius on the sample, across the beam, m.
    pub footprint_radius_m: f64,
    /// 1/e² half-angle, rad.
    pub half_divergence_rad: f64,
    /// A laser in two transverse modes: each spot is a pair; `None`: one lobe.
    #[serde(default)]
    pub second_lobe: Option<SecondLobe>,
}

/// The second of two lobes of a beam. The centroid of both stays on the chief ray.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct SecondLobe {
    /// From the first lobe to the second, as slopes of the incoming beam along x and y, rad.
    pub apart_rad: [f64; 2],
    /// Its share of the light.
    pub share: f64,
}

/// The sample.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Sample {
    /// Transmission or reflection (the same equations; the name goes into the bench file).
    #[serde(with = "ModeWord")]
    pub mode: Mode,
    /// Turns of the sample's normal against the zero order, about x, about y, rad.
    pub incidence_rad: [f64; 2],
    /// The repeat.
    pub lattice: Lattice,
    /// A second lattice beside the first one in the same beam (two samples under one beam; without the orders that they make together).
    #[serde(default)]
    pub second: Option<SecondLattice>,
    /// The opening of one cell; decides the envelope of the orders.
    pub opening: Opening,
    /// Peak of the zero order over the brightest other order in the frame; 0 = beam stop or hole.
    pub zero_order_factor: f64,
    /// Each order's power is multiplied by 1 ± this, uniformly.
    pub order_scatter: f64,
}

/// The repeat of the sample in its own plane.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
#[serde(tag = "kind", rename_all = "kebab-case", deny_unknown_fields)]
pub enum Lattice {
    /// A line grating.
    Line {
        /// Pitch, m.
        pitch_m: f64,
        /// Grating vector against `x_s`, counter-clockwise, rad.
        turn_rad: f64,
    },
    /// A plane lattice.
    Plane {
        /// Lengths of the two lattice vectors, m.
        pitch_m: [f64; 2],
        /// From the first to the second, rad.
        angle_rad: f64,
        /// First lattice vector against `x_s`, counter-clockwise, rad.
        turn_rad: f64,
    },
}

/// A second lattice in the beam.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct SecondLattice {
    /// Its repeat.
    pub lattice: Lattice,
    /// Power of its orders over the power of the first lattice's orders at the same place.
    pub power: f64,
}

/// Where the screen stands.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct ScreenSetup {
    /// Sample to zero-order spot, along the beam, m.
    pub throw_m: f64,
    /// Turns about x and y, rad.
    pub tilt_rad: [f64; 2],
    /// From where the camera looks.
    #[serde(with = "SideWord")]
    pub seen_from: Side,
    /// A sheet on a darker wall; `None`: the screen fills the frame.
    pub sheet: Option<Sheet>,
    /// Radius of a hole in the screen for the zero order, m; 0: none. What falls into it is gone, so set `sample.zero_order_factor` to 0 as well.
    #[serde(default)]
    pub hole_radius_m: f64,
    /// Relative standard deviation of the paper's reflectance.
    pub texture: f64,
}

/// A sheet whose edges may be in the picture.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Sheet {
    /// Left, bottom, right, top in print axes, m.
    pub edges_m: [f64; 4],
    /// Reflectance of what is behind (the sheet's is 1).
    pub wall_reflectance: f64,
}

/// The printed dots: dots of 0.4 pitch, marks of 0.7 pitch at (0,0), (2,0) and (0,1).
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Print {
    /// Where the dots are to be seen.
    pub dots: Dots,
    /// Distance of neighbouring dots, m.
    pub pitch_m: f64,
    /// First and last column of dots (origin mark = 0).
    pub columns: [i32; 2],
    /// First and last row of dots, upwards.
    pub rows: [i32; 2],
    /// Reflectance of the ink.
    pub ink_reflectance: f64,
    /// Place of the zero order on the print (X, Y), m.
    pub zero_order_m: [f64; 2],
    /// Turn of the print, counter-clockwise for the viewer, rad.
    pub turn_rad: f64,
}

/// Where the printed dots are to be seen.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "kebab-case")]
pub enum Dots {
    /// In a photo of its own from the same camera position.
    OwnPhoto,
    /// In the pattern photo.
    InPattern,
    /// Nowhere.
    Nowhere,
}

/// The camera and where it stands.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct CameraSetup {
    /// The lens.
    pub lens: Lens,
    /// Point of the screen at the principal point: right and up from the zero order as the viewer sees it, m.
    pub aim_m: [f64; 2],
    /// From that point to the camera, m.
    pub distance_m: f64,
    /// The camera stands along `out + tan(right) r + tan(up) v` of the screen, rad.
    pub lean_rad: [f64; 2],
    /// Turn of the camera about its axis, clockwise as the camera sees, rad.
    pub roll_rad: f64,
}

/// The lens in pixels.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Lens {
    /// Focal length, px.
    pub focal_px: f64,
    /// Principal point, px.
    pub principal_px: [f64; 2],
    /// Brown-Conrady k1, k2.
    pub radial: [f64; 2],
    /// Brown-Conrady p1, p2.
    pub tangential: [f64; 2],
    /// Blur, standard deviation, px.
    pub blur_px: f64,
    /// Loss of light in the corners as a fraction.
    pub vignetting: f64,
}

/// Levels of light: 1 = the photo clips.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Light {
    /// Peak of the brightest order in the frame that is not the zero order; above 1 it clips.
    pub brightest_order: f64,
    /// Share of a spot's light in a skirt four times as wide.
    pub skirt: f64,
    /// Laser speckle; `None`: smooth spots.
    pub speckle: Option<Speckle>,
    /// Veiling glare of the lens; `None`: a perfect lens.
    pub glare: Option<Glare>,
    /// The room's own light.
    pub room: Room,
}

/// Laser speckle as the camera resolves it.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Speckle {
    /// Standard deviation over mean.
    pub contrast: f64,
    /// Full width at half maximum of the intensity's autocorrelation, px.
    pub grain_px: f64,
}

/// Light scattered in the lens: a share of each spot spread by `(1 + (r/core)²)^(-power)`.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Glare {
    /// Share of the light that is scattered.
    pub share: f64,
    /// Core radius, px.
    pub core_px: f64,
    /// Power, above 1.
    pub power: f64,
}

/// Room light on white paper, in the middle of the frame.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Room {
    /// In the pattern photo.
    pub pattern_level: f64,
    /// In the target photo, or where dots and pattern share a photo.
    pub target_level: f64,
    /// Red, green and blue; the largest is 1.
    pub tint: [f64; 3],
    /// Relative change over the width and over the height.
    pub gradient: [f64; 2],
}

/// The sensor and its electronics.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Sensor {
    /// Colour or grey.
    pub colour: SensorColour,
    /// `None`: no noise at all.
    pub noise: Option<SensorNoise>,
    /// Bits of the converter.
    pub bits: u8,
    /// Level added before the converter and kept in 16-bit files, so that noise around black is not cut.
    #[serde(default)]
    pub black_level: f64,
    /// Gains of red, green and blue, the smallest 1; a colour sensor clips before and after them.
    pub white_balance: [f64; 3],
}

/// How the sensor sees colour.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "kebab-case")]
pub enum SensorColour {
    /// RGGB mosaic, bilinear demosaicing.
    Bayer,
    /// One grey channel.
    Mono,
}

/// Noise of the sensor.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct SensorNoise {
    /// Electrons at which a pixel clips.
    pub full_well_e: f64,
    /// Electrons, standard deviation.
    pub read_noise_e: f64,
}

/// Light and dirt that is no order.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields, default)]
pub struct Stray {
    /// Number of stray laser spots at random places.
    pub ghosts: u32,
    /// Peak of the brightest ghost.
    pub ghost_level: f64,
    /// A faint copy of the whole pattern, as the back of a window or a plate throws it; `None`: none.
    pub copy: Option<PatternCopy>,
    /// Number of wide soft patches of laser light, 3 to 8 times as wide as an order.
    pub blobs: u32,
    /// Peak of the brightest soft patch.
    pub blob_level: f64,
    /// Number of reflections of the room's light.
    pub glints: u32,
    /// Peak of the brightest reflection.
    pub glint_level: f64,
    /// Number of hot pixels.
    pub hot_pixels: u32,
    /// Number of dark specks on the paper.
    pub specks: u32,
}

impl Default for Stray {
    fn default() -> Self {
        Self { ghosts: 0, ghost_level: 0.2, copy: None, blobs: 0, blob_level: 0.1, glints: 0, glint_level: 0.5, hot_pixels: 0, specks: 0 }
    }
}

/// A faint copy of the pattern, shifted in the photo.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct PatternCopy {
    /// Share of each order's light.
    pub share: f64,
    /// Right and down, px.
    pub shift_px: [f64; 2],
}

/// The photo file.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct FileFormat {
    /// As displayed, px.
    pub width_px: u32,
    /// As displayed, px.
    pub height_px: u32,
    /// JPEG or PNG.
    pub kind: FileKind,
    /// EXIF data; only JPEG files carry them here.
    pub exif: Option<ExifData>,
}

/// Kind of the photo file.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
#[serde(tag = "format", rename_all = "kebab-case", deny_unknown_fields)]
pub enum FileKind {
    /// 8 bit, sRGB-coded, 4:4:4.
    Jpeg {
        /// 1 to 100.
        quality: u8,
        /// Strength of a mild S curve on top of sRGB, 0 = none.
        s_curve: f64,
    },
    /// 16 bit, linear light.
    Png16,
}

/// What the camera writes about itself. The 35-mm-equivalent focal length follows from the lens.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct ExifData {
    /// EXIF orientation, 1 to 8: the file is stored turned so that this tag sets it upright.
    pub orientation: u8,
    /// Focal length of the lens, m.
    pub focal_length_m: f64,
    /// Exposure time, s.
    pub exposure_s: f64,
    /// f-number.
    pub f_number: f64,
    /// ISO speed.
    pub iso: u16,
}

#[derive(Serialize, Deserialize)]
#[serde(remote = "Side", rename_all = "lowercase")]
enum SideWord {
    Front,
    Behind,
}

#[derive(Serialize, Deserialize)]
#[serde(remote = "Mode", rename_all = "lowercase")]
enum ModeWord {
    Transmission,
    Reflection,
}

impl Lattice {
    /// Direct lattice vectors along `x_s`, `y_s`, m; the second is `None` for a line grating.
    #[must_use]
    pub fn direct_m(&self) -> ([f64; 2], Option<[f64; 2]>) {
        let along = |length: f64, angle: f64| [length * angle.cos(), length * angle.sin()];
        match *self {
            Self::Line { pitch_m, turn_rad } => (along(pitch_m, turn_rad), None),
            Self::Plane { pitch_m, angle_rad, turn_rad } => (along(pitch_m[0], turn_rad), Some(along(pitch_m[1], turn_rad + angle_rad))),
        }
    }

    /// Reciprocal vectors `g1`, `g2` with `a_i · g_j = δ_ij`, cycles per metre; the second is `None` for a line grating.
    #[must_use]
    pub fn reciprocal_per_m(&self) -> ([f64; 2], Option<[f64; 2]>) {
        match self.direct_m() {
            (a, None) => {
                let square = a[0] * a[0] + a[1] * a[1];
                ([a[0] / square, a[1] / square], None)
            }
            (a, Some(b)) => {
                let area = a[0] * b[1] - a[1] * b[0];
                ([b[1] / area, -b[0] / area], Some([-a[1] / area, a[0] / area]))
            }
        }
    }
}

impl Scene {
    /// Reads a scene file and checks every value.
    ///
    /// # Errors
    /// TOML that cannot be read, unknown or missing keys, values that cannot be drawn.
    pub fn from_toml(text: &str) -> Result<Self, SynthError> {
        let scene: Self = toml::from_str(text)?;
        scene.check()?;
        Ok(scene)
    }

    /// Attitude of the sample.
    #[must_use]
    pub fn attitude(&self) -> Attitude<f64> {
        Attitude::turned(self.sample.incidence_rad)
    }

    /// Pose of the screen.
    #[must_use]
    pub fn screen_pose(&self) -> ScreenPose<f64> {
        ScreenPose::new(self.screen.throw_m, self.screen.tilt_rad)
    }

    /// Pose of the print in the screen plane.
    #[must_use]
    pub fn print_pose(&self) -> PrintPose<f64> {
        PrintPose { zero_order_m: self.print.zero_order_m, turn_rad: self.print.turn_rad, seen_from: self.screen.seen_from }
    }

    /// The camera in front of the print.
    #[must_use]
    pub fn camera(&self) -> Camera<f64> {
        let setup = &self.camera;
        // Viewer's axes: r right, v up, out of the screen towards the camera; origin in the zero order.
        let aim = Vector3::new(setup.aim_m[0], setup.aim_m[1], 0.0);
        let outwards = Vector3::new(setup.lean_rad[0].tan(), setup.lean_rad[1].tan(), 1.0).normalize();
        let eye = aim + outwards * setup.distance_m;
        let camera_from_viewer = looking_along(-outwards, setup.roll_rad);
        let viewer_from_print = Rotation3::from_axis_angle(&Vector3::z_axis(), self.print.turn_rad).into_inner();
        let zero_order = Vector3::new(self.print.zero_order_m[0], self.print.zero_order_m[1], 0.0);
        let place = camera_from_viewer * (-(viewer_from_print * zero_order) - eye);
        Camera {
            focal_px: setup.lens.focal_px,
            principal_px: setup.lens.principal_px,
            distortion: Distortion { radial: setup.lens.radial, tangential: setup.lens.tangential },
            turn_rad: [0.0; 3],
            place_m: [place.x, place.y, place.z],
            reference: camera_from_viewer * viewer_from_print,
        }
    }

    /// Axes of the screen in the bench frame; column 2 is its normal.
    pub(super) fn screen_axes(&self) -> Matrix3<f64> {
        turned_about_x_then_y(self.screen.tilt_rad)
    }

    /// The sample's normal in the bench frame.
    pub(super) fn normal(&self) -> Vector3<f64> {
        turned_about_x_then_y(self.sample.incidence_rad).column(2).into_owned()
    }
}

/// Camera axes (rows: right, down, forward) of a camera that looks along `forward` with the viewer's v upwards.
fn looking_along(forward: Vector3<f64>, roll_rad: f64) -> Matrix3<f64> {
    let right = forward.cross(&Vector3::y()).normalize();
    let down = forward.cross(&right);
    let level = Matrix3::from_rows(&[right.transpose(), down.transpose(), forward.transpose()]);
    Rotation3::from_axis_angle(&Vector3::z_axis(), -roll_rad).into_inner() * level
}
