//! Why a photo shows no readable target, or a target cannot be drawn.

/// Why a photo shows no readable target, or a target cannot be drawn.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum TargetError {
    /// The plane of light is too small or does not hold the samples that its size promises.
    #[error(
        "the target photo is {width} x {height} px with {samples} samples: too small or incomplete; at least {needed_px} px on each side are needed"
    )]
    PhotoTooSmall {
        /// Width, px.
        width: usize,
        /// Height, px.
        height: usize,
        /// Number of samples in the plane.
        samples: usize,
        /// Least width and height, px.
        needed_px: usize,
    },
    /// The photo shows (almost) no dark, round, complete blobs.
    #[error(
        "no dot target seen: {round} round dark spots on a lighter ground, {needed} are needed; \
         photograph the printed target face on, sharp, with the paper well lit and not overexposed"
    )]
    NoDots {
        /// Round dark blobs found.
        round: usize,
        /// Least number needed.
        needed: usize,
    },
    /// Round blobs are there, but they form no regular grid.
    #[error(
        "{round} round dark spots were seen, but at most {on_grid} of them lie on one regular grid ({needed} are needed); \
         show more of the printed target and keep it flat"
    )]
    NoGrid {
        /// Round dark blobs found.
        round: usize,
        /// The most that lie on one grid.
        on_grid: usize,
        /// Least number needed.
        needed: usize,
    },
    /// The three larger dots are not there.
    #[error(
        "the grid of {dots} dots was found, but of the three larger dots at (0,0), (2,0) and (0,1) only {larger} can be told; \
         keep all three in view, uncovered and free of glare"
    )]
    MarksNotFound {
        /// Dots on the grid.
        dots: usize,
        /// Larger dots among them.
        larger: usize,
    },
    /// More than one reading of the larger dots is possible.
    #[error(
        "{larger} dots look larger than their neighbours and can be read as origin, X and Y marks in {readings} ways; \
         remove other round dark things from the target, or uncover the third mark"
    )]
    MarksAmbiguous {
        /// Larger dots found.
        larger: usize,
        /// Possible readings.
        readings: usize,
    },
    /// The marks appear mirrored.
    #[error(
        "the target appears mirrored: going from (2,0) over (0,0) to (0,1) turns the wrong way round; \
         a printed face towards the camera cannot look like this: undo the mirroring of the photo, or turn the print's face to the camera"
    )]
    Mirrored,
    /// No bright quadrilateral.
    #[error(
        "no sheet of paper seen: no bright region with four straight edges (the largest bright region takes {largest_percent:.0} % of the photo, \
         5 % are needed); photograph the whole sheet, lit, on a darker ground, or state its corners as [target] marks"
    )]
    NoSheet {
        /// Largest bright region, percent of the photo.
        largest_percent: f64,
    },
    /// The sheet is there, but its edges cannot be followed.
    #[error(
        "the sheet's outline was found, but only {seen} of its edges can be followed ({needed} are needed); \
         clear them of clips, tape and shadows, show them sharp, or state the corners as [target] marks"
    )]
    SheetEdgesHidden {
        /// Edges seen.
        seen: usize,
        /// Edges needed.
        needed: usize,
    },
    /// No evenly spaced lines.
    #[error(
        "no ruled paper seen: {parts} parts of the photo show evenly spaced lines clearly, {needed} are needed; \
         show the ruling sharp over much of the frame and in even light, lines at least 8 px apart"
    )]
    NoRuling {
        /// Parts of the photo that show lines.
        parts: usize,
        /// Parts needed.
        needed: usize,
    },
    /// Lines too close for the photo.
    #[error(
        "the ruled lines are {period_px:.1} px apart, too fine to be told apart for certain ({least_px:.0} px are needed); photograph them closer"
    )]
    RulingTooFine {
        /// Distance of the lines, px.
        period_px: f64,
        /// Least distance, px.
        least_px: f64,
    },
    /// The pitch of a target to be drawn is no positive number.
    #[error("a target needs a pitch above zero, not {pitch_mm} mm; 10 mm suits an A4 sheet")]
    PitchNotPositive {
        /// Pitch asked for, mm.
        pitch_mm: f64,
    },
    /// The pitch of a target to be drawn is too small for a printer.
    #[error("a pitch of {pitch_mm} mm gives dots too small to print round; use {least_mm} mm or more")]
    PitchTooSmall {
        /// Pitch asked for, mm.
        pitch_mm: f64,
        /// Least pitch, mm.
        least_mm: f64,
    },
    /// Too few dots fit the paper.
    #[error("at a pitch of {pitch_mm} mm fewer than 5 x 5 dots fit on {paper}; use at most {most_mm:.1} mm or a larger sheet")]
    PitchTooLarge {
        /// Pitch asked for, mm.
        pitch_mm: f64,
        /// Name of the paper.
        paper: &'static str,
        /// Largest pitch that fits, mm.
        most_mm: f64,
    },
}
