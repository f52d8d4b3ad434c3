//! How feeds treat their servers and their askers: one request for many, freshness, confirmation, patience.

use std::sync::Arc;
use std::sync::atomic::{AtomicUsize, Ordering};
use std::time::{Duration, Instant};

use futures_util::future::join_all;
use rainward::bounds::Place;
use rainward::weather::feeds::{Document, FeedError, Feeds, Options, Standing};
use rainward::weather::quantity::Quantity;

use crate::misbehaving::*;

fn slowly(acts: Vec<Act>, wait_ms: u64) -> Vec<Act> {
    std::iter::once(Act::Wait(Duration::from_millis(wait_ms))).chain(acts).collect()
}

#[tokio::test(flavor = "multi_thread")]
async fn fifty_askers_make_one_request() {
    let server = Server::start(|_| slowly(reply(200, &[], FORECAST), 200)).await;
    let feeds = feeds(spec(&format!("{}/{{lat}},{{lon}}", server.url)), &Hand::new());
    let answers = join_all((0..50).map(|_| {
        let feeds = feeds.clone();
        tokio::spawn(async move { feeds.get("coast", here()).await })
    }))
    .await;
    let versions: Vec<u64> = answers.into_iter().map(|answer| answer.unwrap().unwrap().version).collect();
    assert!(versions.windows(2).all(|pair| pair[0] == pair[1]));
    assert_eq!(server.asked().len(), 1);
    assert_eq!(state(&feeds).documents, 1);
}

#[tokio::test(flavor = "multi_thread")]
async fn an_asker_who_leaves_does_not_end_the_fetch() {
    let server = Server::start(|_| slowly(reply(200, &[], FORECAST), 300)).await;
    let feeds = feeds(spec(&format!("{}/x", server.url)), &Hand::new());
    let impatient = tokio::time::timeout(Duration::from_millis(50), feeds.get("coast", here())).await;
    assert!(impatient.is_err());
    assert!(feeds.get("coast", here()).await.is_ok());
    assert_eq!(server.asked().len(), 1);
}

/// Asks for places that share no document.
fn asks(
    feeds: &Feeds,
    count: u32,
) -> impl Iterator<Item = impl Future<Output = Result<Document, FeedError>> + use<>> + use<> {
    let feeds = feeds.clone();
    (0..count).map(move |step| {
        let feeds = feeds.clone();
        async move { feeds.get("coast", Place::new(f64::from(step) / 10.0, 0.0).unwrap()).await }
    })
}

#[tokio::test]
async fn beyond_those_who_can_be_served_soon_askers_are_told_to_come_back() {
    let server = Server::start(|_| slowly(reply(200, &[], FORECAST), 100)).await;
    let feeds = feeds(spec(&format!("{}/{{lat}}", server.url)), &Hand::new());
    let answers = join_all(asks(&feeds, 300)).await;
    let (good, refused): (Vec<_>, Vec<_>) = answers.into_iter().partition(Result::is_ok);
    // 4 exchanges and 32 that wait for their turn.
    assert_eq!((good.len(), server.asked().len()), (36, 36));
    for refusal in refused {
        let Err(FeedError::NoDocument { reason, .. }) = refusal else { panic!("{refusal:?}") };
        assert_eq!(reason, "the feed is busy; try again");
    }
    assert!(feeds.get("coast", here()).await.is_ok(), "busy for ever");
    assert_eq!(state(&feeds).last_failure, None);
}

#[tokio::test(flavor = "multi_thread")]
async fn where_a_feed_is_busy_an_old_document_is_served_at_once() {
    let hand = Hand::new();
    let server = Server::start(|_| reply(200, &[("Cache-Control", "max-age=60")], FORECAST)).await;
    let feeds = feeds(spec(&format!("{}/{{lat}}", server.url)), &hand);
    let first = feeds.get("coast", here()).await.unwrap();
    hand.forward(61);
    server.now_do(|_| slowly(reply(200, &[], FORECAST), 700));
    let crowd = tokio::spawn(join_all(asks(&feeds, 36)));
    eventually("the crowd is there", || server.asked().len() == 5).await;
    let begin = Instant::now();
    let old = feeds.get("coast", here()).await.unwrap();
    assert!(begin.elapsed() < Duration::from_millis(500), "{:?}", begin.elapsed());
    assert_eq!((old.version, old.fetched, old.stale), (first.version, first.fetched, true));
    crowd.abort();
}

