//! Units of weather values (UCUM) and their conversion into the units a field keeps.

use serde::Deserialize;

/// A unit that a feed may use.
#[derive(Debug, Clone, Copy, PartialEq, Deserialize)]
pub struct Unit;
