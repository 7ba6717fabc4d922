//! From a scene to the samples of its photos.

use super::{
    SynthError,
    dots::{Ink, reflectance},
    field::Tile,
    orders::{Order, Purpose, orders, random},
    scene::{Scene, SensorColour},
    sensor::{channels, expose},
    spotlight::LaserLight,
    truth::{OrderTruth, Truth},
};
use crate::{
    frames::PixelPoint,
    photo::{Exif, Photo},
};
use rand::Rng;

/// A photo, and what is true of it.
#[derive(Debug, Clone)]
pub struct RenderedPhoto {
    /// Upright; `exif` holds what the file will say.
    pub photo: Photo,
    /// Orders with their places, and the answer. Without orders for a photo of the target alone.
    pub truth: Truth,
}

/// Photo of the pattern on the plain screen.
///
/// # Errors
/// [`SynthError::Value`] for a scene that cannot be drawn, [`SynthError::NothingInFrame`] when no order falls into the photo.
pub fn render_pattern(scene: &Scene) -> Result<RenderedPhoto, SynthError> {
    scene.check()?;
    picture(scene, &Setting { number: 0, orders: seen(scene)?, ink: Ink::Absent, room_level: scene.light.room.pattern_level })
}

/// Photo of the printed dots, laser off, from the same camera position.
///
/// # Errors
/// [`SynthError::Value`] for a scene that cannot be drawn.
pub fn render_target(scene: &Scene) -> Result<RenderedPhoto, SynthError> {
    scene.check()?;
    picture(scene, &Setting { number: 1, orders: Vec::new(), ink: Ink::Printed, room_level: scene.light.room.target_level })
}

/// Photo of the pattern on the printed dots.
///
/// # Errors
/// As [`render_pattern`].
pub fn render_marked(scene: &Scene) -> Result<RenderedPhoto, SynthError> {
    scene.check()?;
    picture(scene, &Setting { number: 2, orders: seen(scene)?, ink: Ink::Printed, room_level: scene.light.room.target_level })
}

/// What makes one photo differ from the others of its scene.
struct Setting {
    number: u32,
    orders: Vec<Order>,
    ink: Ink,
    room_level: f64,
}

fn seen(scene: &Scene) -> Result<Vec<Order>, SynthError> {
    let orders = orders(scene);
    if orders.is_empty() { Err(SynthError::NothingInFrame) } else { Ok(orders) }
}

fn picture(scene: &Scene, setting: &Setting) -> Result<RenderedPhoto, SynthError> {
    let field = LightField::new(scene, setting);
    let samples = expose(scene, setting.number, |x, y, channel| field.level(x, y, channel));
    let truth = Truth::new(scene, setting.orders.iter().map(|order| field.order_truth(order)).collect());
    let (width, height) = (scene.file.width_px as usize, scene.file.height_px as usize);
    Ok(RenderedPhoto { photo: Photo { width, height, channels: channels(&scene.sensor), samples, exif: exif_of(scene) }, truth })
}

fn exif_of(scene: &Scene) -> Exif {
    let Some(data) = &scene.file.exif else { return Exif { orientation: 1, ..Exif::default() } };
    let diagonal_px = f64::from(scene.file.width_px).hypot(f64::from(scene.file.height_px));
    Exif {
        focal_length_m: Some(data.focal_length_m),
        focal_length_35mm_m: Some((scene.camera.lens.focal_px / diagonal_px * 43.267).round() / 1e3),
        exposure_s: Some(data.exposure_s),
        iso: Some(f64::from(data.iso)),
        f_number: Some(data.f_number),
        camera: None,
        orientation: data.orientation,
    }
}

/// All light that reaches the sensor, before noise.
struct LightField<'a> {
    scene: &'a Scene,
    lasers: Vec<LaserLight>,
    reflectance: Vec<f32>,
    glints: Vec<Glint>,
    room_level: f64,
    width: usize,
    height: usize,
}

