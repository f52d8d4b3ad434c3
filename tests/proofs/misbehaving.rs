//! A local HTTP server that does exactly what a test tells it, well or badly.

use std::collections::BTreeMap;
use std::sync::atomic::{AtomicI64, Ordering};
use std::sync::{Arc, Mutex};
use std::time::Duration;

use chrono::DateTime;
use rainward::bounds::Place;
use rainward::clock::Clock;
use rainward::weather::feeds::{FeedState, Feeds, Options};
use rainward::weather::spec::FeedSpec;
use tokio::io::{AsyncReadExt, AsyncWriteExt};
use tokio::net::{TcpListener, TcpStream};
use tokio::task::JoinHandle;

/// 2031-05-04T00:00:00Z.
pub const START_S: i64 = 1_935_619_200;

/// One thing to do on a connection, in turn; then it is closed.
#[derive(Clone)]
pub enum Act {
    Send(Vec<u8>),
    Wait(Duration),
    /// Sends again and again until the other side hangs up.
    Forever(Vec<u8>),
    Reset,
}

/// A request as it came.
#[derive(Clone, Debug)]
pub struct Asked {
    pub path: String,
    pub headers: BTreeMap<String, String>,
}

type Script = Arc<dyn Fn(&Asked) -> Vec<Act> + Send + Sync>;

pub struct Server {
    pub url: String,
    script: Arc<Mutex<Script>>,
    asked: Arc<Mutex<Vec<Asked>>>,
    accepting: JoinHandle<()>,
}

impl Server {
    pub async fn start(script: impl Fn(&Asked) -> Vec<Act> + Send + Sync + 'static) -> Self {
        let listener = TcpListener::bind("127.0.0.1:0").await.unwrap();
        let url = format!("http://{}", listener.local_addr().unwrap());
        let script: Arc<Mutex<Script>> = Arc::new(Mutex::new(Arc::new(script)));
        let asked = Arc::new(Mutex::new(Vec::new()));
        let (scripts, log) = (Arc::clone(&script), Arc::clone(&asked));
        let accepting = tokio::spawn(async move {
            while let Ok((stream, _)) = listener.accept().await {
                tokio::spawn(play(stream, Arc::clone(&scripts), Arc::clone(&log)));
            }
        });
        Self { url, script, asked, accepting }
    }

    pub fn now_do(&self, script: impl Fn(&Asked) -> Vec<Act> + Send + Sync + 'static) {
        *self.script.lock().unwrap() = Arc::new(script);
    }

    pub fn asked(&self) -> Vec<Asked> {
        self.asked.lock().unwrap().clone()
    }

    /// From now on connections are refused.
    pub async fn stop(&mut self) {
        self.accepting.abort();
        let _ = (&mut self.accepting).await;
    }
}

async fn play(mut stream: TcpStream, script: Arc<Mutex<Script>>, log: Arc<Mutex<Vec<Asked>>>) {
    let Some(asked) = receive(&mut stream).await else { return };
    log.lock().unwrap().push(asked.clone());
    let script = Arc::clone(&script.lock().unwrap());
    for act in script(&asked) {
        match act {
            Act::Send(bytes) => {
                if stream.write_all(&bytes).await.is_err() {
                    return;
                }
            }
            Act::Wait(pause) => tokio::time::sleep(pause).await,
            Act::Forever(bytes) => while stream.write_all(&bytes).await.is_ok() {},
            Act::Reset => {
                stream.set_zero_linger().unwrap();
                return;
            }
        }
    }
    let _ = stream.shutdown().await;
}