#[tokio::test(flavor = "multi_thread")]
async fn who_leaves_the_queue_is_not_fetched_for_but_what_began_goes_on() {
    let server = Server::start(|_| slowly(reply(200, &[], FORECAST), 500)).await;
    let feeds = feeds(spec(&format!("{}/{{lat}}", server.url)), &Hand::new());
    let soon = Duration::from_millis(100);
    let crowd = join_all(asks(&feeds, 20).map(|ask| tokio::time::timeout(soon, ask)));
    // Two wait behind them for one document, of whom one leaves.
    let leaver = tokio::time::timeout(soon, feeds.get("coast", here()));
    let (gone, left, served) = tokio::join!(crowd, leaver, feeds.get("coast", here()));
    assert!(left.is_err() && gone.iter().all(Result::is_err));
    assert!(served.is_ok(), "{served:?}");
    eventually("four exchanges end", || state(&feeds).documents == 5).await;
    tokio::time::sleep(Duration::from_millis(100)).await;
    assert_eq!(server.asked().len(), 5);
}

#[tokio::test(flavor = "multi_thread")]
async fn one_who_can_be_served_an_old_document_waits_a_second_at_most() {
    let hand = Hand::new();
    let server = Server::start(|_| reply(200, &[("Cache-Control", "max-age=60")], FORECAST)).await;
    let mut spec = spec(&format!("{}/x", server.url));
    spec.timeout_s = 10.0;
    let feeds = feeds(spec, &hand);
    let first = feeds.get("coast", here()).await.unwrap();
    hand.forward(61);
    let newer = FORECAST.replace("12.0", "13.0");
    server.now_do(move |_| slowly(reply(200, &[("Cache-Control", "max-age=60")], &newer), 2000));
    let begin = Instant::now();
    let old = feeds.get("coast", here()).await.unwrap();
    assert!((900..1950).contains(&begin.elapsed().as_millis()), "{:?}", begin.elapsed());
    assert_eq!((old.version, old.stale, old.age_s(hand.clock().now())), (first.version, true, 61));
    eventually("the refresh lands", || state(&feeds).state == Standing::Fresh).await;
    let new = feeds.get("coast", here()).await.unwrap();
    assert_ne!(new.version, first.version);
    assert!(!new.stale);
    assert_eq!(server.asked().len(), 2);
}

#[tokio::test]
async fn the_servers_word_on_freshness_is_kept_to_the_second() {
    let hand = Hand::new();
    let server = Server::start(|_| reply(200, &[("Cache-Control", "max-age=120"), ("Age", "20")], FORECAST)).await;
    let feeds = feeds(spec(&format!("{}/x", server.url)), &hand);
    assert_eq!(state(&feeds).state, Standing::NeverFetched);
    feeds.get("coast", here()).await.unwrap();
    hand.forward(99);
    assert!(!feeds.get("coast", here()).await.unwrap().stale);
    assert_eq!((server.asked().len(), state(&feeds).state), (1, Standing::Fresh));
    hand.forward(1);
    assert_eq!(state(&feeds).state, Standing::Stale);
    feeds.get("coast", here()).await.unwrap();
    assert_eq!(server.asked().len(), 2);
}

#[tokio::test]
async fn without_a_word_on_freshness_the_refresh_time_counts_and_the_old_is_never_lost_by_time() {
    let hand = Hand::new();
    for header in ["no-store", "no-cache", "public"] {
        let mut server = Server::start(move |_| reply(200, &[("Cache-Control", header)], FORECAST)).await;
        let feeds = feeds(spec(&format!("{}/x", server.url)), &hand);
        feeds.get("coast", here()).await.unwrap();
        hand.forward(15 * 60 - 1);
        feeds.get("coast", here()).await.unwrap();
        assert_eq!(server.asked().len(), 1, "{header}");
        hand.forward(1);
        feeds.get("coast", here()).await.unwrap();
        assert_eq!(server.asked().len(), 2, "{header}");
        server.stop().await;
        hand.forward(30 * 86400);
        let old = feeds.get("coast", here()).await.unwrap();
        assert_eq!((old.stale, old.age_s(hand.clock().now())), (true, 30 * 86400), "{header}");
    }
}

