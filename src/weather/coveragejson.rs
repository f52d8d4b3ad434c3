//! OGC CoverageJSON 1.0: PointSeries and Grid.

use super::field::Field;
use super::read::ReadError;
use super::spec::CoverageMapping;
use crate::bounds::Place;

/// Reads a CoverageJSON document.
///
/// # Errors
/// See [`ReadError`].
pub fn read(_bytes: &[u8], _mapping: &CoverageMapping, _asked: Place) -> Result<Field, ReadError> {
    Err(ReadError::Unsupported("this format".into()))
}
