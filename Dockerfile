FROM rust:1-slim-bookworm AS build
WORKDIR /src
COPY . .
RUN --mount=type=cache,target=/usr/local/cargo/registry --mount=type=cache,target=/src/target \
    cargo build --locked --release && install -D target/release/rainward /out/rainward

# Without a configuration the built-in demo is served. Your own:
#   docker run -p 8080:8080 -v "$PWD/rainward.toml:/etc/rainward.toml:ro" -e RAINWARD_CONFIG=/etc/rainward.toml rainward
FROM debian:bookworm-slim
# Certificates: feeds are fetched over TLS.
RUN apt-get update && apt-get install -y --no-install-recommends ca-certificates && rm -rf /var/lib/apt/lists/*
RUN useradd --system --no-create-home --shell /usr/sbin/nologin rainward
COPY --from=build /out/rainward /usr/local/bin/rainward
USER rainward
ENV RAINWARD_LISTEN=0.0.0.0:8080
EXPOSE 8080
# Bash asks by itself, so that no client has to be installed.
HEALTHCHECK --interval=30s --timeout=3s --start-period=2s \
    CMD ["bash", "-c", "exec 3<>/dev/tcp/127.0.0.1/8080 && printf 'GET /healthz HTTP/1.0\r\n\r\n' >&3 && grep -q '^HTTP/1.. 200' <&3"]
ENTRYPOINT ["rainward"]
