//! In: the text of a bench file (TOML). Out: [`Bench`]: what the operator knows, checked, in SI units; what a calibration knows, as it was saved.
//! Must never know: photos as pixels, the fit, files (a photo is a name here).
//! Start reading at [`Bench`].

mod calibrated;
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
    calibration::{Calibration, CalibrationError},
    frames::{PixelPoint, Side, TargetPoint},
    quantity::Quantity,
};

pub use calibrated::sections;
pub use error::{BenchError, Place};
pub use laser_lines::{LaserLine, laser_lines};
pub use overrides::Overrides;
pub use sheet::SheetFormat;
pub use target::target_pitch;
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
    /// A saved posterior that takes the place of what is stated of laser, screen, target and camera.
    pub calibration: Option<Calibration>,
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
    /// File with the calibration of the lens, as written.
    pub calibration: Option<String>,
    /// That calibration, once somebody has read the file: see [`Bench::with_lens`].
    pub lens: Option<Calibration>,
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
        let (mut bench, notes) = Self::read(&root)?;
        if let (Some(text), true) = (text, root.get("calibration").is_some()) {
            bench.calibrate_by(text, &root)?;
        }
        bench.check_measured_sample()?;
        Ok((bench, notes))
    }

    /// Reads a bench file that is to be calibrated: the pitch of every sample may be known.
    ///
    /// # Errors
    /// As [`Self::parse`]; also when the bench is calibrated already.
    pub fn to_calibrate(text: &str) -> Result<(Self, Vec<Note>), BenchError> {
        let root = tree::Table::from_toml(text)?;
        if root.get("calibration").is_some() {
            return Err(CalibrationError::Already.into());
        }
        Self::read(&root)
    }

    /// Reads every section, then what binds them.
    fn read(root: &tree::Table) -> Result<(Self, Vec<Note>), BenchError> {
        const SECTIONS: &[&str] = &["laser", "air", "sample", "screen", "target", "camera", "photo", "calibration"];
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
        Ok((Self { lasers, air, samples, screen, target, camera, photos, calibration: None }, notes))
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

#[cfg(test)]
mod tests {
    use proptest::prelude::*;

    use super::*;
    use crate::quantity::Distribution;

    /// The bench file of the crate's documentation, with everything that it can say.
    const FULL: &str = r#"
[laser.red]
wavelength = "632.82(1) nm"
[laser.green]
wavelength = "532.1 ± 0.1 nm (k=2)"
medium = "vacuum"

[air]
temperature = "21.0(5) degC"
pressure = "101.0(2) kPa"
humidity = "45 ± 10 % (limits)"

[sample.unknown]
mode = "reflection"
pattern = "plane"
incidence = ["0.0(5) deg", "30.0(2) deg"]

[sample.reference]
pattern = "line"
pitch = "2.0000(5) um"

[screen]
throw = "812.0(8) mm"
tilt = ["-1.0(5) deg", "2.0(5) deg"]
seen_from = "behind"

[target]
photo = "target.jpg"
pitch = "10.000(3) mm"
turn = "0(1) deg"

[camera]
square_on = ["0(1) deg", "0(1) deg"]
focal_length = { focal = "4.20(5) mm", pixel = "1.40(1) um" }
scale = { points = [[412.0, 880.0], [1630, 902.0]], distance = "100.0(2) mm" }

[[photo]]
file = "a.jpg"
laser = "red"
sample = "reference"

[[photo]]
file = "b.jpg"
laser = "green"
sample = "unknown"
step = "50.00(2) mm"
target = "b-target.jpg"
turn = "180(0.1) deg"
"#;

    fn refusal(text: &str) -> String {
        Bench::parse(text).expect_err(text).to_string()
    }

    /// Takes the full file with one text in place of another.
    fn refusal_of_changed(from: &str, to: &str) -> String {
        assert_eq!(FULL.matches(from).count(), 1, "{from}");
        refusal(&FULL.replace(from, to))
    }

    #[test]
    fn everything_that_can_be_said() {
        let (bench, notes) = Bench::parse(FULL).unwrap();
        assert!(notes.is_empty(), "{notes:?}");
        assert_eq!(bench.lasers.iter().map(|laser| laser.name.as_str()).collect::<Vec<_>>(), ["red", "green"], "in the order of the file");
        assert_eq!(bench.lasers[1].medium, Medium::Vacuum);
        assert!((bench.lasers[1].wavelength_m.u - 0.05e-9).abs() < 1e-18);
        assert_eq!(bench.air.humidity.distribution, Distribution::Rectangular);
        assert_eq!(bench.measured_sample(), Some(0));
        assert_eq!((bench.samples[0].mode, bench.samples[0].pattern), (Mode::Reflection, Pattern::Plane));
        assert!((bench.samples[0].incidence_rad.unwrap()[1].value - 30f64.to_radians()).abs() < 1e-15);
        assert!((bench.samples[1].pitch_m[0].value - 2e-6).abs() < 1e-20);
        assert_eq!(bench.screen.seen_from, Side::Behind);
        assert!(matches!(&bench.target.as_ref().unwrap().kind, TargetKind::Dots { photo: Some(photo), .. } if photo == "target.jpg"));
        assert!(matches!(bench.camera.focal_length, Some(FocalLength::Metres { .. })));
        assert_eq!((bench.photos[0].laser, bench.photos[0].sample), (0, 1));
        assert_eq!((bench.photos[1].laser, bench.photos[1].sample), (1, 0));
        assert!((bench.photos[1].turn_rad.unwrap().u - 0.1f64.to_radians()).abs() < 1e-15);
    }

    #[test]
    fn what_is_left_out_is_not_known() {
        let (bench, notes) = Bench::parse("[laser]\nwavelength = \"650(5) nm\"").unwrap();
        assert!(notes.is_empty());
        assert_eq!((bench.screen.throw_m, bench.screen.tilt_rad, bench.target, bench.camera), (None, None, None, Camera::default()));
        assert_eq!((bench.samples[0].name.as_str(), bench.samples[0].pattern, bench.samples[0].incidence_rad), ("", Pattern::Auto, None));
        assert!(bench.photos.is_empty());
    }

    #[test]
    fn notes_tell_what_was_assumed() {
        let vacuum = "[laser]\nwavelength = \"532.20(10) nm\"\nmedium = \"vacuum\"\n";
        let codes = |text: &str| Bench::parse(text).unwrap().1.iter().map(Note::code).collect::<Vec<_>>();
        assert_eq!(codes(vacuum), ["standard-air-assumed"]);
        assert_eq!(codes(&format!("{vacuum}[air]\npressure = \"950(2) hPa\"")), ["standard-air-assumed"]);
        assert_eq!(codes("[laser]\nwavelength = \"650(5) nm\"\n[air]\npressure = \"950(2) hPa\""), ["air-not-used"]);
        for note in Bench::parse(vacuum).unwrap().1 {
            assert!(note.to_string().contains("1013(30) hPa"));
        }
    }

    /// Each refusal names section and key with the line, the value seen, and what to do.
    #[test]
    fn refusals_name_the_place_and_the_way_out() {
        for (from, to, words) in [
            (
                "throw = \"812.0(8) mm\"",
                "throw = \"812 mm\"",
                vec!["screen.throw (line 23)", "812 mm", "how sure? 812(1) mm means u = 1 mm"],
            ),
            ("throw = \"812.0(8) mm\"", "throw = 812", vec!["screen.throw", "bare number 812", "\"812.0(8) mm\""]),
            ("throw = \"812.0(8) mm\"", "thorw = \"812.0(8) mm\"", vec!["screen.thorw (line 23)", "did you mean throw?", "seen_from"]),
            ("throw = \"812.0(8) mm\"", "throw = \"812,0(8) mm\"", vec!["comma", "\"812.0(8) mm\""]),
            ("throw = \"812.0(8) mm\"", "throw = \"-812.0(8) mm\"", vec!["-812.0(8) mm is no throw", "5 mm to 100 m", "check the number"]),
            ("throw = \"812.0(8) mm\"", "throw = \"812.0(8) m\"", vec!["812.0(8) m is no throw", "did you mean \"812.0(8) mm\"?"]),
            ("throw = \"812.0(8) mm\"", "throw = \"812(900) mm\"", vec!["as large as the value", "leave it out"]),
            ("throw = \"812.0(8) mm\"", "throw = \"\"", vec!["screen.throw", "empty"]),
            ("throw = \"812.0(8) mm\"", "throw = true", vec!["screen.throw", "true"]),
            ("[screen]", "[sceen]", vec!["sceen (line 22)", "section", "did you mean screen?"]),
            ("tilt = [\"-1.0(5) deg\", \"2.0(5) deg\"]", "tilt = \"-1.0(5) deg\"", vec!["screen.tilt", "list of two"]),
            ("tilt = [\"-1.0(5) deg\", \"2.0(5) deg\"]", "tilt = [\"0(1) deg\"]", vec!["screen.tilt", "a list of 1"]),
            ("\"-1.0(5) deg\"", "\"88(1) deg\"", vec!["screen.tilt", "88(1) deg is no tilt", "85 deg"]),
            ("seen_from = \"behind\"", "seen_from = \"back\"", vec!["screen.seen_from", "\"back\"", "front, behind"]),
            ("mode = \"reflection\"", "mode = \"reflexion\"", vec!["sample.unknown.mode", "did you mean reflection?"]),
            (
                "wavelength = \"632.82(1) nm\"",
                "wavelength = \"0.6328(1) nm\"",
                vec!["laser.red.wavelength (line 3)", "did you mean 632.8 nm?", "micrometres"],
            ),
            ("wavelength = \"632.82(1) nm\"", "wavelength = \"6328.2(1) nm\"", vec!["did you mean 632.8 nm?", "angstroms"]),
            ("wavelength = \"632.82(1) nm\"", "wavelength = \"0.532(1) mm\"", vec!["did you mean 532.0 nm?", "thousand times"]),
            ("wavelength = \"632.82(1) nm\"", "wavelength = \"3(1) m\"", vec!["200 nm to 2 um", "state it in nm"]),
            ("wavelength = \"532.1 ± 0.1 nm (k=2)\"", "wavelength = \"266.0(1) nm\"", vec!["laser.green.wavelength", "300 nm"]),
            ("wavelength = \"532.1 ± 0.1 nm (k=2)\"", "wavelength = \"532.1 ± 0.1 nm\"", vec!["what does ± mean?", "(limits)"]),
            ("wavelength = \"532.1 ± 0.1 nm (k=2)\"\n", "", vec!["laser.green.wavelength is missing"]),
            (
                "humidity = \"45 ± 10 % (limits)\"",
                "humidity = \"45(10)\"",
                vec!["air.humidity", "45(10) is no relative humidity", "did you mean \"45(10) %\"?"],
            ),
            ("pressure = \"101.0(2) kPa\"", "pressure = \"1013(2) Pa\"", vec!["air.pressure", "did you mean \"1013(2) hPa\"?"]),
            ("pitch = \"2.0000(5) um\"", "pitch = \"2.0000(5) m\"", vec!["sample.reference.pitch", "20 mm", "did you mean"]),
            ("pitch = \"2.0000(5) um\"", "pitch = [\"2(1) um\", \"3(1) um\"]", vec!["one pitch"]),
            ("pattern = \"plane\"", "pattern = \"plane\"\npitch = \"2(1) um\"", vec!["two pitches and an angle"]),
            ("pattern = \"plane\"", "pitch = \"3.0(1) um\"", vec!["nothing is left to measure"]),
            ("sample = \"unknown\"", "sample = \"reference\"", vec!["no [[photo]] shows sample \"unknown\""]),
            ("sample = \"unknown\"", "sample = \"unknwon\"", vec!["photo 2.sample", "\"unknwon\"", "did you mean unknown?", "reference"]),
            ("laser = \"green\"\n", "", vec!["photo 2.laser", "red, green", "laser = \"red\""]),
            ("file = \"b.jpg\"", "file = \"a.jpg\"", vec!["\"a.jpg\" is listed twice"]),
            ("file = \"b.jpg\"\n", "", vec!["photo 2.file is missing"]),
            ("step = \"50.00(2) mm\"", "step = \"50.00(2) deg\"", vec!["photo 2.step", "unit of angle"]),
            ("turn = \"180(0.1) deg\"", "turn = \"400(1) deg\"", vec!["photo 2.turn", "360 deg"]),
            (
                "focal_length = { focal = \"4.20(5) mm\", pixel = \"1.40(1) um\" }",
                "focal_length = \"4.20(5) mm\"",
                vec!["camera.focal_length", "pixel size"],
            ),
            ("pixel = \"1.40(1) um\"", "pixl = \"1.40(1) um\"", vec!["camera.focal_length.pixl", "did you mean pixel?"]),
            ("[1630, 902.0]", "[412.0, 881.0]", vec!["camera.scale.points", "1.0 px apart"]),
            ("[1630, 902.0]", "[412.0]", vec!["camera.scale.points", "list of two numbers"]),
            ("[1630, 902.0]", "[nan, 1.0]", vec!["camera.scale.points", "NaN"]),
            ("pitch = \"10.000(3) mm\"\n", "", vec!["target.pitch is missing", "marks"]),
            ("pitch = \"10.000(3) mm\"", "pitch = \"10.000(3) mm\"\nsheet = \"a4\"", vec!["target.sheet", "pitch is there too"]),
            ("pitch = \"10.000(3) mm\"", "sheet = \"a44\"", vec!["target.sheet", "did you mean a4?"]),
            ("[laser.green]\n", "", vec!["line 4", "duplicate key", "twice"]),
            ("[laser.red]\n", "[laser]\n", vec!["laser.wavelength", "[laser.green]", "a name"]),
            ("seen_from = \"behind\"", "seen_from = behind", vec!["line 25", "in quotes"]),
            ("seen_from = \"behind\"", "seen_from =", vec!["line 25", "take the line out"]),
        ] {
            let message = refusal_of_changed(from, to);
            for word in words {
                assert!(message.contains(word), "{to}: \"{message}\" lacks \"{word}\"");
            }
        }
    }

    #[test]
    fn one_photo_or_one_laser_needs_no_name() {
        let two = "[laser.a]\nwavelength = \"650(5) nm\"\n[laser.b]\nwavelength = \"532.0(1) nm\"\n";
        assert!(refusal(two).contains("several lasers (a, b) but no [[photo]]"));
        let one = "[laser]\nwavelength = \"650(5) nm\"\n[[photo]]\nfile = \"a.jpg\"\n";
        assert_eq!(Bench::parse(one).unwrap().0.photos[0].laser, 0);
        assert!(refusal(&format!("{one}laser = \"red\"")).contains("has no name: write [laser.red]"));
        assert!(refusal("[laser]\nwavelength = \"650(5) nm\"\n[photo]\nfile = \"a.jpg\"").contains("[[photo]] (two brackets)"));
    }

    #[test]
    fn a_plane_reference_has_two_pitches_and_an_angle() {
        let with = |keys: &str| {
            Bench::parse(&format!(
                "[laser]\nwavelength = \"650(5) nm\"\n[sample.new]\n[sample.known]\n{keys}\n[[photo]]\nfile = \"a.jpg\"\nsample = \"new\""
            ))
        };
        let (bench, _) = with("pitch = [\"2.0(1) um\", \"3.0(1) um\"]\nangle = \"90.0(1) deg\"").unwrap();
        assert_eq!((bench.samples[1].pitch_m.len(), bench.samples[1].lattice_angle_rad.is_some()), (2, true));
        assert!(with("pitch = [\"2.0(1) um\", \"3.0(1) um\"]").unwrap_err().to_string().contains("angle = \"90.00(1) deg\""));
        assert!(with("angle = \"90.0(1) deg\"").unwrap_err().to_string().contains("without the two pitches"));
        assert!(with("pitch = \"2.0(1) um\"\nangle = \"90.0(1) deg\"").unwrap_err().to_string().contains("plane reference"));
        assert!(with("pitch = [\"2.0(1) um\"]").unwrap_err().to_string().contains("a list of 1"));
    }

    #[test]
    fn flags_stand_alone_and_go_over_the_file() {
        let quick = Overrides { wavelength: Some("650(5) nm".to_owned()), throw: Some("1.200(2) m".to_owned()), ..Overrides::default() };
        let (bench, _) = Bench::with_overrides(None, &quick).unwrap();
        assert!((bench.screen.throw_m.unwrap().value - 1.2).abs() < 1e-15);
        let file = "[laser.red]\nwavelength = \"632.8(1) nm\"\n[screen]\nthrow = \"1 mm\"";
        let (bench, _) = Bench::with_overrides(Some(file), &quick).unwrap();
        assert_eq!((bench.lasers.len(), bench.lasers[0].name.as_str()), (1, "red"));
        assert!((bench.lasers[0].wavelength_m.value - 650e-9).abs() < 1e-20);
        let ambiguous = Bench::with_overrides(Some(FULL), &quick).unwrap_err().to_string();
        assert!(ambiguous.starts_with("--wavelength") && ambiguous.contains("red, green"), "{ambiguous}");
        for (overrides, words) in [
            (Overrides { throw: Some("1.2 m".to_owned()), ..quick.clone() }, "--throw: \"1.2 m\": how sure?"),
            (Overrides { tilt: Some("1(1) deg".to_owned()), ..quick.clone() }, "--tilt is a list of 1"),
            (Overrides { scale: Some("1,2,3 = 4(1) mm".to_owned()), ..quick.clone() }, "--scale is \"1,2,3 = 4(1) mm\""),
            (Overrides { wavelength: None, ..quick.clone() }, "laser.wavelength is missing"),
            (Overrides { wavelength: Some("5320(1) nm".to_owned()), ..quick.clone() }, "--wavelength: 5320(1) nm is no wavelength"),
        ] {
            let message = Bench::with_overrides(None, &overrides).unwrap_err().to_string();
            assert!(message.contains(words), "\"{message}\" lacks \"{words}\"");
        }
    }

    #[test]
    fn one_answer_is_checked_by_itself() {
        let throw = |text: &str| Overrides { throw: Some(text.to_owned()), ..Overrides::default() }.check();
        assert!(throw("812.0(8) mm").is_ok());
        assert!(throw("812 mm").unwrap_err().to_string().contains("how sure?"));
        assert!(Overrides { target_photo: Some("t.jpg".to_owned()), ..Overrides::default() }.check().is_ok());
        assert!(
            Overrides { sheet: Some("a4".to_owned()), target_turn: Some("0(1) deg".to_owned()), ..Overrides::default() }.check().is_ok()
        );
        assert!(Overrides::default().check().is_ok());
    }

    #[test]
    fn odd_files() {
        assert!(refusal("").contains("laser.wavelength is missing"));
        assert!(refusal("\u{feff}").contains("laser.wavelength is missing"));
        assert!(refusal("laser = 5").contains("laser (line 1) is the bare number 5"));
        assert!(refusal("[[laser]]\nwavelength = \"650(5) nm\"").contains("laser (line 1) is a list of 1"));
        assert!(refusal("\0\0\u{1}PNG").contains("line 1"));
        assert!(refusal(&"x".repeat(2 << 20)).contains("is it a bench file?"));
        assert!(refusal(&format!("a = {}", "[".repeat(100_000))).contains("line 1"));
        assert!(refusal(&"[laser]\r\nwavelength = \"650 nm\"\r\n".replace("650", "650.5")).contains("laser.wavelength (line 2)"));
        let steering = refusal("[laser]\nwavelength = \"650\\u001b[2J nm\"\nmedium = \"\\u001b[2J\"");
        assert!(!steering.contains('\u{1b}'), "{steering:?}");
        // Nesting without end must not exhaust the stack.
        for deep in
            [format!("{}a = 1", "a.".repeat(400_000)), format!("[{}a]", "a.".repeat(400_000)), format!("x = {}", "{a=".repeat(300_000))]
        {
            assert!(!refusal(&deep).is_empty());
        }
        let dotted = "laser.wavelength = \"650(5) nm\"\nscreen.throw = \"812.0(8) mm\"";
        assert!(Bench::parse(dotted).unwrap().0.screen.throw_m.is_some());
    }

    /// Bench files of photographs with known facts, where they are at hand.
    #[test]
    fn bench_files_of_real_photographs() {
        let shared = std::env::var("SPOTRULE_SHARED").unwrap_or_else(|_| "../shared".to_owned());
        let Ok(folder) = std::fs::read_dir(format!("{shared}/photos/benches")) else {
            println!("skipped: no bench files of real photographs at hand");
            return;
        };
        for path in folder.map(|entry| entry.unwrap().path()) {
            let parsed = Bench::parse(&std::fs::read_to_string(&path).unwrap());
            assert!(parsed.is_ok(), "{}: {parsed:?}", path.display());
        }
    }

    proptest! {
        /// Files damaged by hand: a piece cut out and another put in its place.
        #[test]
        fn damaged_files_never_panic(at in 0..1500_usize, cut in 0..40_usize, put in "[-\\[\\]{}\"=.,0-9a-z±°() \n#']{0,12}") {
            let letters: Vec<char> = FULL.chars().collect();
            let at = at.min(letters.len());
            let end = (at + cut).min(letters.len());
            let text: String = letters[..at].iter().copied().chain(put.chars()).chain(letters[end..].iter().copied()).collect();
            if let Err(error) = Bench::parse(&text) {
                prop_assert!(!error.to_string().is_empty());
            }
        }

        #[test]
        fn no_text_panics(text in "\\PC{0,200}") {
            let _ = Bench::parse(&text);
        }
    }
}
