//! The yardstick of `benches/serve.sh`: an axum handler that does nothing but return a body of a given size.

use axum::Router;
use axum::http::header;
use axum::routing::get;
use axum::serve::ListenerExt;
use bytes::Bytes;
use tokio::net::TcpListener;

#[tokio::main]
async fn main() -> Result<(), Box<dyn std::error::Error>> {
    let mut arguments = std::env::args().skip(1);
    let (Some(port), Some(size)) = (arguments.next(), arguments.next()) else {
        return Err("usage: empty PORT BYTES".into());
    };
    let body = Bytes::from(vec![b'x'; size.parse()?]);
    let answer = move || std::future::ready(([(header::CONTENT_TYPE, "application/json")], body.clone()));
    let listener = TcpListener::bind(("127.0.0.1", port.parse()?)).await?.tap_io(|stream| {
        // As the service does, so that both write alike. A socket that refuses is only slower.
        drop(stream.set_nodelay(true));
    });
    axum::serve(listener, Router::new().route("/", get(answer))).await?;
    Ok(())
}
