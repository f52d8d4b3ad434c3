//! The parts of a CoverageJSON document as they are written. Values go straight into `f32` arrays; nothing of the
//! document is kept as a tree.

use std::collections::BTreeMap;
use std::fmt;

use serde::de::value::MapAccessDeserializer;
use serde::de::{IgnoredAny, MapAccess, SeqAccess, Visitor};
use serde::{Deserialize, Deserializer};

/// A document: a coverage, a collection of them, or something else that is told by its type.
#[derive(Deserialize)]
#[serde(rename_all = "camelCase")]
pub(super) struct Document {
    #[serde(rename = "type")]
    pub kind: Option<String>,
    pub issued: Option<String>,
    pub domain_type: Option<String>,
    pub domain: Option<Linked<Domain>>,
    #[serde(default)]
    pub parameters: BTreeMap<String, Parameter>,
    #[serde(default)]
    pub ranges: BTreeMap<String, Linked<Range>>,
    pub coverages: Option<Vec<Document>>,
    #[serde(default)]
    pub referencing: Vec<Reference>,
}

/// A part of a document or the URL where it is to be had.
pub(super) enum Linked<T> {
    Here(T),
    Elsewhere,
}

#[derive(Deserialize)]
pub(super) struct Domain {
    #[serde(rename = "domainType")]
    pub kind: Option<String>,
    #[serde(default)]
    pub axes: BTreeMap<String, Axis>,
    #[serde(default)]
    pub referencing: Vec<Reference>,
}

#[derive(Deserialize)]
pub(super) struct Axis {
    pub values: Option<Vec<Tick>>,
    pub bounds: Option<Vec<Tick>>,
    pub start: Option<f64>,
    pub stop: Option<f64>,
    pub num: Option<u64>,
}

/// A value of an axis.
#[derive(Deserialize)]
#[serde(untagged)]
pub(super) enum Tick {
    Number(f64),
    Text(String),
    Other(IgnoredAny),
}

#[derive(Deserialize)]
pub(super) struct Reference {
    #[serde(default)]
    pub coordinates: Vec<String>,
    pub system: System,
}

#[derive(Deserialize)]
pub(super) struct System {
    #[serde(rename = "type")]
    pub kind: String,
    pub id: Option<String>,
    pub calendar: Option<String>,
}

#[derive(Deserialize)]
#[serde(rename_all = "camelCase")]
pub(super) struct Parameter {
    pub unit: Option<UnitText>,
    pub observed_property: Option<Property>,
}

#[derive(Deserialize)]
pub(super) struct UnitText {
    pub symbol: Option<Symbol>,
    pub label: Option<Text>,
}

#[derive(Deserialize)]
#[serde(untagged)]
pub(super) enum Symbol {
    Plain(String),
    Typed { value: String },
}

#[derive(Deserialize)]
pub(super) struct Property {
    pub id: Option<String>,
    pub label: Option<Text>,
}

/// Text, plain or by language.
#[derive(Deserialize)]
#[serde(untagged)]
pub(super) enum Text {
    Plain(String),
    ByLanguage(BTreeMap<String, String>),
}

#[derive(Deserialize)]
#[serde(rename_all = "camelCase")]
pub(super) struct Range {
    #[serde(rename = "type")]
    pub kind: Option<String>,
    pub axis_names: Option<Vec<String>>,
    pub shape: Option<Vec<usize>>,
    pub values: Option<Values>,
}

/// The values of a range; NaN where null.
pub(super) struct Values {
    pub numbers: Vec<f32>,
    /// How many are text or anything else that is no number; NaN among the numbers.
    pub unreadable: usize,
}

impl Text {
    /// The texts in every language given.
    pub fn all(&self) -> Vec<&str> {
        match self {
            Self::Plain(text) => vec![text],
            Self::ByLanguage(texts) => texts.values().map(String::as_str).collect(),
        }
    }
}

impl Symbol {
    pub fn text(&self) -> &str {
        match self {
            Self::Plain(value) | Self::Typed { value } => value,
        }
    }
}

impl<'de, T: Deserialize<'de>> Deserialize<'de> for Linked<T> {
    fn deserialize<D: Deserializer<'de>>(deserializer: D) -> Result<Self, D::Error> {
        struct Either<T>(std::marker::PhantomData<T>);
        impl<'de, T: Deserialize<'de>> Visitor<'de> for Either<T> {
            type Value = Linked<T>;

            fn expecting(&self, f: &mut fmt::Formatter) -> fmt::Result {
                f.write_str("an object or a URL")
            }

            fn visit_str<E>(self, _url: &str) -> Result<Self::Value, E> {
                Ok(Linked::Elsewhere)
            }

            fn visit_map<A: MapAccess<'de>>(self, map: A) -> Result<Self::Value, A::Error> {
                T::deserialize(MapAccessDeserializer::new(map)).map(Linked::Here)
            }
        }
        deserializer.deserialize_any(Either(std::marker::PhantomData))
    }
}

impl<'de> Deserialize<'de> for Values {
    fn deserialize<D: Deserializer<'de>>(deserializer: D) -> Result<Self, D::Error> {
        struct Array;
        impl<'de> Visitor<'de> for Array {
            type Value = Values;

            fn expecting(&self, f: &mut fmt::Formatter) -> fmt::Result {
                f.write_str("an array of values")
            }

            fn visit_seq<A: SeqAccess<'de>>(self, mut seq: A) -> Result<Values, A::Error> {
                let mut values = Values { numbers: Vec::new(), unreadable: 0 };
                while let Some(Cell(number)) = seq.next_element()? {
                    values.unreadable += usize::from(number.is_none());
                    values.numbers.push(number.unwrap_or(f32::NAN));
                }
                Ok(values)
            }
        }
        deserializer.deserialize_seq(Array)
    }
}

/// One value: a number, NaN for null, nothing for all else.
struct Cell(Option<f32>);

impl<'de> Deserialize<'de> for Cell {
    #[inline]
    fn deserialize<D: Deserializer<'de>>(deserializer: D) -> Result<Self, D::Error> {
        struct One;
        impl<'de> Visitor<'de> for One {
            type Value = Cell;

            fn expecting(&self, f: &mut fmt::Formatter) -> fmt::Result {
                f.write_str("a value")
            }

            #[inline]
            fn visit_f64<E>(self, value: f64) -> Result<Cell, E> {
                Ok(Cell(Some(value as f32)))
            }

            #[inline]
            fn visit_u64<E>(self, value: u64) -> Result<Cell, E> {
                Ok(Cell(Some(value as f32)))
            }

            #[inline]
            fn visit_i64<E>(self, value: i64) -> Result<Cell, E> {
                Ok(Cell(Some(value as f32)))
            }

            #[inline]
            fn visit_unit<E>(self) -> Result<Cell, E> {
                Ok(Cell(Some(f32::NAN)))
            }

            fn visit_bool<E>(self, _value: bool) -> Result<Cell, E> {
                Ok(Cell(None))
            }

            fn visit_str<E>(self, _value: &str) -> Result<Cell, E> {
                Ok(Cell(None))
            }

            fn visit_seq<A: SeqAccess<'de>>(self, mut seq: A) -> Result<Cell, A::Error> {
                while seq.next_element::<IgnoredAny>()?.is_some() {}
                Ok(Cell(None))
            }

            fn visit_map<A: MapAccess<'de>>(self, mut map: A) -> Result<Cell, A::Error> {
                while map.next_entry::<IgnoredAny, IgnoredAny>()?.is_some() {}
                Ok(Cell(None))
            }
        }
        deserializer.deserialize_any(One)
    }
}
