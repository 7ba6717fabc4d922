//! A photo seen as linear light, sample by sample, without a second copy of it.

use super::{Photo, Samples, clip, tone};

/// Photo + the table that turns its codes into linear light + the codes at which it clips.
#[derive(Debug)]
pub struct LinearPhoto<'a> {
    photo: &'a Photo,
    table: Vec<f32>,
    clip_code: [u16; 3],
}

impl Photo {
    /// The photo as linear light, 1.0 = the level at which its brightest channel clips.
    ///
    /// A sensor that clips below the file's maximum is recognised by the pile-up of samples at the top; without one the
    /// file's maximum is the unit.
    #[must_use]
    pub fn linear(&self) -> LinearPhoto<'_> {
        let clip_code = clip::codes(self);
        let mut table = self.plain_table();
        let unit = clip_code.iter().map(|&code| table.get(usize::from(code)).copied().unwrap_or(1.0)).fold(0.0, f32::max);
        // A file that clips at its own maximum keeps its scale exactly.
        if unit > 0.0 && unit < 0.9 {
            table.iter_mut().for_each(|value| *value /= unit);
        }
        LinearPhoto { photo: self, table, clip_code }
    }

    #[expect(clippy::cast_possible_truncation, reason = "rounding to f32 is meant")]
    fn plain_table(&self) -> Vec<f32> {
        match self.samples {
            Samples::U8(_) => (0..=255).map(|code| tone::srgb_to_linear(f64::from(code) / 255.0) as f32).collect(),
            Samples::U16(_) => (0..=u16::MAX).map(|code| (f64::from(code) / 65535.0) as f32).collect(),
        }
    }
}

impl LinearPhoto<'_> {
    /// Width, px.
    #[must_use]
    pub fn width(&self) -> usize {
        self.photo.width
    }

    /// Height, px.
    #[must_use]
    pub fn height(&self) -> usize {
        self.photo.height
    }

    /// 1 or 3.
    #[must_use]
    pub fn channels(&self) -> usize {
        self.photo.channels
    }

    /// Linear light of one sample; 0 outside the photo.
    #[must_use]
    pub fn value(&self, x: usize, y: usize, channel: usize) -> f32 {
        self.code(x, y, channel).map_or(0.0, |code| self.table[usize::from(code)])
    }

    /// Whether one sample is at the level at which its channel clips; false outside the photo.
    #[must_use]
    pub fn is_clipped(&self, x: usize, y: usize, channel: usize) -> bool {
        self.code(x, y, channel).is_some_and(|code| code >= self.clip_code[channel.min(2)])
    }

    /// Linear light at which a channel clips.
    #[must_use]
    pub fn clip_value(&self, channel: usize) -> f64 {
        f64::from(self.table[usize::from(self.clip_code[channel.min(2)]).min(self.table.len() - 1)])
    }

    /// Step of linear light between two neighbouring codes near `light`, the resolution of the file there.
    #[must_use]
    pub fn code_step(&self, light: f64) -> f64 {
        let above = self.table.partition_point(|&value| f64::from(value) <= light).clamp(1, self.table.len() - 1);
        f64::from(self.table[above] - self.table[above - 1])
    }

    pub(super) fn photo(&self) -> &Photo {
        self.photo
    }

    pub(super) fn table(&self) -> &[f32] {
        &self.table
    }

    fn code(&self, x: usize, y: usize, channel: usize) -> Option<u16> {
        if x >= self.photo.width {
            return None;
        }
        let at = (y * self.photo.width + x) * self.photo.channels + channel;
        match &self.photo.samples {
            Samples::U8(codes) => codes.get(at).map(|&code| u16::from(code)),
            Samples::U16(codes) => codes.get(at).copied(),
        }
    }
}
