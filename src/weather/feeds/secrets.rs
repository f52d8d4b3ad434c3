//! What a feed's address and headers may hold in confidence, and how it is kept out of texts that come from a server.

use std::collections::BTreeSet;

use percent_encoding::percent_decode_str;
use reqwest::Url;
use reqwest::header::HeaderMap;
use secrecy::{ExposeSecret, SecretString};

/// Shortest literal part of an address or header that is kept back, characters; values from the environment always are.
const LEAST: usize = 6;

/// Messages cut long texts short: so many characters of the beginning of a secret are kept back too.
const BEGINNING: usize = 8;

/// Stands for a place in an address that is searched for its literal parts; percent-encoded there.
pub(super) const PLACE: &str = "\n";

/// The secrets of one feed in every spelling in which a server may repeat them, the longest first.
pub(super) struct Secrets(Vec<SecretString>);

impl Secrets {
    /// `environment` holds the values filled in, `url` the address expanded with [`PLACE`] for the coordinates. Literal
    /// parts that stand in `public` too are no secrets.
    pub fn new(environment: Vec<String>, url: Option<&Url>, headers: &HeaderMap, public: &str) -> Self {
        let mut found: BTreeSet<String> = environment.into_iter().collect();
        let literal = url.into_iter().flat_map(parts).chain(headers.iter().flat_map(|(name, value)| {
            // What kinds of answer are welcome is no secret, and its words are those of many a message.
            let value = if name.as_str().starts_with("accept") { "" } else { value.to_str().unwrap_or_default() };
            let words = value.split([' ', ',', ';', '=', '"', ':']);
            std::iter::once(value).chain(words).map(str::to_owned)
        }));
        found.extend(literal.filter(|part| part.chars().count() >= LEAST && !public.contains(part.as_str())));
        for spelling in found.clone() {
            for read in [spelling.clone(), spelling.replace('+', " ")] {
                found.insert(percent_decode_str(&read).decode_utf8_lossy().into_owned());
            }
        }
        found.extend(found.clone().iter().map(|spelling| spelling.escape_debug().to_string()));
        let mut found: Vec<String> = found.into_iter().filter(|spelling| !spelling.is_empty()).collect();
        found.sort_by_key(|spelling| std::cmp::Reverse(spelling.len()));
        Self(found.into_iter().map(SecretString::from).collect())
    }

    /// A text without them.
    pub fn scrub(&self, text: String) -> String {
        let secrets = || self.0.iter().map(ExposeSecret::expose_secret);
        let whole = secrets().fold(text, |text, secret| text.replace(secret, "***"));
        secrets().fold(whole, without_beginning)
    }
}

/// User, password, pieces of the path and values of the query, as they are sent.
fn parts(url: &Url) -> Vec<String> {
    let path = url.path().split('/');
    let query = url.query().unwrap_or_default().split('&').map(|pair| pair.split_once('=').map_or(pair, |pair| pair.1));
    let user = [url.username(), url.password().unwrap_or_default()];
    let pieces = path.chain(query).chain(user).flat_map(|part| part.split("%0A"));
    pieces.map(str::to_owned).collect()
}

/// A text without the beginnings of a secret, as far as they go.
fn without_beginning(text: String, secret: &str) -> String {
    let Some((end, _)) = secret.char_indices().nth(BEGINNING) else { return text };
    let (mut rest, mut clean) = (text.as_str(), String::new());
    while let Some(at) = rest.find(&secret[..end]) {
        clean += &rest[..at];
        clean += "***";
        rest = &rest[at..];
        let shared = rest.chars().zip(secret.chars()).take_while(|(here, there)| here == there);
        rest = &rest[shared.map(|(here, _)| here.len_utf8()).sum()..];
    }
    clean + rest
}
