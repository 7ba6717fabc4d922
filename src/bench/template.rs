//! The commented bench file that a new measurement starts from.

use super::Overrides;

/// A bench file in which every key is explained; it reads as it is.
///
/// ```
/// let (bench, _) = spotrule::bench::Bench::parse(&spotrule::bench::template())?;
/// assert_eq!(bench.lasers.len(), 1);
/// # Ok::<(), spotrule::bench::BenchError>(())
/// ```
#[must_use]
pub fn template() -> String {
    template_with(&Overrides::default())
}

/// The same with the operator's answers in place of the examples: the line of an answer is written without `#`.
///
/// An answer is written as given; read the result with [`super::Bench::parse`] to check it.
#[must_use]
pub fn template_with(answers: &Overrides) -> String {
    let answers = with_one_kind_of_target(answers);
    let mut section = "";
    let mut text = String::with_capacity(TEMPLATE.len());
    for line in TEMPLATE.lines() {
        if let Some(name) = line.strip_prefix('[').or_else(|| line.strip_prefix("# [")).and_then(|rest| rest.split_once(']')) {
            section = name.0;
        }
        // A section that is only an offer becomes one as soon as a key in it is answered.
        let opened = line.strip_prefix("# [").filter(|_| answers.names_section(section));
        match (answered(line, section, &answers), opened) {
            (Some(line), _) => text.push_str(&line),
            (None, Some(rest)) => {
                text.push('[');
                text.push_str(rest);
            }
            (None, None) => text.push_str(line),
        }
        text.push('\n');
    }
    text
}

/// The line of a key that is answered, with its comment kept.
fn answered(line: &str, section: &str, answers: &Overrides) -> Option<String> {
    let bare = line.strip_prefix("# ").unwrap_or(line);
    let (key, _) = bare.split_once(" = ")?;
    let value = answers.written_value(section, key)?;
    let comment = bare.rsplit_once("  # ").map(|(_, comment)| format!("  # {comment}")).unwrap_or_default();
    Some(format!("{key} = {value}{comment}"))
}

/// A file has one kind of target; the example dots give way to a sheet or a ruling.
fn with_one_kind_of_target(answers: &Overrides) -> Overrides {
    let mut answers = answers.clone();
    if answers.sheet.is_none() && answers.ruling.is_none() && answers.target_photo.is_some() && answers.target_pitch.is_none() {
        answers.target_pitch = Some(EXAMPLE_TARGET_PITCH.to_owned());
    }
    answers
}

const EXAMPLE_TARGET_PITCH: &str = "10.000(3) mm";

const TEMPLATE: &str = r#"# Bench file of spotrule: what is known of this bench, each value with its uncertainty.
#
# A laser can blind, also by a reflection from the sample, the screen or a tool. Never look into the beam or a specular
# reflection; keep the beam below or above eye height and end it on a matt stop; take off watches and rings; switch the
# laser off while you change the sample. Follow your local laser-safety rules and your laser safety officer;
# class and eyewear per IEC 60825-1.
#
# How to write a value:
#   "812.0(8) mm"             standard uncertainty u = 0.8 mm (digits in the last places, JCGM 100, 7.2.2)
#   "812.0 ± 0.8 mm (k=1)"    the same;  (k=2): expanded, as on most certificates;  (limits): surely within, u = half-width / sqrt(3)
#   "50 mm (exact)"           no uncertainty
# Not known at all: leave the line out. The fit then finds the value if the photo can tell, and says so if it cannot.
# Units: nm, um, mm, cm, m, in, deg, mrad, rad, arcmin, px, degC, K, hPa, Pa, kPa, %.

[laser]
wavelength = "650 ± 10 nm (limits)"  # from the label or, better, a certificate; its relative uncertainty goes straight into the pitch
# medium = "air"  # "vacuum" if the number is a vacuum wavelength (most tables of laser lines); then fill in [air]
# Several lasers: one section [laser.NAME] each.

# [air]
# temperature = "20.0(5) degC"  # only used for wavelengths stated in vacuum
# pressure = "1013(2) hPa"  # at the bench, not reduced to sea level
# humidity = "50(10) %"  # relative

[sample]
mode = "transmission"  # or "reflection"
pattern = "auto"  # "line" (one row of spots), "plane" (a net of spots), or "auto"
incidence = ["0.0(5) deg", "0.0(5) deg"]  # how the sample's normal leans from the zero order: about x, about y (x to the left along the beam, y up)
# pitch = "2.0000(5) um"  # only where it is KNOWN: the certificate of a reference grating; a plane lattice has two, and angle = "90.00(1) deg"
# Several samples: one section [sample.NAME] each; the first without a known pitch is measured.

[screen]
throw = "812.0(8) mm"  # from the sample to the zero-order spot, along the beam
tilt = ["0.0(5) deg", "0.0(5) deg"]  # how the screen leans from square to the beam: about x, about y
seen_from = "front"  # or "behind", when the camera looks through a translucent screen

