//! Weather: feeds (fetch, cache, formats) and fields (what they say at a place and time).
//!
//! A reader of a format is a pure function from bytes to a [`field::Field`]; [`feeds::Feeds`] keeps the last good
//! document of every feed. What a feed lacks is absent from its field, never filled in here.

pub mod coveragejson;
pub mod feeds;
pub mod field;
mod intake;
pub mod json;
pub mod quantity;
pub mod read;
pub mod spec;
pub mod unit;
