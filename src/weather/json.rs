//! JSON documents of any shape, read through a mapping of RFC 6901 pointers.

use super::field::Field;
use super::read::ReadError;
use super::spec::JsonMapping;
use crate::bounds::Place;

/// Reads a JSON document through its mapping.
///
/// # Errors
/// See [`ReadError`].
pub fn read(_bytes: &[u8], _mapping: &JsonMapping, _asked: Place) -> Result<Field, ReadError> {
    Err(ReadError::Unsupported("this format".into()))
}
