//! Every way in which a feed's server can fail, over real sockets: the state it leads to, and that the last good document
//! is kept and served.

use std::io::Write;
use std::time::Duration;

use chrono::TimeDelta;
use flate2::Compression;
use rainward::weather::feeds::{FeedError, Standing};
use rainward::weather::spec::Format;

use crate::misbehaving::*;

const MAX_BYTES: usize = 100_000;

struct Row {
    name: &'static str,
    acts: Vec<Act>,
    /// What the reason must contain.
    reason: &'static str,
    status: Option<u16>,
}

fn row(name: &'static str, acts: Vec<Act>, reason: &'static str, status: u16) -> Row {
    Row { name, acts, reason, status: (status > 0).then_some(status) }
}

fn json(body: &str) -> Vec<Act> {
    reply(200, &[("Content-Type", "application/json")], body)
}

fn encoded(encoding: &str, body: &[u8]) -> Vec<Act> {
    reply(200, &[("Content-Encoding", encoding)], body)
}

/// 200 MB of spaces, packed.
fn bombs() -> [(&'static str, Vec<u8>); 4] {
    let spaces = vec![b' '; 1 << 20];
    let times = 200;
    let mut gzip = flate2::write::GzEncoder::new(Vec::new(), Compression::best());
    let mut zlib = flate2::write::ZlibEncoder::new(Vec::new(), Compression::best());
    let mut zstd = zstd::Encoder::new(Vec::new(), 19).unwrap();
    let mut brotli = Vec::new();
    {
        let mut packer = brotli::CompressorWriter::new(&mut brotli, 4096, 9, 22);
        for _ in 0..times {
            packer.write_all(&spaces).unwrap();
        }
    }
    for _ in 0..times {
        gzip.write_all(&spaces).unwrap();
        zlib.write_all(&spaces).unwrap();
        zstd.write_all(&spaces).unwrap();
    }
    [
        ("gzip", gzip.finish().unwrap()),
        ("deflate", zlib.finish().unwrap()),
        ("zstd", zstd.finish().unwrap()),
        ("br", brotli),
    ]
}

const TOO_BIG: &str = "the answer is larger than max_bytes = 100000";

fn broken_exchanges() -> Vec<Row> {
    let half = &FORECAST.as_bytes()[..40];
    vec![
        row(
            "reset in the body",
            vec![head(200, &[], 500), Act::Send(half.into()), Act::Reset],
            "the answer broke off",
            200,
        ),
        row("reset before the head", vec![Act::Reset], "the exchange failed", 0),
        row("closed before the head", vec![], "the exchange failed", 0),
        row("no HTTP", vec![Act::Send(b"SSH-2.0-x\r\n\r\n".into())], "the exchange failed", 0),
        row("truncated body", vec![head(200, &[], 500), Act::Send(half.into())], "the answer broke off", 200),
        row(
            "slow drip",
            (0..40).flat_map(|_| [Act::Send(b"H".into()), Act::Wait(Duration::from_millis(100))]).collect(),
            "no full answer within 1 s",
            0,
        ),
        row(
            "slow body",
            std::iter::once(head(200, &[], 500))
                .chain((0..40).flat_map(|_| [Act::Send(b" ".into()), Act::Wait(Duration::from_millis(100))]))
                .collect(),
            "no full answer within 1 s",
            0,
        ),
        row("endless body", vec![open_head(""), Act::Forever(vec![b' '; 4096])], TOO_BIG, 200),
        row(
            "endless head",
            vec![Act::Send(b"HTTP/1.1 200 OK\r\n".into()), Act::Forever(vec![b'x'; 4096])],
            "the exchange failed",
            0,
        ),
        row("told too big", vec![head(200, &[], MAX_BYTES + 1)], TOO_BIG, 200),
    ]
}

fn refusals() -> Vec<Row> {
    vec![
        row("empty", reply(200, &[], ""), "empty answer", 200),
        row("white space alone", reply(200, &[], " \n"), "it is empty", 200),
        row(
            "no content",
            vec![Act::Send(b"HTTP/1.1 204 No Content\r\nConnection: close\r\n\r\n".into())],
            "empty answer",
            204,
        ),
        row(
            "not modified, nothing kept",
            vec![Act::Send(b"HTTP/1.1 304 X\r\nConnection: close\r\n\r\n".into())],
            "though no document was kept",
            304,
        ),
        row("partial content", reply(206, &[], FORECAST), "gave no document (status 206)", 206),
        row("no credentials", reply(401, &[], "who?"), "the server refuses the credentials (status 401)", 401),
        row("forbidden", reply(403, &[], "no"), "the server refuses the credentials (status 403)", 403),
        row("not found", reply(404, &[], ""), "the server has no such document (status 404)", 404),
        row("asked too often", reply(429, &[("Retry-After", "7000")], ""), "asked too often (status 429)", 429),
        row("failed", reply(500, &[], ""), "the server failed (status 500)", 500),
        row("unavailable", reply(503, &[("Retry-After", "7000")], ""), "not available (status 503)", 503),
        row("redirect in a circle", reply(302, &[("Location", "/again")], ""), "more than 5 redirects", 0),
        row(
            "redirect to another host",
            reply(302, &[("Location", "http://127.0.0.2:9/x")], ""),
            "a redirect to another host",
            0,
        ),
        row(
            "redirect to another port",
            reply(307, &[("Location", "http://127.0.0.1:9/x")], ""),
            "a redirect to another host",
            0,
        ),
        row(
            "redirect to a file",
            reply(302, &[("Location", "file:///etc/hostname")], ""),
            "the server gave no document (status 302)",
            302,
        ),
    ]
}

fn wrong_contents() -> Vec<Row> {
    vec![
        row("HTML", reply(200, &[("Content-Type", "text/html; charset=utf-8")], "<html>"), "HTML instead of data", 200),
        row("HTML called JSON", json("<!DOCTYPE html><html></html>"), "HTML or XML instead of data", 200),
        row("other JSON", json(r#"{"error": "quota"}"#), "/t: is not in the document", 200),
        row("wrong units", json(&FORECAST.replace("[10.0, 12.0]", "[283.0, 285.0]")), "is the unit right?", 200),
        row(
            "arrays of different length",
            json(&FORECAST.replace("[10.0, 12.0]", "[10.0]")),
            "/temp: has 1 values but /t has 2",
            200,
        ),
        row("cut JSON", json(&FORECAST[..70]), "not a readable document: EOF", 200),
        row("not UTF-8", reply(200, &[], b"{\"t\": \"\xe9t\xe9\"}"), "not UTF-8 from byte 7", 200),
        row("NaN", json(&FORECAST.replace("10.0", "NaN")), "not a readable document", 200),
        row("beyond every float", json(&FORECAST.replace("10.0", "1e999")), "number out of range", 200),
        row(
            "all huge",
            json(&FORECAST.replace("[10.0, 12.0]", "[1e308, -1e308]")),
            "none of 2 values lies within",
            200,
        ),
        row(
            "time stands still",
            json(&FORECAST.replace("T01", "T00")),
            "the time 2031-05-04T00:00:00Z occurs twice",
            200,
        ),
        row("packed by a lie", encoded("gzip", FORECAST.as_bytes()), "the answer broke off", 200),
    ]
}

fn packed_bombs() -> Vec<Row> {
    let row_of = |(encoding, bomb): (&'static str, Vec<u8>)| row(encoding, encoded(encoding, &bomb), TOO_BIG, 200);
    bombs().into_iter().map(row_of).collect()
}

fn good() -> Vec<Act> {
    reply(200, &[("Cache-Control", "max-age=60")], FORECAST)
}

#[tokio::test(flavor = "multi_thread")]
async fn every_fault_leads_to_its_state_and_the_last_good_document_is_kept() {
    let rows = [broken_exchanges(), refusals(), wrong_contents(), packed_bombs()];
    let checks = rows.into_iter().flatten().map(|row| tokio::spawn(outlives(row)));
    for check in checks.collect::<Vec<_>>() {
        check.await.unwrap();
    }
}

async fn outlives(row: Row) {
    let Row { name, acts, reason, status } = row;
    let bad = move |_: &Asked| acts.clone();
    let server = Server::start(bad.clone()).await;
    let spec = spec(&format!("{}/point?lat={{lat}}&key=${{KEY}}", server.url));

    // Nothing good yet: the reason is told.
    let hand = Hand::new();
    let without = feeds(spec.clone(), &hand);
    let Err(FeedError::NoDocument { reason: found, .. }) = without.get("coast", here()).await else {
        panic!("{name}: a document out of nothing");
    };
    assert!(found.contains(reason), "{name}: {found}");
    let failed = state(&without);
    assert_eq!((failed.state, failed.documents, failed.consecutive_failures), (Standing::Failing, 0, 1), "{name}");
    let report = without.check("coast", here()).await.unwrap();
    assert!(report.error.is_some_and(|error| error.contains(reason)), "{name}");

    // While it pauses nobody is sent to the server.
    let asked = server.asked().len();
    assert!(without.get("coast", here()).await.is_err());
    assert_eq!(server.asked().len(), asked, "{name}: asked during the pause");

    // Something good first: it is kept, served at once and called stale.
    server.now_do(|_| good());
    let with = feeds(spec, &hand);
    let first = with.get("coast", here()).await.unwrap();
    assert!(!first.stale);
    server.now_do(bad);
    hand.forward(61);
    let kept = with.get("coast", here()).await.unwrap();
    assert_eq!((kept.version, kept.fetched, kept.stale), (first.version, first.fetched, true), "{name}");
    eventually(name, || state(&with).state == Standing::Failing).await;
    let failed = state(&with);
    let failure = failed.last_failure.clone().unwrap();
    assert!(failure.reason.contains(reason), "{name}: {}", failure.reason);
    assert_eq!(failure.status, status, "{name}");
    assert_eq!((failed.documents, failed.age_s), (1, Some(61)), "{name}");
    let pause = failed.next_try.unwrap() - failure.time;
    let patient = matches!(status, Some(429 | 503));
    assert!(
        if patient { pause == TimeDelta::seconds(7000) } else { (30..=60).contains(&pause.num_seconds()) },
        "{name}: {pause}"
    );
    let told = format!("{failed:?} {}", serde_json::to_string(&failed).unwrap());
    assert!(!told.contains(SECRET) && !told.contains("/point") && !told.contains("lat="), "{name}: {told}");

    // Well again after the pause.
    server.now_do(|_| good());
    hand.forward(7201);
    assert!(!with.get("coast", here()).await.unwrap().stale, "{name}");
    let well = state(&with);
    assert_eq!((well.state, well.consecutive_failures, well.age_s), (Standing::Fresh, 0, Some(0)), "{name}");
    assert!(well.last_failure.is_some());
}

#[tokio::test]
async fn a_server_that_is_gone_is_told_so() {
    let hand = Hand::new();
    let mut server = Server::start(|_| good()).await;
    let feeds = feeds(spec(&format!("{}/{{lat}}", server.url)), &hand);
    let first = feeds.get("coast", here()).await.unwrap();
    server.stop().await;
    hand.forward(61);
    let kept = feeds.get("coast", here()).await.unwrap();
    assert_eq!((kept.version, kept.stale), (first.version, true));
    let reason = state(&feeds).last_failure.unwrap().reason;
    assert!(reason.starts_with("the server cannot be reached: Connection refused"), "{reason}");
    // The whole feed is in trouble: another place is not tried, and told why.
    let elsewhere = feeds.get("coast", rainward::bounds::Place::new(10.0, 10.0).unwrap()).await.unwrap_err();
    assert!(elsewhere.to_string().contains("Connection refused"), "{elsewhere}");
    assert_eq!(state(&feeds).consecutive_failures, 1);
}

#[tokio::test]
async fn a_host_without_address_is_told_so() {
    let feeds = feeds(spec("http://nowhere.invalid/{lat}"), &Hand::new());
    let refusal = feeds.get("coast", here()).await.unwrap_err().to_string();
    assert!(refusal.contains("the server cannot be reached"), "{refusal}");
}

#[tokio::test]
async fn no_custom_header_reaches_another_host_and_no_secret_comes_back() {
    let other = Server::start(|_| good()).await;
    let to = other.url.clone();
    let server = Server::start(move |_| reply(302, &[("Location", &to)], "")).await;
    let hand = Hand::new();
    let redirected = feeds(spec(&format!("{}/{{lat}}?key=${{KEY}}", server.url)), &hand);
    assert!(redirected.get("coast", here()).await.is_err());
    assert_eq!(other.asked().len(), 0);
    assert_eq!(server.asked()[0].headers["x-key"], SECRET);
    assert_eq!(server.asked()[0].path, format!("/60.21?key={SECRET}"));

    // A server that repeats the key in its answer does not get it into the open.
    server.now_do(|_| json(&FORECAST.replace("2031-05-04T01:00:00Z", SECRET)));
    let echoed = feeds(spec(&format!("{}/{{lat}}?key=${{KEY}}", server.url)), &hand);
    let refusal = format!("{:?}", echoed.get("coast", here()).await);
    assert!(refusal.contains("***") && !refusal.contains(SECRET), "{refusal}");
    let told = format!("{:?} {:?} {:?}", echoed.states(), echoed.check("coast", here()).await, echoed);
    assert!(told.contains("***") && !told.contains(SECRET), "{told}");
}

#[tokio::test]
async fn what_stands_literally_in_address_and_headers_does_not_come_back_either() {
    let server = Server::start(|_| good()).await;
    let hand = Hand::new();
    let address = server.url.replace("http://", "http://north-quay:user%2Fpassword@");
    let mut literal = spec(&format!("{address}/v1/path-token-{{lat}}/x?lon={{lon}}&id=query%20token"));
    literal.headers.insert("Authorization-Of".into(), format!("Bearer {}", "header-token-".repeat(5)));
    let feeds = feeds(literal, &hand);
    let long = "header-token-".repeat(5);
    for echo in ["north-quay", "user/password", "user%2Fpassword", "path-token-", "query token", "query%20token", &long]
    {
        server.now_do({
            let echo = echo.to_owned();
            move |_| json(&FORECAST.replace("2031-05-04T01:00:00Z", &format!("no {echo}")))
        });
        let report = feeds.check("coast", here()).await.unwrap();
        let refusal = feeds.get("coast", here()).await.unwrap_err();
        let told = format!("{report:?} {refusal:?} {:?}", feeds.states());
        assert!(told.contains("no ***\\\" is no RFC 3339 time"), "{told}");
        assert!(!told.contains("token") && !told.contains("quay") && !told.contains("password"), "{told}");
        assert!(told.contains("127.0.0.1") && told.contains("/t: "), "{told}");
        hand.forward(7200);
    }
}

#[tokio::test]
async fn a_secret_repeated_in_what_is_passed_over_is_not_told() {
    let coverage = r#"{"type": "Coverage", "domain": {"type": "Domain", "domainType": "PointSeries", "axes":
        {"x": {"values": [-4.1]}, "y": {"values": [60.21]}, "t": {"values": ["2031-05-04T00:00:00Z"]}}},
        "parameters": {"T": {"unit": {"symbol": "Cel"}, "observedProperty": {"id": "air_temperature"}},
            "W": {"unit": {"symbol": "SECRET"}, "observedProperty": {"id": "wind_speed"}}},
        "ranges": {"T": {"type": "NdArray", "dataType": "float", "values": [5]}}}"#;
    let server = Server::start(|_| json(&coverage.replace("SECRET", SECRET))).await;
    let mut passing = spec(&format!("{}/{{lat}}", server.url));
    (passing.format, passing.json) = (Format::Coveragejson, None);
    let report = feeds(passing, &Hand::new()).check("coast", here()).await.unwrap();
    let note = "wind_speed: W left out: its unit \"***\" is not known; name one under units";
    assert!(report.error.is_none() && report.notes.iter().any(|told| told == note), "{:?}", report.notes);
}
