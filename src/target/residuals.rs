//! Residuals of the dots about a smooth view, each seen against those of its neighbours.

use std::collections::BTreeMap;

use super::{
    median,
    view::{Seen, View},
};

/// What a real lens does beyond the few terms of a [`View`] is smooth and cancels between neighbours; noise, glare and
/// dirt do not.
pub(super) struct Residuals {
    at: BTreeMap<(i32, i32), Residual>,
}

#[derive(Clone, Copy)]
struct Residual {
    px: [f64; 2],
    u_px: f64,
}

/// The least number of the eight neighbours that shows a trend.
const LEAST_NEIGHBOURS: usize = 5;

/// The least number of differences that shows a scatter.
const LEAST_DIFFERENCES: usize = 30;

impl Residuals {
    pub(super) fn of<'a>(dots: impl Iterator<Item = ((i32, i32), &'a Seen)>, view: &View) -> Self {
        Self { at: dots.map(|(index, dot)| (index, Residual { px: view.residual_px(dot), u_px: dot.u_px })).collect() }
    }

    /// Robust scatter of the differences between a residual and the mean of its neighbours', in units of the stated
    /// uncertainty; `None` for too few dots with enough neighbours.
    pub(super) fn scatter(&self) -> Option<f64> {
        let mut sizes: Vec<f64> = Vec::new();
        for (index, own) in &self.at {
            let around = self.neighbours(*index);
            if around.len() < LEAST_NEIGHBOURS {
                continue;
            }
            let n = super::paper::small_f64(around.len());
            let u2 = around.iter().map(|r| r.u_px * r.u_px).sum::<f64>() / (n * n);
            let expected = (own.u_px * own.u_px + u2).sqrt();
            sizes.extend([0, 1].map(|c| {
                let mean = around.iter().map(|r| r.px[c]).sum::<f64>() / n;
                ((own.px[c] - mean) / expected).abs()
            }));
        }
        let enough = sizes.len() >= LEAST_DIFFERENCES;
        enough.then(|| median(&mut sizes)).flatten().map(|m| 1.4826 * m)
    }

    /// Distance of a residual from the median of its neighbours' (from zero where there are too few), px.
    pub(super) fn off_px(&self, index: (i32, i32)) -> Option<f64> {
        let own = self.at.get(&index)?;
        let around = self.neighbours(index);
        let trend = [0, 1].map(|c| {
            let mut values: Vec<f64> = around.iter().map(|r| r.px[c]).collect();
            if values.len() < LEAST_NEIGHBOURS { 0.0 } else { median(&mut values).unwrap_or(0.0) }
        });
        Some((own.px[0] - trend[0]).hypot(own.px[1] - trend[1]))
    }

    fn neighbours(&self, (i, j): (i32, i32)) -> Vec<Residual> {
        let around = [(-1, 0), (1, 0), (0, -1), (0, 1), (-1, -1), (1, 1), (-1, 1), (1, -1)];
        around.into_iter().filter_map(|(di, dj)| self.at.get(&(i + di, j + dj)).copied()).collect()
    }
}
