//! The published laser lines of `calibration/laser-lines.toml`, and the commonest slip with them.

use super::{BenchError, Laser, Medium, section::Section, tree};
use crate::{
    Note,
    quantity::{Dimension, Quantity},
};

/// The list as it is shipped.
const LIST: &str = include_str!("../../calibration/laser-lines.toml");

/// A published line.
#[derive(Debug, Clone, PartialEq)]
pub struct LaserLine {
    /// What the trade calls it.
    pub name: String,
    /// Wavelength in vacuum, m.
    pub wavelength_m: Quantity,
    /// Where the number was published.
    pub source: String,
    /// Whether the number was not looked up there.
    pub from_memory: bool,
}

/// The published lines, in the order of the list.
///
/// # Errors
/// None with the list as it is shipped (see its test); the type is that of any bench file.
pub fn laser_lines() -> Result<Vec<LaserLine>, BenchError> {
    let root = tree::Table::from_toml(LIST)?;
    let tree::Content::List(lines) = root.get("line").map_or(tree::Content::List(Vec::new()), |node| node.content.clone()) else {
        return Ok(Vec::new());
    };
    let tables = lines.iter().filter_map(|node| match &node.content {
        tree::Content::Table(table) => Some(Section::of("line".to_owned(), table)),
        _ => None,
    });
    tables.map(|line| read_line(&line)).collect()
}

fn read_line(line: &Section<'_>) -> Result<LaserLine, BenchError> {
    let text = |key: &str| line.text(key, "a text").map(|text| text.unwrap_or_default().to_owned());
    let missing = || BenchError::Missing { key: line.path_of("wavelength"), advice: "every line has one".to_owned() };
    let from_memory = line.node("from_memory").is_some_and(|node| matches!(&node.content, tree::Content::Other(word) if word == "true"));
    let wavelength_m = line.quantity("wavelength", Dimension::Length)?.ok_or_else(missing)?.quantity;
    Ok(LaserLine { name: text("name")?, wavelength_m, source: text("source")?, from_memory })
}

/// A note where the stated wavelength is the number of a narrow line in the other medium.
///
/// Labels and tables mix both; the slip costs 2.7e-4 of the pitch. The air of a room is within 5e-5 of n = 1.00027 below about 1500 m.
pub(super) fn wrong_medium(laser: &Laser) -> Option<Note> {
    const N_AIR: f64 = 1.000_27;
    const NEAR: f64 = 5e-5;
    const NARROW: f64 = 1e-5;
    let stated = laser.wavelength_m;
    // A wider statement holds both numbers, or says that the laser is no such line.
    if stated.u > 3e-5 * stated.value {
        return None;
    }
    let lines = laser_lines().unwrap_or_default();
    let mut narrow = lines.into_iter().filter(|line| line.wavelength_m.u < NARROW * line.wavelength_m.value);
    let is_near = |line: &LaserLine, factor: f64| (stated.value * factor / line.wavelength_m.value - 1.0).abs() < NEAR;
    let (factor, belongs_to) = match laser.medium {
        Medium::Air => (1.0, Medium::Vacuum),
        Medium::Vacuum => (N_AIR, Medium::Air),
    };
    let line = narrow.find(|line| is_near(line, factor))?;
    Some(Note::WavelengthInOtherMedium { wavelength_m: stated.value, line: line.name, belongs_to })
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::bench::{Bench, tree::Content};

    /// Speed of light in vacuum, m/s, exact since 1983 (26th CGPM 2018, defining constant).
    const C: f64 = 299_792_458.0;

    fn number(line: &Section<'_>, key: &str) -> Option<f64> {
        match line.node(key)?.content {
            Content::Number(value) => Some(value),
            _ => None,
        }
    }

    /// c/f and 1/wavenumber are recomputed; the printed wavelength may differ by half its last place, which is u/20 at most
    /// since u is printed with two digits; u itself follows from the relative one to its two digits.
    #[test]
    fn wavelengths_follow_from_frequencies() {
        let root = tree::Table::from_toml(LIST).unwrap();
        let Content::List(lines) = &root.get("line").unwrap().content else { panic!("no list") };
        let mut from_frequency = 0;
        for node in lines {
            let Content::Table(table) = &node.content else { panic!("no table") };
            let section = Section::of("line".to_owned(), table);
            let line = read_line(&section).unwrap();
            let Quantity { value, u, .. } = line.wavelength_m;
            let relative_u = number(&section, "relative_u").unwrap();
            assert!((u / value / relative_u - 1.0).abs() < 0.05, "{}: u {u:e}", line.name);
            let frequency = number(&section, "frequency_hz").map(|f| C / f);
            let wavenumber = number(&section, "wavenumber_per_cm").map(|k| 0.01 / k);
            from_frequency += usize::from(frequency.is_some());
            if let Some(want) = frequency.or(wavenumber) {
                // 4e-16: the float's own rounding, which matters for the lines known to 1e-11.
                assert!((value - want).abs() <= 0.051 * u + 4e-16 * value, "{}: {value:e}, want {want:e}", line.name);
            }
            assert!(!line.source.is_empty() && !line.name.is_empty());
            assert!(frequency.is_some() || line.from_memory, "{}: neither a frequency nor marked", line.name);
        }
        assert_eq!((lines.len(), from_frequency), (12, 7));
        assert_eq!(laser_lines().unwrap().len(), 12);
    }

    /// CIPM list as published, nm: an independent transcription of the wavelengths beside the frequencies above.
    #[test]
    fn published_wavelengths() {
        let lines = laser_lines().unwrap();
        for (part, want_nm, digits_nm) in [
            ("R(127) 11-5", 632.991_212_58, 1e-8),
            ("R(56) 32-0", 532.245_036_10, 1e-8),
            ("R(106) 28-0", 543.515_663_61, 1e-8),
            ("R(47) 9-2", 611.970_770_01, 1e-8),
            ("P(10) 8-5", 640.283_468_75, 1e-8),
            ("P(13) 43-0", 514.673_466_37, 1e-8),
            ("633 nm, unstabilised", 632.9908, 1e-4),
        ] {
            let line = lines.iter().find(|line| line.name.contains(part)).unwrap();
            let got_nm = line.wavelength_m.value * 1e9;
            assert!((got_nm - want_nm).abs() < digits_nm, "{part}: {got_nm}, want {want_nm}");
        }
    }

    #[test]
    fn a_vacuum_number_called_air_is_noticed() {
        let note_of = |wavelength: &str, medium: &str| {
            let text = format!("[laser]\nwavelength = \"{wavelength}\"\nmedium = \"{medium}\"");
            let (_, notes) = Bench::parse(&text).unwrap();
            notes.into_iter().find(|note| note.code() == "wavelength-in-other-medium")
        };
        for (wavelength, medium, noticed) in [
            ("632.991(1) nm", "air", true),
            ("594.10(1) nm", "air", true),
            ("632.80(1) nm", "vacuum", true),
            ("632.80(1) nm", "air", false),
            ("632.8(5) nm", "vacuum", false),
            ("632.9908(10) nm", "vacuum", false),
            ("650(2) nm", "air", false),
            ("532.0(1) nm", "air", false),
        ] {
            let note = note_of(wavelength, medium);
            assert_eq!(note.is_some(), noticed, "{wavelength} in {medium}: {note:?}");
        }
        let text = note_of("632.991(1) nm", "air").unwrap().to_string();
        assert!(text.contains("632.9910 nm") && text.contains("medium = \"vacuum\""), "{text}");
    }
}
