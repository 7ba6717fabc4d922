//! In: the text of a bench file (TOML). Out: [`Bench`]: what the operator knows, checked, in SI units.
//! Must never know: photos as pixels, the fit, files (a photo is a name here).
//! Start reading at [`Bench`].

mod camera;
mod error;
mod laser;
mod laser_lines;
mod overrides;
mod photos;
mod sample;
mod screen;
mod section;
mod sheet;
mod target;
mod template;
mod tree;

use crate::{
    Note,
    frames::{PixelPoint, TargetPoint},
    quantity::Quantity,
};

pub use error::{BenchError, Place};
pub use laser_lines::{LaserLine, laser_lines};
pub use overrides::Overrides;
pub use sheet::SheetFormat;
pub use template::{template, template_with};

/// Everything the operator knows. `None` means: not known at all.
#[derive(Debug, Clone, PartialEq)]
pub struct Bench {
    /// At least one; the unnamed one is called "".
    pub lasers: Vec<Laser>,
    /// State of the air, for wavelengths stated in vacuum.
    pub air: Air,
    /// At least one; the unnamed one is called "". The one to be measured is the first without a known pitch.
    pub samples: Vec<Sample>,
    /// The screen.
    pub screen: Screen,
    /// How places on the screen are known.
    pub target: Option<Target>,
    /// What is known of the camera.
    pub camera: Camera,
    /// The photos of the pattern, in order; empty when the command line names the one photo.
    pub photos: Vec<PatternPhoto>,
}

/// A laser.
#[derive(Debug, Clone, PartialEq)]
pub struct Laser {
    /// Name in the bench file.
    pub name: String,
    /// Wavelength, m, in `medium`.
    pub wavelength_m: Quantity,
    /// Where the wavelength is stated.
    pub medium: Medium,
}

/// Where a wavelength is stated.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Medium {
    /// In the air of the room.
    Air,
    /// In vacuum; the index of air is applied.
    Vacuum,
}

/// State of the air on the bench.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Air {
    /// Degrees Celsius.
    pub temperature_celsius: Quantity,
    /// Pa.
    pub pressure_pa: Quantity,
    /// Relative humidity as a fraction.
    pub humidity: Quantity,
}

/// A sample.
#[derive(Debug, Clone, PartialEq)]
pub struct Sample {
    /// Name in the bench file.
    pub name: String,
    /// Which side the light leaves.
    pub mode: Mode,
    /// Line or plane, if the operator knows.
    pub pattern: Pattern,
    /// Turns (`a_x`, `a_y`) of the sample's normal against the zero order, rad.
    pub incidence_rad: Option<[Quantity; 2]>,
    /// Known pitches of a reference (one for a line grating, two for a plane lattice), m.
    pub pitch_m: Vec<Quantity>,
    /// Known lattice angle of a reference, rad.
    pub lattice_angle_rad: Option<Quantity>,
}

/// Transmission or reflection. Both obey the same equations; the report names it.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Mode {
    /// The zero order is the straight beam.
    Transmission,
    /// The zero order is the specular beam.
    Reflection,
}

/// What kind of lattice the sample has.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Pattern {
    /// One row of orders.
    Line,
    /// A plane lattice of orders.
    Plane,
    /// Decided by evidence.
    Auto,
}

/// The screen.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Screen {
    /// Sample to zero-order spot along the beam, m.
    pub throw_m: Option<Quantity>,
    /// Turns (`t_x`, `t_y`) of the screen, rad.
    pub tilt_rad: Option<[Quantity; 2]>,
    /// From where the camera looks.
    pub seen_from: Side,
}

/// From where the camera looks at the screen.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Side {
    /// At the lit face.
    Front,
    /// Through a translucent screen.
    Behind,
}

/// How places on the screen are known.
#[derive(Debug, Clone, PartialEq)]
pub struct Target {
    /// The kind of marks.
    pub kind: TargetKind,
    /// Print against the bench's horizontal, counter-clockwise for the viewer, rad.
    pub turn_rad: Option<Quantity>,
}

