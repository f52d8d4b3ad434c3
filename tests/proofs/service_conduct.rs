//! How the service behaves as a server: routes, tags, packing, limits, health, stopping.

use std::time::Duration;

use reqwest::Method;
use serde_json::Value;
use tokio::io::{AsyncReadExt, AsyncWriteExt};
use tokio::net::TcpStream;

use crate::misbehaving::{Act, Server};
use crate::served::{Served, noon};

#[tokio::test]
async fn the_document_lists_exactly_what_is_served() {
    let served = Served::demo().await;
    let document = served.get("/openapi.json").await.json();
    let paths: Vec<&str> = document["paths"].as_object().unwrap().keys().map(String::as_str).collect();
    assert_eq!(paths, ["/healthz", "/readyz", "/v1/bow", "/v1/feeds", "/v1/light", "/v1/outlook", "/v1/sites"]);
    for path in paths {
        let query = match path {
            "/v1/bow" | "/v1/outlook" => "?site=gull-stairs",
            "/v1/light" => "?sun_elevation_deg=20",
            _ => "",
        };
        assert_eq!(served.get(&format!("{path}{query}")).await.status, 200, "{path}");
        assert_eq!(served.send(Method::POST, path, &[]).await.status, 405, "{path}");
    }
    for (path, parameters) in [
        ("/v1/bow", &rainward::service::bow::PARAMETERS[..]),
        ("/v1/outlook", &rainward::service::outlook::PARAMETERS[..]),
        ("/v1/light", &rainward::service::light::PARAMETERS[..]),
    ] {
        let listed = document["paths"][path]["get"]["parameters"].as_array().unwrap();
        let mut names: Vec<&str> = listed.iter().map(|parameter| parameter["name"].as_str().unwrap()).collect();
        let mut known = parameters.to_vec();
        names.sort_unstable();
        known.sort_unstable();
        assert_eq!(names, known, "{path}");
        for range in rainward::bounds::QUERY {
            let Some(one) = listed.iter().find(|parameter| parameter["name"] == range.name) else { continue };
            let bounds = (&one["schema"]["minimum"], &one["schema"]["maximum"]);
            assert_eq!(bounds, (&Value::from(range.min), &Value::from(range.max)), "{path}: {}", range.name);
        }
    }
}

#[tokio::test]
async fn unknown_paths_and_methods_are_problems() {
    let served = Served::demo().await;
    for path in ["/nothing", "/v1", "/v1/bow/", "/../Cargo.toml", "/%2e%2e/Cargo.toml", "/v1/bow%00"] {
        assert_eq!(served.get(path).await.status, 404, "{path}");
    }
    assert_eq!(served.send(Method::DELETE, "/v1/bow", &[]).await.status, 405);
    assert_eq!(served.get("/v1/sites?site=x").await.refused(), ["site"]);
    assert_eq!(served.get("/v1/feeds?x=1").await.refused(), ["x"]);
}

#[tokio::test]
async fn the_page_is_inside() {
    let served = Served::demo().await;
    let page = served.get("/").await;
    assert_eq!((page.status, page.header("content-type")), (200, "text/html"));
    assert!(page.header("content-security-policy").contains("default-src 'self'"));
    assert!(page.text.contains("rainward"));
    assert_eq!(served.get("/app.js").await.header("content-type"), "text/javascript");
}

#[tokio::test]
async fn what_the_client_has_is_not_sent_again() {
    let served = Served::demo().await;
    for path in ["/v1/bow?site=gull-stairs&time=2031-05-04T17:40:00Z", "/v1/outlook?site=gull-stairs", "/v1/sites", "/"]
    {
        let first = served.get(path).await;
        let tag = first.header("etag").to_owned();
        assert!(!tag.is_empty() && !first.header("cache-control").is_empty(), "{path}");
        let again = served.send(Method::GET, path, &[("If-None-Match", &tag)]).await;
        assert_eq!((again.status, again.text.as_str()), (304, ""), "{path}");
        let other = served.send(Method::GET, path, &[("If-None-Match", "\"other\"")]).await;
        assert_eq!((other.status, &other.text), (200, &first.text), "{path}");
        let head = served.send(Method::HEAD, path, &[]).await;
        assert_eq!((head.status, head.header("etag")), (200, tag.as_str()), "{path}");
    }
}

#[tokio::test]
async fn answers_are_packed_on_request() {
    let served = Served::demo().await;
    let plain = served.get("/v1/outlook?site=gull-stairs").await;
    let packed = served.send(Method::GET, "/v1/outlook?site=gull-stairs", &[("Accept-Encoding", "gzip")]).await;
    assert_eq!(packed.header("content-encoding"), "gzip");
    assert!(packed.text.len() * 3 < plain.text.len());
}

