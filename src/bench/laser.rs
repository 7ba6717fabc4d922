//! `[laser]` and `[air]`: wavelengths, and the air that they are in.

use super::{
    Air, BenchError, Laser, Medium,
    sample::members,
    section::{Section, Sense, Stated},
    tree::Table,
};
use crate::{
    Note,
    quantity::{Dimension, Quantity},
};

const SHORTEST_M: f64 = 200e-9;
const LONGEST_M: f64 = 2e-6;
/// Where the refractive index of air is known.
const VACUUM_M: std::ops::RangeInclusive<f64> = 300e-9..=1.7e-6;

/// All lasers, in the order of the file.
pub(super) fn read_lasers(root: &Table) -> Result<Vec<Laser>, BenchError> {
    const KEYS: &[&str] = &["wavelength", "medium"];
    members(root, "laser", KEYS)?.into_iter().map(|(name, section)| read_laser(name, &section)).collect()
}

fn read_laser(name: String, section: &Section<'_>) -> Result<Laser, BenchError> {
    let Some(stated) = section.quantity("wavelength", Dimension::Length)? else {
        return Err(BenchError::Missing {
            key: section.path_of("wavelength"),
            advice: "without it no pitch follows; write wavelength = \"632.82(1) nm\", or what the laser's label says with its tolerance: \"650 ± 10 nm (limits)\"".to_owned(),
        });
    };
    let medium = section.choice("medium", &[("air", Medium::Air), ("vacuum", Medium::Vacuum)])?.unwrap_or(Medium::Air);
    let place = stated.place.clone();
    let text = stated.text.clone();
    let wavelength_m = wavelength(stated)?;
    if medium == Medium::Vacuum && !VACUUM_M.contains(&wavelength_m.value) {
        return Err(BenchError::NoIndexOfAir { place, seen: text });
    }
    Ok(Laser { name, wavelength_m, medium })
}

fn wavelength(stated: Stated) -> Result<Quantity, BenchError> {
    const SENSE: Sense = Sense { what: "wavelength", range: SHORTEST_M..=LONGEST_M, low: "200 nm", high: "2 um" };
    if (SHORTEST_M..=LONGEST_M).contains(&stated.quantity.value) {
        return stated.sensible_and_known(&SENSE);
    }
    let advice = meant(stated.quantity.value);
    Err(BenchError::Wavelength { place: stated.place, seen: stated.text, advice })
}

/// What was probably meant by a wavelength that no laser has: another unit typed than the one written.
fn meant(wavelength_m: f64) -> String {
    // The visible and its neighbours, where nearly all lasers of a bench lie; narrow enough for one answer.
    const USUAL_M: std::ops::RangeInclusive<f64> = 350e-9..=1.1e-6;
    const SLIPS: [(f64, &str); 4] = [
        (1e3, "the number looks like micrometres"),
        (0.1, "the number looks like angstroms"),
        (1e-3, "the unit looks a thousand times too large"),
        (1e-6, "the unit looks a million times too large"),
    ];
    let slip = SLIPS.iter().find(|(factor, _)| USUAL_M.contains(&(wavelength_m * factor)));
    slip.map_or_else(
        || "; state it in nm, such as \"632.82(1) nm\"".to_owned(),
        |(factor, why)| format!("; did you mean {:.1} nm? ({why})", wavelength_m * factor * 1e9),
    )
}

/// The air, with the usual state of a room for what is not stated.
///
/// The uncertainties of the assumed state cover weather, height up to 300 m and a heated room: together 9e-6 of the wavelength.
pub(super) fn read_air(root: &Table, lasers: &[Laser], notes: &mut Vec<Note>) -> Result<Air, BenchError> {
    const KEYS: &[&str] = &["temperature", "pressure", "humidity"];
    const TEMPERATURE: Sense = Sense { what: "temperature of a room", range: -40.0..=100.0, low: "-40 degC", high: "100 degC" };
    const PRESSURE: Sense = Sense { what: "pressure of air", range: 1e4..=1.4e5, low: "100 hPa", high: "1400 hPa" };
    const HUMIDITY: Sense = Sense { what: "relative humidity", range: 0.0..=1.0, low: "0 %", high: "100 %" };
    let section = Section::at(root, "air")?;
    section.allow_only(KEYS)?;
    let read = |key, dimension, sense: &Sense| section.quantity(key, dimension)?.map(|stated| stated.sensible(sense)).transpose();
    let temperature = read("temperature", Dimension::Temperature, &TEMPERATURE)?;
    let pressure = read("pressure", Dimension::Pressure, &PRESSURE)?;
    let humidity = read("humidity", Dimension::Ratio, &HUMIDITY)?;
    let needed = lasers.iter().any(|laser| laser.medium == Medium::Vacuum);
    if needed && (temperature.is_none() || pressure.is_none() || humidity.is_none()) {
        notes.push(Note::StandardAirAssumed);
    } else if section.is_given() && !needed {
        notes.push(Note::AirNotUsed);
    }
    Ok(Air {
        temperature_celsius: temperature.unwrap_or(Quantity::normal(20.0, 3.0)),
        pressure_pa: pressure.unwrap_or(Quantity::normal(101_325.0, 3000.0)),
        humidity: humidity.unwrap_or(Quantity::normal(0.5, 0.2)),
    })
}
