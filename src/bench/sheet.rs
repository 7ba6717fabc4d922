//! Sizes of sheets of paper.

/// Cut of the inch formats, ± m.
const INCH_TOLERANCE_M: f64 = 0.8e-3;

/// A format of paper.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum SheetFormat {
    /// 297 mm × 420 mm
    A3,
    /// 210 mm × 297 mm
    A4,
    /// 148 mm × 210 mm
    A5,
    /// 8.5 in × 11 in
    Letter,
    /// 8.5 in × 14 in
    Legal,
    /// 11 in × 17 in
    Tabloid,
}

impl SheetFormat {
    /// Every format with its name in the bench file.
    pub const ALL: [(&'static str, Self); 6] = [
        ("a4", Self::A4),
        ("a3", Self::A3),
        ("a5", Self::A5),
        ("letter", Self::Letter),
        ("legal", Self::Legal),
        ("tabloid", Self::Tabloid),
    ];

    /// Short and long side, m. ISO 216:2007 for the A series, ANSI/ASME Y14.1 sizes A and B for letter and tabloid, common practice for legal;
    /// all from memory.
    #[must_use]
    pub fn sides_m(self) -> [f64; 2] {
        match self {
            Self::A3 => [0.297, 0.420],
            Self::A4 => [0.210, 0.297],
            Self::A5 => [0.148, 0.210],
            Self::Letter => [0.2159, 0.2794],
            Self::Legal => [0.2159, 0.3556],
            Self::Tabloid => [0.2794, 0.4318],
        }
    }

    /// Largest deviation of each side from [`Self::sides_m`], m.
    ///
    /// ISO 216:2007: ±1.5 mm up to 150 mm, ±2 mm up to 600 mm (from memory). Inch formats: ±0.8 mm, 1/32 in (common practice).
    #[must_use]
    pub fn tolerance_m(self) -> [f64; 2] {
        const SHORT_M: f64 = 0.150;
        match self {
            Self::A3 | Self::A4 | Self::A5 => self.sides_m().map(|side| if side <= SHORT_M { 1.5e-3 } else { 2.0e-3 }),
            Self::Letter | Self::Legal | Self::Tabloid => [INCH_TOLERANCE_M; 2],
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// ISO 216: sides in the ratio 1:√2, each format the half of the one before, both rounded down to a millimetre.
    #[test]
    fn the_a_series_halves() {
        let [a3, a4, a5] = [SheetFormat::A3, SheetFormat::A4, SheetFormat::A5].map(SheetFormat::sides_m);
        for [short, long] in [a3, a4, a5] {
            assert!((long / short - 2f64.sqrt()).abs() < 0.006, "{short} x {long}");
        }
        for (large, small) in [(a3, a4), (a4, a5)] {
            assert!((large[0] - small[1]).abs() < 1e-9);
            assert!((0.0..1.1e-3).contains(&(large[1] - 2.0 * small[0])));
        }
    }

    #[test]
    fn inch_formats_are_whole_halves_of_an_inch() {
        for format in [SheetFormat::Letter, SheetFormat::Legal, SheetFormat::Tabloid] {
            for side_m in format.sides_m() {
                let half_inches = side_m / 0.0127;
                assert!((half_inches - half_inches.round()).abs() < 1e-9, "{format:?}");
            }
        }
    }

    #[test]
    fn every_format_has_one_name() {
        for (i, (name, format)) in SheetFormat::ALL.iter().enumerate() {
            assert!(SheetFormat::ALL[..i].iter().all(|(other, same)| other != name && same != format));
        }
    }
}
