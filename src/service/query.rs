//! Reading a query: every parameter is checked, and all that is wrong comes back at once.

use std::collections::BTreeMap;

use axum::extract::FromRequestParts;
use axum::http::request::Parts;
use chrono::{DateTime, Utc};

use super::App;
use super::problem::{FieldProblem, Problem};
use crate::bounds::{EYE_HEIGHT, LAT, LON, Place, Range, SEA_TEMPERATURE, TIME_MAX, TIME_MIN, WATER_TEMPERATURE};
use crate::config::{default_eye_height_m, nearest};
use crate::optics::water::Water;
use crate::sky::observer::Observer;

/// Longest value echoed in an error.
const ECHO: usize = 40;

/// The parameters of a request, read one by one.
#[derive(Debug)]
pub struct Query {
    given: BTreeMap<String, String>,
    problems: Vec<FieldProblem>,
}

impl<S: Sync> FromRequestParts<S> for Query {
    type Rejection = std::convert::Infallible;

    async fn from_request_parts(parts: &mut Parts, _state: &S) -> Result<Self, Self::Rejection> {
        let pairs = form_urlencoded::parse(parts.uri.query().unwrap_or_default().as_bytes());
        Ok(Self::from_pairs(pairs.into_owned()))
    }
}

impl Query {
    /// A query from names and values.
    pub fn from_pairs(pairs: impl IntoIterator<Item = (String, String)>) -> Self {
        let mut query = Self { given: BTreeMap::new(), problems: Vec::new() };
        for (name, value) in pairs {
            if query.given.insert(name.clone(), value).is_some() {
                query.refuse(&name, "given twice");
            }
        }
        query
    }

    /// Refuses every parameter that is not in the list, naming the nearest known one.
    pub fn only(&mut self, known: &[&str]) {
        let unknown: Vec<String> = self.given.keys().filter(|name| !known.contains(&name.as_str())).cloned().collect();
        for name in unknown {
            let hint = nearest(&name, known).map_or_else(String::new, |known| format!("; did you mean {known}?"));
            self.refuse(&name, format!("no such parameter{hint}"));
        }
    }

    /// Notes that a parameter cannot be used.
    pub fn refuse(&mut self, field: &str, detail: impl Into<String>) {
        let field = field.chars().take(ECHO).collect();
        self.problems.push(FieldProblem { field, detail: detail.into() });
    }

    /// Notes that a parameter cannot be used, unless that is known.
    pub fn refuse_once(&mut self, field: &str, detail: impl Into<String>) {
        if !self.problems.iter().any(|problem| problem.field == field) {
            self.refuse(field, detail);
        }
    }

    /// A text, where given and not empty.
    pub fn text(&mut self, name: &str) -> Option<String> {
        let value = self.given.get(name)?.clone();
        if value.is_empty() {
            self.refuse(name, "is empty");
            return None;
        }
        Some(value)
    }

    /// One of some names, where given.
    pub fn choice<T: Copy>(&mut self, name: &str, choices: &[(&str, T)]) -> Option<T> {
        let value = self.text(name)?;
        let chosen = choices.iter().find(|choice| choice.0 == value);
        if chosen.is_none() {
            let names: Vec<&str> = choices.iter().map(|choice| choice.0).collect();
            self.refuse(name, format!("must be {}", names.join(" or ")));
        }
        chosen.map(|choice| choice.1)
    }

    /// A number within its range, where given.
    pub fn number(&mut self, range: &Range) -> Option<f64> {
        let value = self.text(range.name)?;
        range.parse(&value).map_err(|error| self.refuse(range.name, error.to_string())).ok()
    }

    /// A time, where given: RFC 3339 with an offset, within the years computed for.
    pub fn time(&mut self, name: &str) -> Option<DateTime<Utc>> {
        let value = self.text(name)?;
        // A plus sign that was not escaped arrives as a space.
        let parsed =
            DateTime::parse_from_rfc3339(&value).or_else(|_| DateTime::parse_from_rfc3339(&value.replace(' ', "+")));
        let Ok(time) = parsed else {
            let echo: String = value.chars().take(ECHO).collect();
            self.refuse(name, format!("{echo:?} is not a time such as 2031-05-04T17:40:00Z"));
            return None;
        };
        let time = time.to_utc();
        if time < TIME_MIN || time > TIME_MAX {
            self.refuse(name, format!("must lie between {} and {}", TIME_MIN.date_naive(), TIME_MAX.date_naive()));
            return None;
        }
        Some(time)
    }

    /// The observer: a site, or a place with an eye height; an eye height given with a site wins over the site's.
    pub fn observer(&mut self, app: &App) -> Option<Observer> {
        let eye_height_m = self.number(&EYE_HEIGHT);
        if let Some(name) = self.text("site") {
            for coordinate in [LAT.name, LON.name] {
                if self.given.contains_key(coordinate) {
                    self.refuse(coordinate, "cannot be combined with site");
                }
            }
            let Some(site) = app.config().sites.iter().find(|site| site.name == name) else {
                let echo: String = name.chars().take(ECHO).collect();
                self.refuse("site", format!("no site is called {echo:?}; /v1/sites lists them"));
                return None;
            };
            let observer = &site.observer;
            return Some(eye_height_m.map_or_else(|| observer.clone(), |height| observer.with_eye_height(height)));
        }
        for coordinate in [LAT.name, LON.name] {
            if !self.given.contains_key(coordinate) && !self.given.contains_key("site") {
                self.refuse(coordinate, "is missing: give lat and lon, or site");
            }
        }
        let (lat, lon) = (self.number(&LAT), self.number(&LON));
        let place = Place::new(lat?, lon?).ok()?;
        Some(Observer::new(place, 0.0, eye_height_m.unwrap_or_else(default_eye_height_m), None))
    }

    /// The water of the drops and its temperature in degrees Celsius.
    pub fn water(&mut self) -> (Water, f64) {
        let water = self.choice("water", &[("fresh", Water::Fresh), ("sea", Water::Sea)]).unwrap_or_default();
        let range = if water == Water::Sea { SEA_TEMPERATURE } else { WATER_TEMPERATURE };
        (water, self.number(&range).unwrap_or(10.0))
    }

    /// Ends the reading.
    ///
    /// # Errors
    /// [`Problem::BadQuery`] with everything that was refused.
    pub fn finish(self) -> Result<(), Problem> {
        if self.problems.is_empty() { Ok(()) } else { Err(Problem::BadQuery(self.problems)) }
    }
}
