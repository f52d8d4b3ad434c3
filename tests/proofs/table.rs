//! Tables of reference figures: every row of a quantity is held against what the library computes.

use chrono::{DateTime, Utc};
use serde::Deserialize;
use serde_json::{Map, Value};

/// One row: inputs, what they should give, and how closely.
#[derive(Debug, Deserialize)]
pub struct Row {
    quantity: String,
    inputs: Map<String, Value>,
    expected: Map<String, Value>,
    tolerance: Map<String, Value>,
}

impl Row {
    /// A number of the inputs.
    pub fn number(&self, key: &str) -> f64 {
        self.inputs[key].as_f64().unwrap_or_else(|| panic!("{key} is no number in {:?}", self.inputs))
    }

    /// The list of numbers of the inputs.
    pub fn numbers(&self, key: &str) -> Vec<f64> {
        let list = self.inputs[key].as_array().unwrap_or_else(|| panic!("{key} is no list in {:?}", self.inputs));
        list.iter().map(|item| item.as_f64().expect("a number")).collect()
    }

    /// A text of the inputs.
    pub fn text(&self, key: &str) -> &str {
        self.inputs[key].as_str().unwrap_or_else(|| panic!("{key} is no text in {:?}", self.inputs))
    }

    /// A list of numbers within an object of the inputs.
    pub fn list(&self, key: &str, member: &str) -> Vec<f64> {
        let list = self.inputs[key][member].as_array();
        let list = list.unwrap_or_else(|| panic!("{key}.{member} is no list in {:?}", self.inputs));
        list.iter().map(|value| value.as_f64().unwrap_or_else(|| panic!("{value} is no number"))).collect()
    }

    /// A text that the row expects; none where it expects none.
    pub fn expected_text(&self, key: &str) -> Option<&str> {
        self.expected[key].as_str()
    }

    /// The tolerance of an expected time, seconds.
    pub fn tolerance_s(&self, key: &str) -> f64 {
        self.tolerance[key]["abs_s"].as_f64().unwrap_or_else(|| panic!("{key} has no tolerance in seconds"))
    }

    /// Whether the inputs have the key.
    pub fn has(&self, key: &str) -> bool {
        self.inputs.contains_key(key)
    }

    /// A number that the row expects.
    pub fn expected_number(&self, key: &str) -> f64 {
        self.expected[key].as_f64().unwrap_or_else(|| panic!("{key} is no number in {:?}", self.expected))
    }
}

/// The rows of one quantity of `tests/reference/{table}.json`.
///
/// # Panics
/// When there are none: a check of nothing is no check.
pub fn rows(table: &str, quantity: &str) -> Vec<Row> {
    #[derive(Deserialize)]
    struct Table {
        rows: Vec<Row>,
    }
    let path = format!("{}/tests/reference/{table}.json", env!("CARGO_MANIFEST_DIR"));
    let text = std::fs::read_to_string(&path).unwrap_or_else(|error| panic!("{path}: {error}"));
    let mut table: Table = serde_json::from_str(&text).unwrap_or_else(|error| panic!("{path}: {error}"));
    table.rows.retain(|row| row.quantity == quantity);
    assert!(!table.rows.is_empty(), "{path} has no rows of {quantity:?}");
    table.rows
}

/// Computes every row of a quantity and holds each expected value against it. `compute` returns an object with (at least) the keys
/// that the row expects; a key it leaves out fails the test, so that no expected value goes unchecked.
///
/// # Panics
/// With every deviation beyond its tolerance.
pub fn check(table: &str, quantity: &str, compute: impl Fn(&Row) -> Value) {
    let rows = rows(table, quantity);
    let mut failures = Vec::new();
    let mut worst = 0.0_f64;
    for row in &rows {
        let computed = compute(row);
        for (key, expected) in &row.expected {
            let Some(got) = computed.get(key) else { panic!("{quantity}: {key} was not computed") };
            match share_of_tolerance(got, expected, row.tolerance.get(key).unwrap_or(&Value::Null)) {
                Some(share) if share <= 1.0 => worst = worst.max(share),
                share => failures.push(format!("{key}: {got} instead of {expected} ({share:?}) for {:?}", row.inputs)),
            }
        }
    }
    println!("{table} / {quantity}: {} rows, worst at {worst:.3} of its tolerance", rows.len());
    assert!(failures.is_empty(), "{quantity}: {} deviations\n{}", failures.len(), failures.join("\n"));
}

/// Deviation as a share of the tolerance, the greatest of a list; `None` where the two cannot be compared.
fn share_of_tolerance(got: &Value, expected: &Value, tolerance: &Value) -> Option<f64> {
    if let Value::Array(expected) = expected {
        let got = got.as_array().filter(|got| got.len() == expected.len())?;
        let mut shares = got.iter().zip(expected).map(|(got, expected)| share_of_tolerance(got, expected, tolerance));
        return shares.try_fold(0.0_f64, |worst, share| Some(worst.max(share?)));
    }
    if tolerance.is_null() || expected.is_null() || got.is_null() {
        return (got == expected).then_some(0.0);
    }
    if let Some(seconds) = tolerance.get("abs_s") {
        let time = |value: &Value| value.as_str()?.parse::<DateTime<Utc>>().ok();
        let apart_s = (time(got)? - time(expected)?).num_milliseconds().abs() as f64 / 1000.0;
        return Some(apart_s / seconds.as_f64()?);
    }
    let (got, expected) = (got.as_f64()?, expected.as_f64()?);
    let allowed = match tolerance.get("rel") {
        Some(rel) => rel.as_f64()? * expected.abs(),
        None => tolerance.get("abs")?.as_f64()?,
    };
    Some((got - expected).abs() / allowed.max(f64::MIN_POSITIVE)).filter(|share| !share.is_nan())
}