impl<'a> LightField<'a> {
    fn new(scene: &'a Scene, setting: &Setting) -> Self {
        let speckle = scene.light.speckle.as_ref().filter(|_| !setting.orders.is_empty());
        let tile = speckle.map(|speckle| Tile::speckle(scene.seed, speckle.contrast, speckle.grain_px));
        let lit = if setting.orders.is_empty() { 0 } else { scene.lasers.len() };
        let lasers = (0..lit).map(|laser| LaserLight::draw(scene, &setting.orders, laser, tile.as_ref())).collect();
        let reflectance = reflectance(scene, setting.ink);
        let (width, height) = (scene.file.width_px as usize, scene.file.height_px as usize);
        Self { scene, lasers, reflectance, glints: glints(scene), room_level: setting.room_level, width, height }
    }

    /// Light at a pixel in a channel, 1 clips: vignetting × (reflectance × (room + spots) + glare).
    fn level(&self, x: usize, y: usize, channel: usize) -> f64 {
        let paper = f64::from(self.reflectance[y * self.width + x]);
        let mut level = paper * self.room(x, y, channel) + self.glint(x, y) * self.tint(channel);
        for (index, light) in self.lasers.iter().enumerate() {
            let (spots, glare) = light.at(x, y);
            level += self.response(index, channel) * (paper * spots + glare);
        }
        self.vignetting(x, y) * level
    }

    fn response(&self, laser: usize, channel: usize) -> f64 {
        match self.scene.sensor.colour {
            SensorColour::Bayer => self.scene.lasers[laser].colour[channel],
            SensorColour::Mono => 1.0,
        }
    }

    fn room(&self, x: usize, y: usize, channel: usize) -> f64 {
        let room = &self.scene.light.room;
        let (right, down) = (x as f64 / self.width as f64 - 0.5, y as f64 / self.height as f64 - 0.5);
        self.room_level * self.tint(channel) * (1.0 + room.gradient[0] * right + room.gradient[1] * down).max(0.0)
    }

    fn tint(&self, channel: usize) -> f64 {
        match self.scene.sensor.colour {
            SensorColour::Bayer => self.scene.light.room.tint[channel],
            SensorColour::Mono => 1.0,
        }
    }

    fn glint(&self, x: usize, y: usize) -> f64 {
        let at = |glint: &Glint| {
            let distance2 = (x as f64 - glint.at.x_px).powi(2) + (y as f64 - glint.at.y_px).powi(2);
            glint.peak * (-0.5 * distance2 / glint.sigma_px.powi(2)).exp()
        };
        self.glints.iter().map(at).sum()
    }

    fn vignetting(&self, x: usize, y: usize) -> f64 {
        let (right, down) = (2.0 * x as f64 / self.width as f64 - 1.0, 2.0 * y as f64 / self.height as f64 - 1.0);
        1.0 - self.scene.camera.lens.vignetting * (right * right + down * down) / 2.0
    }

    fn order_truth(&self, order: &Order) -> OrderTruth {
        let x = super::pixels::floor_index(order.at.x_px + 0.5, self.width - 1);
        let y = super::pixels::floor_index(order.at.y_px + 0.5, self.height - 1);
        let paper = f64::from(self.reflectance[y * self.width + x]);
        let main = main_channel(self.scene.lasers[order.laser].colour);
        let glare = self.lasers.get(order.laser).map_or(0.0, |light| light.at(x, y).1);
        OrderTruth {
            order: order.clone(),
            peak: self.vignetting(x, y) * paper * order.amplitude,
            background: self.vignetting(x, y) * (paper * self.room(x, y, main) + glare),
        }
    }
}

/// A reflection of the room's light.
struct Glint {
    at: PixelPoint,
    sigma_px: f64,
    peak: f64,
}

fn glints(scene: &Scene) -> Vec<Glint> {
    let glint = |number: u32| {
        let mut generator = random(scene.seed, Purpose::Glints, u64::from(number));
        let at = PixelPoint {
            x_px: generator.random_range(0.0..f64::from(scene.file.width_px)),
            y_px: generator.random_range(0.0..f64::from(scene.file.height_px)),
        };
        Glint { at, sigma_px: generator.random_range(3.0..12.0), peak: scene.stray.glint_level * generator.random_range(0.2..1.0) }
    };
    (0..scene.stray.glints).map(glint).collect()
}

