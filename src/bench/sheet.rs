//! Sizes of sheets of paper.

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
}