/// A service whose only feed answers when it pleases.
async fn with_slow_feed(limits: &str) -> (Served, Server) {
    let feed = Server::start(|_| vec![Act::Wait(Duration::from_millis(1500)), Act::Reset]).await;
    let text = format!(
        "[limits]\n{limits}\n[[feeds]]\nname = \"slow\"\nurl = \"{}/point\"\nformat = \"coveragejson\"\ntimeout_s = 5",
        feed.url
    );
    (Served::start(&text, noon()).await, feed)
}

#[tokio::test]
async fn too_many_requests_at_once_are_turned_away_while_health_answers() {
    let (served, _feed) = with_slow_feed("requests = 1").await;
    let slow = served.get("/v1/outlook?lat=47&lon=-31&hours=1");
    let meanwhile = async {
        tokio::time::sleep(Duration::from_millis(300)).await;
        let busy = served.get("/v1/bow?lat=47&lon=-31").await;
        assert_eq!((busy.status, busy.header("retry-after")), (503, "5"));
        assert_eq!(served.get("/healthz").await.status, 200);
    };
    let (slow, ()) = tokio::join!(slow, meanwhile);
    assert_eq!(slow.status, 200);
    assert_eq!(served.get("/v1/bow?lat=47&lon=-31").await.status, 200);
}

#[tokio::test]
async fn an_answer_that_takes_too_long_is_ended() {
    let (served, _feed) = with_slow_feed("request_s = 1").await;
    assert_eq!(served.get("/v1/outlook?lat=47&lon=-31&hours=1").await.status, 503);
    assert_eq!(served.get("/v1/bow?lat=47&lon=-31").await.status, 200);
}

#[tokio::test]
async fn a_body_too_large_is_refused() {
    let served = Served::demo().await;
    let address = served.url.trim_start_matches("http://").to_owned();
    let mut stream = TcpStream::connect(address).await.unwrap();
    stream.write_all(b"GET /v1/sites HTTP/1.1\r\nHost: x\r\nContent-Length: 99999999\r\n\r\n").await.unwrap();
    let mut answer = vec![0; 4096];
    let read = stream.read(&mut answer).await.unwrap();
    let answer = String::from_utf8_lossy(&answer[..read]).into_owned();
    assert!(answer.starts_with("HTTP/1.1 413") && answer.contains("application/problem+json"), "{answer}");
}

#[tokio::test]
async fn more_connections_than_allowed_wait() {
    let text = format!("{}\n[limits]\nconnections = 1", rainward::config::DEMO);
    let served = Served::start(&text, noon()).await;
    let address = served.url.trim_start_matches("http://").to_owned();
    let holder = TcpStream::connect(&address).await.unwrap();
    tokio::time::sleep(Duration::from_millis(100)).await;
    let waiting = tokio::time::timeout(Duration::from_millis(500), served.get("/healthz")).await;
    assert!(waiting.is_err(), "a second connection was answered while the first was open");
    drop(holder);
    assert_eq!(served.get("/healthz").await.status, 200);
}

#[tokio::test]
async fn hostile_heads_do_not_end_the_service() {
    let served = Served::demo().await;
    let address = served.url.trim_start_matches("http://").to_owned();
    let long = format!("GET /{} HTTP/1.1\r\nHost: x\r\n\r\n", "a".repeat(100_000));
    for head in ["\0\0\0\0\r\n\r\n", "GET / HTTP/9.9\r\n\r\n", "nonsense\r\n\r\n", long.as_str(), "GET"] {
        let mut stream = TcpStream::connect(&address).await.unwrap();
        stream.write_all(head.as_bytes()).await.unwrap();
        stream.shutdown().await.unwrap();
        let mut answer = Vec::new();
        let _ = stream.read_to_end(&mut answer).await;
        assert!(!answer.starts_with(b"HTTP/1.1 200"), "{head:.30}");
    }
    assert_eq!(served.get("/healthz").await.status, 200);
}

#[tokio::test]
async fn told_to_stop_it_lets_open_answers_finish() {
    let (mut served, _feed) = with_slow_feed("requests = 9").await;
    let url = format!("{}/v1/outlook?lat=47&lon=-31&hours=1", served.url);
    let open = tokio::spawn(async move { crate::served::client().get(url).send().await.unwrap().status().as_u16() });
    tokio::time::sleep(Duration::from_millis(300)).await;
    served.tell_to_stop();
    let address = served.url.trim_start_matches("http://").to_owned();
    served.ended().await;
    assert_eq!(open.await.unwrap(), 200);
    assert!(TcpStream::connect(address).await.is_err(), "still listening");
}
