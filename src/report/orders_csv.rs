//! The table of orders as CSV.

use crate::measure::Measurement;

const HEADER: [&str; 12] = ["photo", "h", "k", "x px", "y px", "u_x px", "u_y px", "dx px", "dy px", "used", "clipped", "file"];

/// Decimals of places, px: a millionth of a pixel is beyond any photo.
const DECIMALS: usize = 6;

/// Every spot that carries an order, a row each: the keys of `orders` in the JSON result, and the file of the photo.
///
/// # Errors
/// Never in practice: the table is written into memory.
pub fn orders_csv(measurement: &Measurement) -> Result<Vec<u8>, csv::Error> {
    let mut table = csv::Writer::from_writer(vec![]);
    table.write_record(HEADER)?;
    for order in &measurement.orders {
        let [u_x, u_y] = order.covariance.u_px();
        let file = measurement.photos.get(order.photo).map_or("", |photo| photo.file.as_str());
        let whole = [order.photo.to_string(), order.h.to_string(), order.k.to_string()];
        let places = [order.at.x_px, order.at.y_px, u_x, u_y, order.residual_px[0], order.residual_px[1]];
        let places = places.map(|place| if place.is_finite() { format!("{place:.DECIMALS$}") } else { String::new() });
        table.write_record(whole.iter().chain(&places).map(String::as_str).chain([yes(order.used), yes(order.clipped), file]))?;
    }
    table.into_inner().map_err(|error| csv::Error::from(error.into_error()))
}

fn yes(is: bool) -> &'static str {
    if is { "yes" } else { "no" }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::report::example;

    #[test]
    fn one_row_per_order_in_the_same_places() {
        let measurement = example::plane();
        let text = String::from_utf8(orders_csv(&measurement).unwrap()).unwrap();
        assert_eq!(text.lines().count(), measurement.orders.len() + 1);
        assert!(text.lines().all(|line| line.split(',').count() == HEADER.len()), "{text}");
        assert!(text.contains("0,1,0,500.000000,300.000000,0.030000,0.030000,0.020000,0.000000,yes,no,pattern.jpg"), "{text}");
    }
}