async fn receive(stream: &mut TcpStream) -> Option<Asked> {
    let (mut head, mut piece) = (Vec::new(), [0; 4096]);
    while !head.windows(4).any(|end| end == b"\r\n\r\n") {
        let length = stream.read(&mut piece).await.ok().filter(|&length| length > 0)?;
        head.extend_from_slice(&piece[..length]);
    }
    let head = String::from_utf8(head).ok()?;
    let mut lines = head.lines();
    let path = lines.next()?.split(' ').nth(1)?.to_owned();
    let headers = lines.filter_map(|line| line.split_once(": "));
    let headers = headers.map(|(name, value)| (name.to_lowercase(), value.to_owned())).collect();
    Some(Asked { path, headers })
}

/// The head of an answer whose body is told by its length.
pub fn head(status: u16, headers: &[(&str, &str)], length: usize) -> Act {
    let headers: Vec<String> = headers.iter().map(|(name, value)| format!("{name}: {value}\r\n")).collect();
    let begin = format!("HTTP/1.1 {status} X\r\nConnection: close\r\nContent-Length: {length}\r\n");
    Act::Send(format!("{begin}{}\r\n", headers.concat()).into_bytes())
}

/// The head of an answer that ends when the connection does.
pub fn open_head(headers: &str) -> Act {
    Act::Send(format!("HTTP/1.1 200 OK\r\nConnection: close\r\n{headers}\r\n").into_bytes())
}

pub fn reply(status: u16, headers: &[(&str, &str)], body: impl AsRef<[u8]>) -> Vec<Act> {
    let body = body.as_ref();
    vec![head(status, headers, body.len()), Act::Send(body.to_vec())]
}

/// A clock that stands until it is moved.
#[derive(Clone)]
pub struct Hand(Arc<AtomicI64>);

impl Hand {
    pub fn new() -> Self {
        Self(Arc::new(AtomicI64::new(START_S)))
    }

    pub fn forward(&self, seconds: i64) {
        self.0.fetch_add(seconds, Ordering::SeqCst);
    }

    pub fn clock(&self) -> Clock {
        let at = Arc::clone(&self.0);
        Clock::from_fn(move || DateTime::from_timestamp(at.load(Ordering::SeqCst), 0).unwrap())
    }
}

/// A small forecast: arrays side by side.
pub const FORECAST: &str =
    r#"{"t": ["2031-05-04T00:00:00Z", "2031-05-04T01:00:00Z"], "temp": [10.0, 12.0], "rain": [0.0, 1.5]}"#;

/// The mapping that reads it, as it stands in a configuration.
pub const MAPPING: &str = r#"
    [feeds.json]
    time = "/t"
    values.temperature = { at = "/temp", unit = "Cel" }
    values.rain = { at = "/rain", unit = "mm", over_min = 60, period = "before" }
"#;

/// A feed of such forecasts.
pub fn spec(url: &str) -> FeedSpec {
    serde_json::from_value(serde_json::json!({
        "name": "coast",
        "url": url,
        "format": "json",
        "timeout_s": 3,
        "max_bytes": 100_000,
        "headers": {"X-Key": "${KEY}"},
        "json": {"time": "/t", "values": {
            "temperature": {"at": "/temp", "unit": "Cel"},
            "rain": {"at": "/rain", "unit": "mm", "over_min": 60, "period": "before"},
        }},
    }))
    .unwrap()
}

pub const SECRET: &str = "s3cret-of-the-coast";

pub fn feeds(spec: FeedSpec, hand: &Hand) -> Feeds {
    let options =
        Options { environment: Arc::new(|name| (name == "KEY").then(|| SECRET.to_owned())), ..Options::default() };
    Feeds::with_options(&[spec], hand.clock(), options).unwrap()
}

pub fn here() -> Place {
    Place::new(60.21, -4.1).unwrap()
}

pub fn state(feeds: &Feeds) -> FeedState {
    feeds.states().remove(0)
}

/// Waits until something holds; what is done in the background takes its time.
pub async fn eventually(what: &str, holds: impl Fn() -> bool) {
    for _ in 0..500 {
        if holds() {
            return;
        }
        tokio::time::sleep(Duration::from_millis(10)).await;
    }
    panic!("never happened: {what}");
}