# The printed dot target, or a sheet or ruled paper, in the plane of the screen. Measure the print: printers scale.
# [target]
# photo = "target.jpg"  # taken from the same camera position; leave out when the target is in the pattern photo
# pitch = "10.000(3) mm"  # distance of neighbouring dots, over as many of them as possible
# sheet = "a4"  # instead of dots: the outline of a sheet (a3, a4, a5, letter, legal, tabloid)
# ruling = "1.000(2) mm"  # instead of dots: ruled or millimetre paper
# turn = "0(1) deg"  # the print against the horizontal of the bench, counter-clockwise for the viewer
# Instead of these, at least four points of the screen whose place is known: X right, Y up in mm; x right, y DOWN in px:
#   marks = [{ px = [380, 293], mm = [0, 210] }, { px = [1487, 336], mm = [297, 210] }, ...]
#   marks_u = "2 px (k=1)"

# [camera]
# square_on = ["0(2) deg", "0(2) deg"]  # how far the line from screen to camera leans from the screen's normal: to the right, up
# focal_length = "3400(50) px"  # or { focal = "4.20(5) mm", pixel = "1.40(1) um" }; otherwise from the photo's own data, or free
# calibration = "camera.toml"  # instead of focal_length: the lens, from spotrule calibrate camera
# scale = { points = [[412.0, 880.0], [1630.0, 902.0]], distance = "100.0(2) mm" }  # two points of the pattern photo, their distance on the screen

# One photo can be named on the command line. For a series, list every photo:
# [[photo]]
# file = "a.jpg"
# laser = "red"  # which [laser.NAME]
# sample = "reference"  # which [sample.NAME]
# step = "50.00(2) mm"  # added to the throw; the camera rides with the screen, unless the photo names a target of its own
# target = "a-target.jpg"  # only where the camera was moved
# turn = "180.0(1) deg"  # the sample turned in its own plane
"#;

#[cfg(test)]
mod tests {
    use super::*;
    use crate::bench::{Bench, SheetFormat, TargetKind};

    #[test]
    fn the_template_reads_as_it_is() {
        let (bench, notes) = Bench::parse(&template()).unwrap();
        assert!(notes.is_empty() && bench.target.is_none() && bench.photos.is_empty());
        assert!((bench.screen.throw_m.unwrap().value - 0.812).abs() < 1e-12);
    }

    /// Every commented example reads too, once its `#` is taken off.
    #[test]
    fn every_example_in_a_comment_reads() {
        let is_key = |rest: &str| {
            rest.starts_with('[') || rest.split_once(" = ").is_some_and(|(key, _)| key.chars().all(|c| c == '_' || c.is_ascii_lowercase()))
        };
        // One kind of target, and a lens either measured or stated: each of these stands in place of another example.
        let skip = ["sheet", "ruling", "calibration", "laser =", "sample =", "pitch = \"2.0"];
        let uncommented = |line: &str| match line.strip_prefix("# ") {
            Some(rest) if is_key(rest) && !skip.iter().any(|start| rest.starts_with(start)) => rest.to_owned(),
            _ => line.to_owned(),
        };
        let text: Vec<String> = template().lines().map(uncommented).collect();
        let (bench, _) = Bench::parse(&text.join("\n")).unwrap();
        assert!(matches!(bench.target.unwrap().kind, TargetKind::Dots { photo: Some(_), .. }));
        assert!(bench.camera.scale.is_some() && bench.camera.focal_length.is_some());
        assert!(bench.photos[0].turn_rad.is_some() && bench.photos[0].target.is_some());
    }

    #[test]
    fn answers_take_the_place_of_examples() {
        let answers = Overrides {
            wavelength: Some("532.0(1) nm".to_owned()),
            medium: Some("vacuum".to_owned()),
            pressure: Some("950(2) hPa".to_owned()),
            throw: Some("1.200(2) m".to_owned()),
            tilt: Some("1(1) deg, 2(1) deg".to_owned()),
            seen_from: Some("behind".to_owned()),
            target_photo: Some("c:\\odd \"name\".jpg".to_owned()),
            scale: Some("412,880 1630,902 = 100.0(2) mm".to_owned()),
            focal_length: Some("4.20(5) mm, 1.40(1) um".to_owned()),
            ..Overrides::default()
        };
        let text = template_with(&answers);
        let (from_template, _) = Bench::parse(&text).unwrap_or_else(|error| panic!("{error}\n{text}"));
        // The same answers as flags over the plain template: one meaning, two ways in.
        let flags = Overrides { target_pitch: Some(EXAMPLE_TARGET_PITCH.to_owned()), ..answers };
        let (from_flags, _) = Bench::with_overrides(Some(&template()), &flags).unwrap();
        assert_eq!(from_template, from_flags);
        assert!(text.contains("medium = \"vacuum\"  # \"vacuum\" if"), "comments stay");
    }

    #[test]
    fn a_sheet_takes_the_place_of_dots() {
        let answers = Overrides { sheet: Some("letter".to_owned()), target_photo: Some("sheet.jpg".to_owned()), ..Overrides::default() };
        let (bench, _) = Bench::parse(&template_with(&answers)).unwrap();
        let want = TargetKind::Sheet { format: SheetFormat::Letter, photo: Some("sheet.jpg".to_owned()) };
        assert_eq!(bench.target.unwrap().kind, want);
    }

    /// A wrong answer gives a file that is refused at the right key, never another meaning.
    #[test]
    fn hostile_answers_stay_texts() {
        let answers = Overrides { throw: Some("1 m\"\n[air]\nx = \"".to_owned()), ..Overrides::default() };
        let error = Bench::parse(&template_with(&answers)).unwrap_err().to_string();
        assert!(error.starts_with("screen.throw"), "{error}");
    }
}
