use super::*;

fn spec(text: &str) -> FeedSpec {
    serde_json::from_str(text).unwrap()
}

fn faults(text: &str) -> Vec<String> {
    let environment: Environment = Arc::new(|name| (name == "KEY").then(|| "s3cret".to_owned()));
    match Source::new(&spec(text), &environment) {
        Ok(_) => Vec::new(),
        Err(faults) => faults.iter().map(ToString::to_string).collect(),
    }
}

#[test]
fn every_fault_of_a_feed_is_named_at_once() {
    let found = faults(
        r#"{"name": "coast", "url": "ftp://weather.example/{lat}", "format": "json", "refresh_min": 0, "timeout_s": 1e9,
            "headers": {"X-Key": "${MISSING}", "bad name": "x"},
            "json": {"time": "t", "values": {"rain": {"at": "/r", "unit": "mm"}}}}"#,
    );
    assert_eq!(
        found,
        [
            "feed \"coast\": refresh_min: 0 is out of range: refresh_min must lie between 1 and 1440 min",
            "feed \"coast\": timeout_s: 1000000000 is out of range: timeout_s must lie between 1 and 120 s",
            "feed \"coast\": json.time: \"t\" is no JSON pointer (RFC 6901): it must begin with \"/\"",
            "feed \"coast\": json.values.rain: an amount in mm needs over_min and period, or since",
            "feed \"coast\": url: must begin with http:// or https:// (or demo: for the built-in demo)",
            "feed \"coast\": headers.X-Key: the environment variable MISSING is not set",
            "feed \"coast\": headers.bad name: is no header name",
        ]
    );
    for (url, expected) in [
        ("https://weather.example/{lat}/{day}", "has {day}; only {lat} and {lon} are known"),
        ("https://weather.example/{lat", "is no URL template (RFC 6570)"),
        ("https://weather.example/?k=${NONE}", "the environment variable NONE is not set"),
        ("weather.example", "is no URL: relative URL without a base"),
    ] {
        let found = faults(&format!(r#"{{"name": "a", "url": "{url}", "format": "coveragejson"}}"#));
        assert_eq!(found, [format!("feed \"a\": url: {expected}")]);
    }
}

#[test]
fn addresses_are_filled_in_and_places_close_by_share_one() {
    let environment: Environment = Arc::new(|name| (name == "KEY").then(|| "s3cret".to_owned()));
    let spec = spec(
        r#"{"name": "a", "url": "https://u:p@weather.example:8443/$x/{lat},{lon}?k=${KEY}", "format": "coveragejson",
            "headers": {"X-Key": "${KEY}"}}"#,
    );
    let Ok(source) = Source::new(&spec, &environment) else { panic!("refused") };
    let ask = |lat, lon| source.ask(Place::new(lat, lon).unwrap()).unwrap();
    let url = ask(60.210_4, -0.000_1).url.unwrap();
    assert_eq!(url.as_str(), "https://u:p@weather.example:8443/$x/60.21,0?k=s3cret");
    assert_eq!(source.host, "https://weather.example:8443");
    assert_eq!(ask(60.210_4, -4.1).key, ask(60.209_6, -4.100_4).key);
    assert_ne!(ask(60.21, -4.1).key, ask(60.211, -4.1).key);
    assert!(source.headers["x-key"].is_sensitive());
    assert_eq!(source.scrub("wrong key s3cret".into()), "wrong key ***");
}

#[test]
fn values_of_the_environment_are_no_templates_and_are_never_told() {
    let value =
        |value: &'static str| -> Environment { Arc::new(move |name| (name == "SEC").then(|| value.to_owned())) };
    let with = |url: &str| spec(&format!(r#"{{"name": "a", "url": "{url}", "format": "coveragejson"}}"#));
    let asked = |url: &str, sec| {
        let source = Source::new(&with(url), &value(sec)).map_err(|faults| format!("{faults:?}"))?;
        Ok::<_, String>((source.ask(Place::new(60.0, -4.0).unwrap()).unwrap().url.unwrap().to_string(), source))
    };
    let (url, source) = asked("https://weather.example/{lat}?k=${SEC}", "s3{lat}c{r et").unwrap();
    assert_eq!(url, "https://weather.example/60?k=s3%7Blat%7Dc%7Br%20et");
    for echo in ["s3{lat}c{r et", "s3%7Blat%7Dc%7Br%20et"] {
        assert_eq!(source.scrub(format!("no key {echo}!")), "no key ***!");
    }
    let (url, _) = asked("${SEC}/{lat}", "https://weather.example/a%20b").unwrap();
    assert_eq!(url, "https://weather.example/a%20b/60");
    for url in ["ht{tp://${SEC}/{lat", "https://weather.example:${SEC}/", "https://weather.example/{day}?${SEC}"] {
        let Err(refusal) = asked(url, "{s3cret}") else { panic!("{url} taken") };
        assert!(!refusal.contains("s3cret"), "{refusal}");
    }
}
