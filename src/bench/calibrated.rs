//! `[calibration]`: a bench whose posterior was saved, ready for the next sample.

use super::{
    Bench, BenchError, Pattern, Sample,
    tree::{Content, Node, Table},
};
use crate::calibration::{self, Calibration, CalibrationError, Kind, Shows};
use crate::digest::sha256_hex;

/// The sections that a calibration stands for. Samples and photos are the next measurement's own.
const STANDS_FOR: [&str; 5] = ["laser", "air", "screen", "target", "camera"];

/// SHA-256 of what each section that a calibration stands for says in this text; spaces, comments and the order of the keys do not matter.
///
/// # Errors
/// [`BenchError::Syntax`], [`BenchError::TooLong`].
pub fn sections(text: &str) -> Result<Vec<(String, String)>, BenchError> {
    Ok(sections_of(&Table::from_toml(text)?))
}

fn sections_of(root: &Table) -> Vec<(String, String)> {
    STANDS_FOR.iter().map(|name| ((*name).to_owned(), sha256_hex(root.get(name).map_or(String::new(), plain).as_bytes()))).collect()
}

/// A value as text of one form, whatever the file looks like.
fn plain(node: &Node) -> String {
    match &node.content {
        Content::Text(text) => format!("{:?}", text.trim()),
        Content::Number(number) => format!("{number:?}"),
        Content::Other(written) => written.clone(),
        Content::List(items) => format!("[{}]", items.iter().map(plain).collect::<Vec<_>>().join(",")),
        Content::Table(table) => {
            let mut pairs: Vec<String> = table.0.iter().map(|(key, value)| format!("{key:?}={}", plain(value))).collect();
            pairs.sort();
            format!("{{{}}}", pairs.join(","))
        }
    }
}

impl Bench {
    /// Takes the calibration of this text into the bench that was read from it.
    pub(super) fn calibrate_by(&mut self, text: &str, root: &Table) -> Result<(), BenchError> {
        let Some(calibration) = calibration::read(text)? else { return Ok(()) };
        if calibration.kind != Kind::Bench {
            let advice = "; name the file as [camera] calibration instead";
            return Err(CalibrationError::WrongKind { seen: "a camera", needed: "that of a bench", advice }.into());
        }
        let now = sections_of(root);
        if let Some((section, _)) = now.iter().find(|section| !calibration.made_from.sections.contains(section)) {
            return Err(CalibrationError::SectionChanged { section: section.clone() }.into());
        }
        self.leave_out_photos_of(&calibration)?;
        self.calibration = Some(calibration);
        Ok(())
    }

    /// Photos that the calibration was made from are not measured again, and a reference that nothing shows any more makes room for a sample.
    fn leave_out_photos_of(&mut self, calibration: &Calibration) -> Result<(), BenchError> {
        let used = |file: &str| calibration.made_from.photos.iter().any(|photo| photo.shows == Shows::Pattern && photo.file == file);
        self.photos.retain(|photo| !used(&photo.file));
        if !self.photos.is_empty() {
            return Ok(());
        }
        let unknown: Vec<&Sample> = self.samples.iter().filter(|sample| sample.pitch_m.is_empty()).collect();
        let sample = match unknown.as_slice() {
            [sample] => (*sample).clone(),
            [] => next_sample(&self.samples),
            several => return Err(photos_needed("sample", several.iter().map(|sample| sample.name.as_str()))),
        };
        if self.lasers.len() > 1 {
            return Err(photos_needed("laser", self.lasers.iter().map(|laser| laser.name.as_str())));
        }
        self.samples = vec![sample];
        Ok(())
    }

    /// The bench with the calibration of its lens, read from the file that [`super::Camera::calibration`] names.
    ///
    /// # Errors
    /// [`BenchError::Calibration`]: not the text of a camera's calibration.
    pub fn with_lens(mut self, text: &str) -> Result<Self, BenchError> {
        let calibration = calibration::read(text)?.ok_or(CalibrationError::Absent)?;
        if calibration.kind != Kind::Camera {
            let advice = "; measure with that bench file itself";
            return Err(CalibrationError::WrongKind { seen: "a bench", needed: "that of a camera", advice }.into());
        }
        self.camera.lens = Some(calibration);
        Ok(self)
    }
}

/// A sample of which nothing is said: mounted as the reference was, in the same beam.
fn next_sample(references: &[Sample]) -> Sample {
    let mut sample = references[0].clone();
    (sample.name, sample.pattern) = (String::new(), Pattern::Auto);
    (sample.pitch_m, sample.lattice_angle_rad) = (Vec::new(), None);
    sample
}

fn photos_needed<'a>(kind: &'static str, names: impl Iterator<Item = &'a str>) -> BenchError {
    BenchError::PhotosNeeded { kind, names: names.collect::<Vec<_>>().join(", ") }
}

#[cfg(test)]
mod tests {
    use super::*;

    const BENCH: &str = "[laser]\nwavelength = \"650(5) nm\"\n[screen]\nthrow = \"812.0(8) mm\"\ntilt = [\"0(1) deg\", \"0(1) deg\"]\n";

    #[test]
    fn the_look_of_a_section_does_not_matter_its_values_do() {
        let same = "# c\n[screen]\n tilt = ['0(1) deg',\n  '0(1) deg'] # c\r\nthrow=\"812.0(8) mm\"\n[laser]\nwavelength = \"650(5) nm\"\n[sample]\n";
        assert_eq!(sections(BENCH).unwrap(), sections(same).unwrap());
        let other = sections(&BENCH.replace("812.0(8)", "812.0(9)")).unwrap();
        let changed: Vec<String> =
            sections(BENCH).unwrap().into_iter().zip(other).filter(|(a, b)| a != b).map(|(section, _)| section.0).collect();
        assert_eq!(changed, ["screen"]);
    }

    #[test]
    fn a_bench_of_references_only_can_be_calibrated_but_not_measured() {
        let text = format!("{BENCH}[sample]\npitch = \"2.0000(5) um\"\n");
        assert!(matches!(Bench::parse(&text), Err(BenchError::NothingToMeasure)));
        assert!(Bench::to_calibrate(&text).is_ok());
    }
}
