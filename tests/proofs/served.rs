//! The real service on a port of its own, and a client that inspects every answer.

use figment::providers::Env;
use rainward::clock::Clock;
use rainward::config;
use rainward::service::{App, serve};
use serde_json::Value;
use tokio::net::TcpListener;
use tokio::sync::oneshot;
use tokio::task::JoinHandle;

pub struct Served {
    pub url: String,
    client: reqwest::Client,
    stop: Option<oneshot::Sender<()>>,
    serving: JoinHandle<()>,
}

pub struct Reply {
    pub status: u16,
    pub headers: reqwest::header::HeaderMap,
    pub text: String,
}

impl Reply {
    pub fn json(&self) -> Value {
        serde_json::from_str(&self.text).unwrap_or_else(|error| panic!("{error} in {}", self.text))
    }

    pub fn header(&self, name: &str) -> &str {
        self.headers.get(name).map_or("", |value| value.to_str().unwrap())
    }

    /// Names of the fields that a problem refuses.
    pub fn refused(&self) -> Vec<String> {
        let errors = self.json()["errors"].take();
        errors.as_array().unwrap().iter().map(|error| error["field"].as_str().unwrap().to_owned()).collect()
    }
}

/// A client that follows nothing and unpacks nothing by itself.
pub fn client() -> reqwest::Client {
    let _ = rustls::crypto::ring::default_provider().install_default();
    reqwest::Client::builder().no_proxy().no_gzip().no_brotli().no_zstd().no_deflate().build().unwrap()
}

impl Served {
    pub async fn start(text: &str, clock: Clock) -> Self {
        let config = config::read(text, Env::prefixed("RAINWARD_NO_SUCH_LAYER_")).unwrap();
        let app = App::new(config, clock).unwrap();
        let listener = TcpListener::bind("127.0.0.1:0").await.unwrap();
        let url = format!("http://{}", listener.local_addr().unwrap());
        let (stop, stopped) = oneshot::channel::<()>();
        let serving = tokio::spawn(serve(listener, app, async move {
            let _ = stopped.await;
        }));
        Self { url, client: client(), stop: Some(stop), serving }
    }

    /// The demo at a fixed moment: 4 May 2031, 12:00 UTC.
    pub async fn demo() -> Self {
        Self::start(config::DEMO, noon()).await
    }

    pub async fn get(&self, path: &str) -> Reply {
        self.send(reqwest::Method::GET, path, &[]).await
    }

    pub async fn send(&self, method: reqwest::Method, path: &str, headers: &[(&str, &str)]) -> Reply {
        let mut request = self.client.request(method.clone(), format!("{}{path}", self.url));
        for (name, value) in headers {
            request = request.header(*name, *value);
        }
        let response = request.send().await.unwrap_or_else(|error| panic!("{path}: {error}"));
        let (status, headers) = (response.status().as_u16(), response.headers().clone());
        let text = String::from_utf8_lossy(&response.bytes().await.unwrap()).into_owned();
        let reply = Reply { status, headers, text };
        assert!(!reply.header("x-request-id").is_empty(), "{path}: no request id");
        assert_eq!(reply.header("x-content-type-options"), "nosniff", "{path}");
        if status >= 400 && method != reqwest::Method::HEAD {
            assert_eq!(reply.header("content-type"), "application/problem+json", "{path}: {}", reply.text);
            assert_eq!(reply.json()["status"], status, "{path}");
        }
        reply
    }

    /// Tells the service to stop; it ends when open answers have ended.
    pub fn tell_to_stop(&mut self) {
        let _ = self.stop.take().map(|stop| stop.send(()));
    }

    pub async fn ended(self) {
        self.serving.await.unwrap();
    }
}

pub fn noon() -> Clock {
    Clock::from_fn(|| chrono::DateTime::from_timestamp(1_935_662_400, 0).unwrap())
}
