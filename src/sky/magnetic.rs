//! Magnetic north, by the World Magnetic Model.

use chrono::{DateTime, Datelike, NaiveDate, Utc};
use world_magnetic_model::GeomagneticField;
use world_magnetic_model::time::Date;
use world_magnetic_model::uom::si::angle::degree;
use world_magnetic_model::uom::si::f32::{Angle, Length};
use world_magnetic_model::uom::si::length::meter;

use crate::bounds::Place;

/// Declination in degrees, positive where the needle points east of true north: WMM2025 (NOAA NCEI and BGS 2024). None
/// outside the model's years and at the poles, where it means nothing.
pub fn declination_deg(place: Place, height_m: f64, time: DateTime<Utc>) -> Option<f64> {
    let date: NaiveDate = time.date_naive();
    let date = Date::from_ordinal_date(date.year(), u16::try_from(date.ordinal()).ok()?).ok()?;
    let field = GeomagneticField::new(
        Length::new::<meter>(height_m as f32),
        Angle::new::<degree>(place.lat_deg() as f32),
        Angle::new::<degree>(place.lon_deg() as f32),
        date,
    )
    .ok()?;
    Some(f64::from(field.declination().get::<degree>())).filter(|declination| declination.is_finite())
}
