use super::*;

const HEAD: &str = r#""time": "/t", "values": "#;

fn mapping(text: &str) -> JsonMapping {
    serde_json::from_str(text).unwrap()
}

fn asked() -> Place {
    Place::new(60.0, -4.0).unwrap()
}

fn read_text(document: &str, mapping_text: &str) -> Result<Field, ReadError> {
    read(document.as_bytes(), &mapping(mapping_text), asked())
}

fn refusal(document: &str, mapping_text: &str) -> String {
    read_text(document, mapping_text).unwrap_err().to_string()
}

fn instants(field: &Field, quantity: Quantity) -> Vec<i64> {
    match &field.series(quantity).unwrap().times {
        Times::Instants(times) => times.clone(),
        Times::Periods(_) => panic!("periods"),
    }
}

#[test]
fn amounts_become_mean_rates_over_their_period() {
    let document = r#"{"t": ["2031-05-04T12:00:00Z", "2031-05-04T12:30:00Z"], "r": [0.5, null]}"#;
    for (side, from) in [("before", 11 * 60 + 30), ("after", 12 * 60)] {
        let field = read_text(
            document,
            &format!(r#"{{{HEAD} {{"rain": {{"at": "/r", "unit": "mm", "over_min": 30, "period": "{side}"}}}}}}"#),
        )
        .unwrap();
        let series = field.series(Quantity::Rain).unwrap();
        let midnight = 1_935_619_200;
        let start = midnight + from * 60;
        assert_eq!(series.times.extent(), Some((start, start + 1800)));
        assert_eq!(series.values, [1.0]);
        assert_eq!(field.origins[&Quantity::Rain].missing, 1);
    }
}

#[test]
fn overlapping_periods_are_refused_and_periods_may_be_told_by_the_document() {
    let document =
        r#"{"s": [{"t": 3600, "b": 0, "r": 1}, {"t": 7200, "b": 3600, "r": 2}, {"t": 28800, "b": 7200, "r": 6}]}"#;
    let with = |value: &str| {
        format!(r#"{{"steps": "/s", "time": "/t", "time_format": "unix_s", "values": {{"rain": {value}}}}}"#)
    };
    let overlap = refusal(document, &with(r#"{"at": "/r", "unit": "mm", "over_min": 120, "period": "before"}"#));
    assert!(overlap.starts_with("/r: the periods of rain overlap: 120 min from 1969-12-31T23:00:00Z"), "{overlap}");
    let field = read_text(document, &with(r#"{"at": "/r", "unit": "mm", "since": "/b"}"#)).unwrap();
    assert_eq!(field.series(Quantity::Rain).unwrap().values, [1.0, 2.0, 1.0]);
    assert_eq!(field.series(Quantity::Rain).unwrap().times, Times::Periods(vec![0..3600, 3600..7200, 7200..28800]));
    let means =
        read_text(document, &with(r#"{"at": "/r", "unit": "mm/h", "over_min": 60, "period": "before"}"#)).unwrap();
    assert_eq!(means.series(Quantity::Rain).unwrap().values, [1.0, 2.0, 6.0]);
    assert_eq!(means.series(Quantity::Rain).unwrap().times.gaps(), [(7200, 25200)]);
}

#[test]
fn strings_sentinels_nulls_and_impossible_numbers_are_told_apart() {
    let document = r#"{"t": [0, 1, 2, 3, 4, 5, 6, 7, 8],
        "c": ["50.0", -99, null, 100.0087, -0.001, 1e308, "NaN", "inf", "overcast"]}"#;
    let field = read_text(
        document,
        r#"{"time": "/t", "time_format": "unix_s", "values": {"cloud_total": {"at": "/c", "unit": "%", "missing": [-99]}}}"#,
    )
    .unwrap();
    let values = &field.series(Quantity::CloudTotal).unwrap().values;
    assert_eq!(values.iter().copied().filter(|value| !value.is_nan()).collect::<Vec<_>>(), [0.5, 1.0, 0.0]);
    assert_eq!(values.iter().filter(|value| value.is_nan()).count(), 6);
    assert_eq!(
        field.notes,
        ["3 values of cloud_total outside 0..1 left out", "1 values of cloud_total are no numbers and left out"]
    );
    assert_eq!(field.origins[&Quantity::CloudTotal].missing, 6);
}

#[test]
fn steps_out_of_order_are_sorted_and_times_that_occur_twice_are_refused() {
    let with = |list: &str| format!(r#"{{"t": {list}, "v": [1, 2, 3]}}"#);
    let mapped = r#"{"time": "/t", "time_format": "unix_ms", "values": {"temperature": {"at": "/v", "unit": "Cel"}}}"#;
    let field = read_text(&with("[3000, 1000, 2000]"), mapped).unwrap();
    assert_eq!(instants(&field, Quantity::Temperature), [1, 2, 3]);
    assert_eq!(field.series(Quantity::Temperature).unwrap().values, [2.0, 3.0, 1.0]);
    assert_eq!(field.notes, ["the steps were out of order and have been sorted"]);
    assert_eq!(refusal(&with("[1000, 2000, 1000]"), mapped), "/t: the time 1970-01-01T00:00:01Z occurs twice");
    assert_eq!(refusal(&with("[1000, 2000]"), mapped), "/v: has 3 values but /t has 2");
    let seconds = mapped.replace("unix_ms", "unix_s");
    assert!(refusal(&with("[1935619200000, 1, 2]"), &seconds).contains("is not between 1950 and 2100"));
}

#[test]
fn local_times_follow_the_clocks_through_both_changes() {
    // IANA tz database: Toronto leaves summer time on 2026-11-01 at 06:00 UTC and enters it on 2026-03-08 at 07:00 UTC.
    let mapped = r#"{"time": "/t", "time_format": "%Y-%m-%dT%H:%M", "time_zone": "America/Toronto",
        "values": {"temperature": {"at": "/v", "unit": "Cel"}}}"#;
    let autumn =
        r#"{"t": ["2026-11-01T00:30", "2026-11-01T01:30", "2026-11-01T01:30", "2026-11-01T02:30"], "v": [1, 2, 3, 4]}"#;
    let times = instants(&read_text(autumn, mapped).unwrap(), Quantity::Temperature);
    assert_eq!(times.windows(2).map(|pair| pair[1] - pair[0]).collect::<Vec<_>>(), [3600, 3600, 3600]);
    assert_eq!(intake::moment(times[1]), "2026-11-01T05:30:00Z");
    let backward =
        r#"{"t": ["2026-11-01T02:30", "2026-11-01T01:30", "2026-11-01T01:30", "2026-11-01T00:30"], "v": [4, 3, 2, 1]}"#;
    let field = read_text(backward, mapped).unwrap();
    assert_eq!(instants(&field, Quantity::Temperature), times);
    assert_eq!(field.series(Quantity::Temperature).unwrap().values, [1.0, 2.0, 3.0, 4.0]);
    // Twice the same hour and no more: what a clock shows twice is told apart, what it shows three times is not.
    let within =
        r#"{"t": ["2026-11-01T01:30", "2026-11-01T01:00", "2026-11-01T01:30", "2026-11-01T01:00"], "v": [4, 3, 2, 1]}"#;
    assert_eq!(instants(&read_text(within, mapped).unwrap(), Quantity::Temperature).len(), 4);
    assert!(refusal(&backward.replace("T02:30", "T01:30"), mapped).contains("occurs twice"));
    let spring = refusal(r#"{"t": ["2026-03-08T02:30"], "v": [1]}"#, mapped);
    assert!(spring.starts_with("/t: 2026-03-08 02:30:00 does not exist in America/Toronto"), "{spring}");
}

#[test]
fn patterns_may_carry_an_offset_or_stop_at_the_day_or_hour() {
    for (pattern, text, expected) in [
        ("%Y%m%dT%H%M%S", "20310504T173000", "2031-05-04T17:30:00Z"),
        ("%Y-%m-%d %H:%M %z", "2031-05-04 17:30 +0200", "2031-05-04T15:30:00Z"),
        ("%d.%m.%Y", "04.05.2031", "2031-05-04T00:00:00Z"),
        ("%Y%m%d%H", "2031050417", "2031-05-04T17:00:00Z"),
    ] {
        let document = format!(r#"{{"t": ["{text}"], "v": [1]}}"#);
        let mapped = format!(
            r#"{{"time": "/t", "time_format": "{pattern}", "values": {{"temperature": {{"at": "/v", "unit": "Cel"}}}}}}"#
        );
        let field = read_text(&document, &mapped).unwrap();
        assert_eq!(intake::moment(instants(&field, Quantity::Temperature)[0]), expected, "{pattern}");
    }
}

#[test]
fn pointers_that_match_nothing_and_units_that_cannot_be_right_are_named() {
    let document = r#"{"t": ["2031-05-04T12:00:00Z"], "v": [288.0], "w": [null], "o": [{}], "lat": 61, "lon": 200}"#;
    let with = |value: &str| format!(r"{{{HEAD} {{{value}}}}}");
    for (value, expected) in [
        (r#""temperature": {"at": "/x", "unit": "K"}"#, "/x: is not in the document"),
        (r#""temperature": {"at": "/lat", "unit": "K"}"#, "/lat: is not an array"),
        (r#""temperature": {"at": "/o", "unit": "K"}"#, "/o: none of 1 values of temperature is a number"),
        (
            r#""temperature": {"at": "/v", "unit": "Cel"}"#,
            "/v: read in Cel as temperature, none of 1 values lies within -100..70 Cel: is the unit right?",
        ),
        (
            r#""temperature": {"at": "/w", "unit": "K"}"#,
            "nothing to use: none of the values mapped has a value in 1 steps",
        ),
        (
            r#""wind_speed": {"at": "/v", "unit": "K"}"#,
            "mapping values.wind_speed.unit: wind_speed cannot be measured in K; it needs m/s, km/h, [kn_i], [mi_i]/h",
        ),
        (
            r#""rain": {"at": "/v", "unit": "mm"}"#,
            "mapping values.rain: an amount in mm needs over_min and period, or since",
        ),
        (
            r#""temperature": {"at": "/v", "unit": "K", "over_min": 60, "period": "before"}"#,
            "mapping values.temperature: over_min, period and since are for rain alone",
        ),
        (
            r#""temperature": {"at": "v", "unit": "K"}"#,
            "mapping values.temperature.at: \"v\" is no JSON pointer (RFC 6901): it must begin with \"/\"",
        ),
    ] {
        assert_eq!(refusal(document, &with(value)), expected);
    }
    let placed = read_text(
        document,
        &format!(r#"{{"lat": "/lat", "lon": "/lon", {HEAD} {{"temperature": {{"at": "/v", "unit": "K"}}}}}}"#),
    )
    .unwrap();
    assert_eq!(placed.space, Space::Point(Place::new(61.0, -160.0).unwrap()));
    assert!(placed.located);
}

#[test]
fn what_is_no_json_at_all_is_said_so() {
    let mapped = format!(r#"{{{HEAD} {{"temperature": {{"at": "/v", "unit": "K"}}}}}}"#);
    for (document, expected) in [
        ("", "it is empty"),
        ("  \u{feff}", "expected value"),
        ("<!DOCTYPE html>", "HTML or XML instead of data"),
        (r#"{"t": ["2031"#, "EOF while parsing"),
        (r#"{"t": [NaN]}"#, "expected value"),
    ] {
        let found = refusal(document, &mapped);
        assert!(found.starts_with("not a readable document: ") && found.contains(expected), "{found}");
    }
    let latin1 = read(b"{\"t\": \"\xe9\"}", &mapping(&mapped), asked()).unwrap_err();
    assert_eq!(latin1.to_string(), "not a readable document: not UTF-8 from byte 7");
}

#[test]
fn a_key_left_out_is_missing_unless_the_mapping_says_what_it_stands_for() {
    let with = |value: &str| {
        format!(r#"{{"steps": "/s", "time": "/t", "time_format": "unix_s", "values": {{"rain": {value}}}}}"#)
    };
    let silent = with(r#"{"at": "/rain/1h", "unit": "mm", "over_min": 30, "period": "before"}"#);
    let dry = silent.replace("}}}", r#", "absent": 0}}}"#);
    let steps = |rains: [&str; 3]| {
        let [a, b, c] = rains;
        format!(r#"{{"s": [{{"t": 1800 {a}}}, {{"t": 3600 {b}}}, {{"t": 5400 {c}}}]}}"#)
    };
    let rain = |document: &str, mapped: &str| {
        read_text(document, mapped).map(|field| (field.series(Quantity::Rain).cloned(), field.notes))
    };
    let none = steps(["", "", ""]);
    assert_eq!(rain(&none, &silent).unwrap_err().to_string(), "/rain/1h: is in none of the 3 steps");
    let (series, notes) = rain(&none, &dry).unwrap();
    assert_eq!(series.unwrap().values, [0.0, 0.0, 0.0]);
    assert_eq!(notes, ["rain: /rain/1h is absent in 3 of 3 steps: 0 mm there"]);
    let some = steps(["", r#", "rain": {"1h": 1.5}"#, r#", "rain": {"1h": null}"#]);
    assert_eq!(rain(&some, &silent).unwrap().0.unwrap().values, [3.0]);
    let (series, _) = rain(&some, &dry).unwrap();
    assert_eq!(series.unwrap(), Series { times: Times::Periods(vec![0..1800, 1800..3600]), values: vec![0.0, 3.0] });
    assert_eq!(
        refusal("{}", &dry.replace(r#""steps": "/s", "#, "")),
        "mapping values.rain.absent: needs a list of steps"
    );
}

#[test]
fn a_cloud_base_is_above_the_ground_unless_the_mapping_says_above_the_sea() {
    let document = r#"{"t": ["2031-05-04T12:00:00Z"], "v": [300]}"#;
    let with =
        |quantity: &str, above: &str| format!(r#"{{{HEAD} {{"{quantity}": {{"at": "/v", "unit": "m" {above}}}}}}}"#);
    for (above, expected) in [("", false), (r#", "above": "ground""#, false), (r#", "above": "sea""#, true)] {
        let field = read_text(document, &with("cloud_base", above)).unwrap();
        assert_eq!(field.cloud_base_above_sea, expected, "{above}");
    }
    assert_eq!(
        refusal(document, &with("visibility", r#", "above": "sea""#)),
        "mapping values.visibility.above: is for cloud_base alone"
    );
}