#[tokio::test]
async fn a_confirmed_document_is_new_again_without_being_sent() {
    let hand = Hand::new();
    for (validator, value, condition) in
        [("ETag", "\"v1\"", "if-none-match"), ("Last-Modified", "Sun, 04 May 2031 00:00:00 GMT", "if-modified-since")]
    {
        let server = Server::start(move |asked| {
            if asked.headers.get(condition).is_some_and(|asked| asked == value) {
                return vec![Act::Send(
                    format!("HTTP/1.1 304 X\r\nConnection: close\r\n{validator}: {value}\r\nCache-Control: max-age=60\r\n\r\n").into(),
                )];
            }
            reply(200, &[(validator, value), ("Cache-Control", "max-age=60")], FORECAST)
        })
        .await;
        let feeds = feeds(spec(&format!("{}/x", server.url)), &hand);
        let first = feeds.get("coast", here()).await.unwrap();
        for _ in 0..3 {
            hand.forward(61);
            let again = feeds.get("coast", here()).await.unwrap();
            assert_eq!((again.version, again.stale, again.fetched), (first.version, false, hand.clock().now()));
            assert_eq!(again.first_seen, first.fetched);
        }
        let conditional = server.asked().iter().filter(|asked| asked.headers.contains_key(condition)).count();
        assert_eq!((server.asked().len(), conditional), (4, 3));
        assert_eq!(state(&feeds).last_failure, None);
    }
}

#[tokio::test]
async fn the_same_bytes_sent_again_are_no_newer_forecast() {
    let hand = Hand::new();
    let send = |body: &str| reply(200, &[("Cache-Control", "max-age=60")], body);
    let server = Server::start(move |_| send(FORECAST)).await;
    let feeds = feeds(spec(&format!("{}/x", server.url)), &hand);
    let first = feeds.get("coast", here()).await.unwrap();
    assert_eq!(first.first_seen, hand.clock().now());
    hand.forward(61);
    let again = feeds.get("coast", here()).await.unwrap();
    assert_eq!((again.first_seen, again.fetched), (first.fetched, hand.clock().now()));
    server.now_do(move |_| send(&FORECAST.replace("12.0", "13.0")));
    hand.forward(61);
    let newer = feeds.get("coast", here()).await.unwrap();
    assert_eq!((newer.first_seen, newer.fetched), (hand.clock().now(), hand.clock().now()));
    assert_eq!(server.asked().len(), 3);
}

#[tokio::test]
async fn a_redirect_on_the_same_host_is_followed_and_the_service_names_itself() {
    let server = Server::start(|asked| match asked.path.as_str() {
        "/old" => reply(301, &[("Location", "/new")], ""),
        _ => reply(200, &[], FORECAST),
    })
    .await;
    let mut named = spec(&format!("{}/old", server.url));
    feeds(named.clone(), &Hand::new()).get("coast", here()).await.unwrap();
    named.headers.insert("User-Agent".into(), "north-quay (desk@coast.example)".into());
    feeds(named, &Hand::new()).get("coast", here()).await.unwrap();
    let asked = server.asked();
    assert_eq!(asked.iter().map(|asked| asked.path.as_str()).collect::<Vec<_>>(), ["/old", "/new", "/old", "/new"]);
    assert_eq!(asked[1].headers["user-agent"], concat!("rainward/", env!("CARGO_PKG_VERSION")));
    assert_eq!(asked[3].headers["user-agent"], "north-quay (desk@coast.example)");
    assert_eq!(asked[1].headers["x-key"], SECRET);
    assert!(asked[1].headers["accept-encoding"].contains("gzip"));
}

#[tokio::test]
async fn what_concerns_one_document_does_not_hold_up_the_others() {
    let server = Server::start(|asked| match asked.path.as_str() {
        "/60.21" => reply(404, &[], ""),
        _ => reply(200, &[], FORECAST),
    })
    .await;
    let feeds = feeds(spec(&format!("{}/{{lat}}", server.url)), &Hand::new());
    assert!(feeds.get("coast", here()).await.is_err());
    assert!(feeds.get("coast", Place::new(61.0, 0.0).unwrap()).await.is_ok());
    assert_eq!(state(&feeds).state, Standing::Fresh);
    assert!(feeds.get("coast", here()).await.is_err());
    assert_eq!(server.asked().len(), 2);
}