/// The kinds of target.
#[derive(Debug, Clone, PartialEq)]
pub enum TargetKind {
    /// The printed dot target.
    Dots {
        /// Photo of the target from the same camera position; `None`: the dots are in the pattern photo.
        photo: Option<String>,
        /// Distance of neighbouring dots, m.
        pitch_m: Quantity,
    },
    /// Points whose place is known.
    Marks {
        /// Pixel and place of each.
        marks: Vec<(PixelPoint, TargetPoint)>,
        /// Standard uncertainty of each pixel coordinate.
        u_px: f64,
    },
    /// The outline of a sheet of paper.
    Sheet {
        /// Its size.
        format: SheetFormat,
        /// Photo of the sheet from the same camera position; `None`: the sheet is in the pattern photo.
        photo: Option<String>,
    },
    /// Ruled or millimetre paper.
    Ruling {
        /// Distance of neighbouring lines, m.
        pitch_m: Quantity,
        /// Photo of the ruling from the same camera position; `None`: the ruling is in the pattern photo.
        photo: Option<String>,
    },
}

/// What is known of the camera.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct Camera {
    /// Lean of the line from screen to camera from the screen's normal: to the right, up; rad.
    pub square_on_rad: Option<[Quantity; 2]>,
    /// Focal length.
    pub focal_length: Option<FocalLength>,
    /// Two points and their distance.
    pub scale: Option<Scale>,
}

/// A focal length as the operator states it.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum FocalLength {
    /// In pixels.
    Pixels(Quantity),
    /// Of the lens, with the pixel size of the photo as stored, m.
    Metres {
        /// Focal length, m.
        focal_length_m: Quantity,
        /// Pixel size, m.
        pixel_size_m: Quantity,
    },
}

/// Two points of the photo and their distance on the screen.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Scale {
    /// The two points.
    pub points: [PixelPoint; 2],
    /// Their distance, m.
    pub distance_m: Quantity,
}

/// One photo of the pattern.
#[derive(Debug, Clone, PartialEq)]
pub struct PatternPhoto {
    /// File name as written.
    pub file: String,
    /// Index into [`Bench::lasers`].
    pub laser: usize,
    /// Index into [`Bench::samples`].
    pub sample: usize,
    /// Added to the throw, m.
    pub step_m: Option<Quantity>,
    /// A target photo of its own, where the camera moved.
    pub target: Option<String>,
    /// The sample turned in its own plane, rad.
    pub turn_rad: Option<Quantity>,
}

impl Bench {
    /// Reads a bench file.
    ///
    /// # Errors
    /// A [`BenchError`] that names section and key, the line, the value seen and what to do.
    pub fn parse(text: &str) -> Result<(Self, Vec<Note>), BenchError> {
        Self::with_overrides(Some(text), &Overrides::default())
    }

    /// Reads a bench file, or none, with values from the command line in place of those in the file.
    ///
    /// # Errors
    /// A [`BenchError`] that names section and key with the line, or the flag, the value seen and what to do.
    pub fn with_overrides(text: Option<&str>, overrides: &Overrides) -> Result<(Self, Vec<Note>), BenchError> {
        let mut root = text.map(tree::Table::from_toml).transpose()?.unwrap_or_default();
        overrides.apply(&mut root)?;
        Self::read(&root)
    }

    /// Reads every section, then what binds them.
    fn read(root: &tree::Table) -> Result<(Self, Vec<Note>), BenchError> {
        const SECTIONS: &[&str] = &["laser", "air", "sample", "screen", "target", "camera", "photo"];
        section::Section::of(String::new(), root).allow_only(SECTIONS)?;
        let mut notes = Vec::new();
        let lasers = laser::read_lasers(root)?;
        notes.extend(lasers.iter().filter_map(laser_lines::wrong_medium));
        let air = laser::read_air(root, &lasers, &mut notes)?;
        let samples = sample::read_samples(root)?;
        let screen = screen::read_screen(root)?;
        let target = target::read_target(root, screen.seen_from)?;
        let camera = camera::read_camera(root)?;
        let photos = photos::read_photos(root, &lasers, &samples)?;
        let bench = Self { lasers, air, samples, screen, target, camera, photos };
        bench.check_measured_sample()?;
        Ok((bench, notes))
    }

    /// Index of the sample to be measured: the first without a known pitch.
    #[must_use]
    pub fn measured_sample(&self) -> Option<usize> {
        self.samples.iter().position(|sample| sample.pitch_m.is_empty())
    }

    fn check_measured_sample(&self) -> Result<(), BenchError> {
        let index = self.measured_sample().ok_or(BenchError::NothingToMeasure)?;
        if self.photos.is_empty() || self.photos.iter().any(|photo| photo.sample == index) {
            return Ok(());
        }
        Err(BenchError::NoPhotoOfSample { name: self.samples[index].name.clone() })
    }
}