fn main_channel(colour: [f64; 3]) -> usize {
    (0..3).max_by(|&a, &b| colour[a].total_cmp(&colour[b])).unwrap_or(0)
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::{
        photo::Samples,
        synth::{FileKind, Lattice, demo_scene, encode},
    };

    /// A quiet scene: no noise, no speckle, no glare, no room, grey 16 bit, nothing clips.
    fn quiet(name: &str) -> Scene {
        let mut scene = demo_scene(name).unwrap();
        scene.light.speckle = None;
        scene.light.glare = None;
        scene.light.brightest_order = 0.6;
        scene.sample.zero_order_factor = 1.2;
        scene.light.room.pattern_level = 0.0;
        scene.light.room.gradient = [0.0; 2];
        scene.screen.texture = 0.0;
        scene.screen.sheet = None;
        scene.camera.lens.vignetting = 0.0;
        scene.sensor.noise = None;
        scene.sensor.colour = SensorColour::Mono;
        scene.sensor.bits = 16;
        scene.stray = super::super::Stray::default();
        scene.file.kind = FileKind::Png16;
        // Coarse lattices crowd the frame; a third of the pitch lets their spots stand alone.
        if let Lattice::Plane { pitch_m, .. } = &mut scene.sample.lattice
            && pitch_m[0] > 5e-5
        {
            *pitch_m = pitch_m.map(|pitch| pitch / 3.0);
        }
        scene
    }

    fn small(mut scene: Scene) -> Scene {
        let lens = &mut scene.camera.lens;
        lens.focal_px /= 4.0;
        lens.principal_px = [lens.principal_px[0] / 4.0, lens.principal_px[1] / 4.0];
        (scene.file.width_px, scene.file.height_px) = (scene.file.width_px / 4, scene.file.height_px / 4);
        scene
    }

    fn centroid(samples: &[u16], width: usize, order: &Order, half: usize) -> [f64; 2] {
        let (x0, y0) =
            (super::super::pixels::floor_index(order.at.x_px + 0.5, width), super::super::pixels::floor_index(order.at.y_px + 0.5, width));
        let mut sums = [0.0; 3];
        for y in y0 - half..=y0 + half {
            for x in x0 - half..=x0 + half {
                let value = f64::from(samples[y * width + x]);
                sums = [sums[0] + value, sums[1] + value * x as f64, sums[2] + value * y as f64];
            }
        }
        [sums[1] / sums[0], sums[2] / sums[0]]
    }

    /// The drawn spot's centroid is the chief ray of `optics`. Bar 0.005 px; a window of ±5 σ whose rim is off centre by up to half a pixel
    /// and the neighbour's tail bias by less than 0.002 px for the orders taken here.
    #[test]
    fn a_drawn_spot_has_its_centroid_at_the_chief_ray() {
        for name in crate::synth::DEMO_NAMES {
            let scene = quiet(name);
            let rendered = render_pattern(&scene).unwrap();
            let Samples::U16(samples) = &rendered.photo.samples else { panic!() };
            let mut checked = 0;
            for truth in rendered.truth.orders.iter().filter(|truth| truth.peak > 0.05) {
                let order = &truth.order;
                let half = super::super::pixels::floor_index(5.0 * order.shape.xx.max(order.shape.yy).sqrt() + 1.0, 500);
                let margin = half as f64 + 2.0;
                let inside = |v: f64, length: usize| v > margin && v < length as f64 - margin;
                let alone = rendered.truth.orders.iter().all(|other| {
                    std::ptr::eq(other, truth) || other.order.at.distance_px(order.at) > 2.9 * half as f64 || other.peak < 1e-4 * truth.peak
                });
                if !(alone && inside(order.at.x_px, rendered.photo.width) && inside(order.at.y_px, rendered.photo.height)) {
                    continue;
                }
                let [x, y] = centroid(samples, rendered.photo.width, order, half);
                assert!((x - order.at.x_px).abs() < 0.005 && (y - order.at.y_px).abs() < 0.005, "{name} {order:?} {x} {y}");
                checked += 1;
            }
            assert!(checked >= 3, "{name}: only {checked} spots stand alone");
        }
    }

    #[test]
    fn the_same_seed_gives_the_same_bytes_on_any_number_of_threads() {
        let scene = small(demo_scene("embossed-film").unwrap());
        let photo = |threads: usize| {
            let pool = rayon::ThreadPoolBuilder::new().num_threads(threads).build().unwrap();
            pool.install(|| encode(&scene, &render_pattern(&scene).unwrap()).unwrap())
        };
        let one = photo(1);
        assert_eq!(one, photo(3));
        let mut other = scene.clone();
        other.seed += 1;
        assert_ne!(one, encode(&other, &render_pattern(&other).unwrap()).unwrap());
    }

    /// A dark frame with a few clipped spots, and a target of bright paper with a fixed share of ink.
    #[test]
    fn the_histogram_is_that_of_a_bench_photo() {
        let scene = demo_scene("embossed-film").unwrap();
        let share = |rendered: &RenderedPhoto, from: u8, to: u8| {
            let Samples::U8(samples) = &rendered.photo.samples else { panic!() };
            samples.iter().skip(1).step_by(3).filter(|&&v| (from..=to).contains(&v)).count() as f64 / (samples.len() / 3) as f64
        };
        let pattern = render_pattern(&scene).unwrap();
        assert!(share(&pattern, 0, 90) > 0.9, "mostly dark: {}", share(&pattern, 0, 90));
        let clipped = share(&pattern, 255, 255);
        assert!(clipped > 1e-5 && clipped < 0.01, "a few clipped pixels: {clipped}");
        let target = render_target(&scene).unwrap();
        // Dots of 0.4 pitch cover 12.6 %; only part of the frame carries dots.
        let ink = share(&target, 0, 110);
        assert!(ink > 0.02 && ink < 0.14, "{ink}");
    }

    #[test]
    fn exif_is_read_by_an_independent_reader() {
        let mut scene = small(demo_scene("no-target").unwrap());
        scene.file.exif.as_mut().unwrap().orientation = 6;
        let rendered = render_pattern(&scene).unwrap();
        let bytes = encode(&scene, &rendered).unwrap();
        let data = exif::Reader::new().read_from_container(&mut std::io::Cursor::new(&bytes)).unwrap();
        let number = |tag: exif::Tag| match &data.get_field(tag, exif::In::PRIMARY).unwrap().value {
            exif::Value::Rational(values) => values[0].to_f64(),
            other => f64::from(other.get_uint(0).unwrap()),
        };
        let told = scene.file.exif.as_ref().unwrap();
        assert!((number(exif::Tag::Orientation) - 6.0).abs() < 1e-9);
        assert!((number(exif::Tag::FocalLength) - told.focal_length_m * 1e3).abs() < 0.006);
        assert!((number(exif::Tag::ExposureTime) / told.exposure_s - 1.0).abs() < 0.01);
        assert!((number(exif::Tag::FNumber) - told.f_number).abs() < 0.051);
        assert!((number(exif::Tag::PhotographicSensitivity) - f64::from(told.iso)).abs() < 1e-9);
        let diagonal_px = f64::from(scene.file.width_px).hypot(f64::from(scene.file.height_px));
        assert!((number(exif::Tag::FocalLengthIn35mmFilm) - scene.camera.lens.focal_px / diagonal_px * 43.267).abs() <= 0.5);
        // Stored on its side: width and height change places, and the decoder's own turn brings the photo back.
        let mut decoded = image::load_from_memory(&bytes).unwrap();
        assert_eq!((decoded.width(), decoded.height()), (scene.file.height_px, scene.file.width_px));
        decoded.apply_orientation(image::metadata::Orientation::from_exif(6).unwrap());
        let Samples::U8(samples) = &rendered.photo.samples else { panic!() };
        let difference: u64 = decoded.to_rgb8().as_raw().iter().zip(samples).map(|(&a, &b)| u64::from(a.abs_diff(b))).sum();
        assert!((difference as f64) < 6.0 * samples.len() as f64, "only the loss of JPEG");
    }

    #[test]
    fn marks_in_the_pattern_photo_darken_paper_and_spots() {
        let scene = small(demo_scene("embossed-film").unwrap());
        let marked = render_marked(&scene).unwrap();
        assert!(!marked.truth.orders.is_empty());
        assert!(marked.truth.orders.iter().any(|truth| truth.peak < 0.5 * truth.order.amplitude), "some order falls on ink");
    }
}
