//! The values that a feed can give, each with the unit in which a field keeps it.

use serde::{Deserialize, Serialize};
use utoipa::ToSchema;

/// A value that a feed can give.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, PartialOrd, Ord, Serialize, Deserialize, ToSchema)]
#[serde(rename_all = "snake_case")]
pub enum Quantity {
    /// Rain or snow as water, mm/h.
    Rain,
    /// Probability that it rains at all, 0..1.
    RainChance,
    /// Cover by all cloud, 0..1.
    CloudTotal,
    /// Cover by low cloud, 0..1.
    CloudLow,
    /// Cover by middle cloud, 0..1.
    CloudMiddle,
    /// Cover by high cloud, 0..1.
    CloudHigh,
    /// Height of the lowest cloud base, m: above ground unless the field says that it is above the sea.
    CloudBase,
    /// Wind speed, m/s.
    WindSpeed,
    /// Direction the wind comes from, deg clockwise from true north.
    WindFrom,
    /// Wind toward east, m/s.
    WindEast,
    /// Wind toward north, m/s.
    WindNorth,
    /// Air temperature near the ground, degrees Celsius.
    Temperature,
    /// Height of the 0 degree level above sea, m.
    FreezingLevel,
    /// Horizontal visual range, m.
    Visibility,
    /// Probability of thunder, 0..1.
    ThunderChance,
}

/// The dimension of a quantity, by which units are accepted or refused.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Dimension {
    /// Rate of rain, kept in mm/h; an amount with its period is one too.
    RainRate,
    /// Share of one, kept as 0..1.
    Share,
    /// Length, kept in m.
    Length,
    /// Speed, kept in m/s.
    Speed,
    /// Angle, kept in degrees.
    Angle,
    /// Temperature, kept in degrees Celsius.
    Temperature,
}

impl Quantity {
    /// Every quantity, in the order of their discriminants.
    pub const ALL: [Self; 15] = [
        Self::Rain,
        Self::RainChance,
        Self::CloudTotal,
        Self::CloudLow,
        Self::CloudMiddle,
        Self::CloudHigh,
        Self::CloudBase,
        Self::WindSpeed,
        Self::WindFrom,
        Self::WindEast,
        Self::WindNorth,
        Self::Temperature,
        Self::FreezingLevel,
        Self::Visibility,
        Self::ThunderChance,
    ];

    /// The name used in configuration and answers.
    pub fn name(self) -> &'static str {
        match self {
            Self::Rain => "rain",
            Self::RainChance => "rain_chance",
            Self::CloudTotal => "cloud_total",
            Self::CloudLow => "cloud_low",
            Self::CloudMiddle => "cloud_middle",
            Self::CloudHigh => "cloud_high",
            Self::CloudBase => "cloud_base",
            Self::WindSpeed => "wind_speed",
            Self::WindFrom => "wind_from",
            Self::WindEast => "wind_east",
            Self::WindNorth => "wind_north",
            Self::Temperature => "temperature",
            Self::FreezingLevel => "freezing_level",
            Self::Visibility => "visibility",
            Self::ThunderChance => "thunder_chance",
        }
    }

    /// The dimension its units must have.
    pub fn dimension(self) -> Dimension {
        match self {
            Self::Rain => Dimension::RainRate,
            Self::RainChance
            | Self::CloudTotal
            | Self::CloudLow
            | Self::CloudMiddle
            | Self::CloudHigh
            | Self::ThunderChance => Dimension::Share,
            Self::CloudBase | Self::FreezingLevel | Self::Visibility => Dimension::Length,
            Self::WindSpeed | Self::WindEast | Self::WindNorth => Dimension::Speed,
            Self::WindFrom => Dimension::Angle,
            Self::Temperature => Dimension::Temperature,
        }
    }

    /// The unit (UCUM) in which a field keeps it.
    pub fn unit(self) -> &'static str {
        match self.dimension() {
            Dimension::RainRate => "mm/h",
            Dimension::Share => "1",
            Dimension::Length => "m",
            Dimension::Speed => "m/s",
            Dimension::Angle => "deg",
            Dimension::Temperature => "Cel",
        }
    }

    /// The physically possible range, in the unit kept; a value outside it is damaged data.
    pub fn plausible(self) -> (f64, f64) {
        match self.dimension() {
            Dimension::RainRate => (0.0, 1000.0),
            Dimension::Share => (0.0, 1.0),
            Dimension::Length => (-1000.0, 200_000.0),
            Dimension::Speed => (-150.0, 150.0),
            Dimension::Angle => (0.0, 360.0),
            Dimension::Temperature => (-100.0, 70.0),
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn discriminants_index_the_list_and_names_match_the_configuration() {
        for (index, quantity) in Quantity::ALL.into_iter().enumerate() {
            assert_eq!(quantity as usize, index);
            assert_eq!(serde_json::to_value(quantity).unwrap(), quantity.name());
        }
    }
}
