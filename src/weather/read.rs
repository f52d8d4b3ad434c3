//! The one door to the readers: bytes and a feed's description in, a field or a reason out.

use thiserror::Error;

use super::field::{Field, FieldError};
use super::spec::{CoverageMapping, FeedSpec, Format};
use super::{coveragejson, json};
use crate::bounds::Place;

/// Why a document could not be read, in words that name the place in the document.
#[derive(Debug, Clone, PartialEq, Eq, Error)]
pub enum ReadError {
    /// The bytes are not what the format wants at all: not UTF-8, not JSON, cut short, empty.
    #[error("not a readable document: {0}")]
    Malformed(String),
    /// The document is well formed but says something else than expected.
    #[error("{at}: {what}")]
    Unexpected {
        /// Pointer or name of the place.
        at: String,
        /// What is wrong there.
        what: String,
    },
    /// The document uses a part of its format that is not supported.
    #[error("not supported: {0}")]
    Unsupported(String),
    /// None of the wanted values is in the document.
    #[error("nothing to use: {0}")]
    Empty(String),
    /// The values do not fit together.
    #[error("the values do not fit together: {0}")]
    Field(#[from] FieldError),
}

/// The text of a document, without a byte order mark.
pub(super) fn text(bytes: &[u8]) -> Result<&str, ReadError> {
    let malformed = |what: &str| Err(ReadError::Malformed(what.to_owned()));
    let text = match std::str::from_utf8(bytes) {
        Ok(text) => text.trim_start_matches('\u{feff}').trim_start(),
        Err(error) => return Err(ReadError::Malformed(format!("not UTF-8 from byte {}", error.valid_up_to()))),
    };
    match text.as_bytes().first() {
        None => malformed("it is empty"),
        Some(b'<') => malformed("HTML or XML instead of data"),
        Some(_) => Ok(text),
    }
}

/// Reads a document.
///
/// # Errors
/// [`ReadError`] says what is wrong and where; a reader never panics, whatever the bytes.
pub fn read(bytes: &[u8], spec: &FeedSpec, asked: Place) -> Result<Field, ReadError> {
    match spec.format {
        Format::Json => {
            let mapping = spec
                .json
                .as_ref()
                .ok_or_else(|| ReadError::Unsupported("format \"json\" without a [feeds.json] mapping".into()))?;
            json::read(bytes, mapping, asked)
        }
        Format::Coveragejson => {
            coveragejson::read(bytes, spec.coveragejson.as_ref().unwrap_or(&CoverageMapping::default()), asked)
        }
    }
}