#[tokio::test]
async fn a_document_that_does_not_say_where_it_holds_serves_wherever_it_is_asked_for() {
    let server = Server::start(|_| reply(200, &[], FORECAST)).await;
    let feeds = feeds(spec(&format!("{}/fixed", server.url)), &Hand::new());
    for (lat, lon) in [(60.21, -4.1), (10.0, 100.0)] {
        let place = Place::new(lat, lon).unwrap();
        let document = feeds.get("coast", place).await.unwrap();
        assert_eq!(document.field.at(Quantity::Temperature, place, START_S + 1800), Some(11.0));
    }
    assert_eq!(server.asked().len(), 1);
}

#[tokio::test]
async fn memory_is_bounded_and_those_asked_for_last_stay() {
    let server = Server::start(|_| reply(200, &[], FORECAST)).await;
    let options =
        Options { environment: Arc::new(|_| Some("x".into())), memory_bytes: 4 * 4096 * 4096, ..Options::default() };
    // Each document counts as 1/4096 of the memory at least, so that 4096 of them are kept.
    let feeds = Feeds::with_options(&[spec(&format!("{}/{{lat}}", server.url))], Hand::new().clock(), options).unwrap();
    for step in 0..60 {
        feeds.get("coast", Place::new(f64::from(step), 0.0).unwrap()).await.unwrap();
    }
    assert_eq!(state(&feeds).documents, 60);
    let small = Options { memory_bytes: 5000, environment: Arc::new(|_| Some("x".into())), ..Options::default() };
    let feeds = Feeds::with_options(&[spec(&format!("{}/{{lat}}", server.url))], Hand::new().clock(), small).unwrap();
    for step in 0..60 {
        feeds.get("coast", Place::new(f64::from(step), 0.0).unwrap()).await.unwrap();
    }
    let before = server.asked().len();
    feeds.get("coast", Place::new(59.0, 0.0).unwrap()).await.unwrap();
    assert_eq!(server.asked().len(), before, "the one asked for last was lost");
    let kept = state(&feeds).documents;
    assert!((1..30).contains(&kept), "{kept} documents in 5 kB");
}

#[tokio::test]
async fn the_demo_goes_through_the_same_reader() {
    let hand = Hand::new();
    let made = Arc::new(AtomicUsize::new(0));
    let count = Arc::clone(&made);
    let options = Options {
        demo: Some(Arc::new(move |now| {
            count.fetch_add(1, Ordering::SeqCst);
            format!(r#"{{"t": ["{}"], "temp": [9.5], "rain": [0]}}"#, now.to_rfc3339()).into_bytes()
        })),
        environment: Arc::new(|_| Some("x".into())),
        ..Options::default()
    };
    let feeds = Feeds::with_options(&[spec("demo:coast")], hand.clock(), options).unwrap();
    let first = feeds.get("coast", here()).await.unwrap();
    assert_eq!(first.field.at(Quantity::Temperature, here(), START_S), Some(9.5));
    hand.forward(899);
    feeds.get("coast", here()).await.unwrap();
    assert_eq!(made.load(Ordering::SeqCst), 1);
    hand.forward(1);
    assert_ne!(feeds.get("coast", here()).await.unwrap().version, first.version);
    assert_eq!(made.load(Ordering::SeqCst), 2);
    assert_eq!((state(&feeds).host.as_str(), state(&feeds).state), ("demo:", Standing::Fresh));
}

#[tokio::test]
async fn a_check_tells_what_was_understood_and_changes_nothing() {
    let server = Server::start(|_| reply(200, &[("Content-Type", "application/json")], FORECAST)).await;
    let feeds = feeds(spec(&format!("{}/x", server.url)), &Hand::new());
    let report = feeds.check("coast", here()).await.unwrap();
    assert_eq!((report.status, report.bytes, report.error), (Some(200), Some(FORECAST.len()), None));
    assert_eq!(report.content_type.as_deref(), Some("application/json"));
    let rain = &report.quantities[0];
    assert_eq!((rain.quantity, rain.at.as_str(), rain.unit_read.as_str()), (Quantity::Rain, "/rain", "mm"));
    assert_eq!((rain.unit_kept.as_str(), rain.count, rain.missing), ("mm/h", 2, 0));
    assert_eq!((rain.min, rain.max), (0.0, 1.5));
    assert_eq!(rain.first.unwrap().to_rfc3339(), "2031-05-03T23:00:00+00:00");
    assert_eq!(report.absent.len(), Quantity::ALL.len() - 2);
    assert_eq!(state(&feeds).state, Standing::NeverFetched);
    assert!(feeds.check("inland", here()).await.is_err());
}
