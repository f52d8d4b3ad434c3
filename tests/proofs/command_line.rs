//! The command line as cron meets it: exit codes, what goes to standard output, and what to standard error.

use std::io::Write;
use std::process::{Command, Output};

use tempfile::NamedTempFile;

use crate::misbehaving::{FORECAST, MAPPING, Server, reply};

struct Ran {
    code: i32,
    out: String,
    err: String,
}

fn run(arguments: &[&str], environment: &[(&str, &str)]) -> Ran {
    let mut command = Command::new(env!("CARGO_BIN_EXE_rainward"));
    command.args(arguments).env_remove("RAINWARD_CONFIG").env("NO_PROXY", "127.0.0.1");
    let Output { status, stdout, stderr } = command.envs(environment.iter().copied()).output().unwrap();
    let text = |bytes| String::from_utf8(bytes).unwrap();
    Ran { code: status.code().unwrap(), out: text(stdout), err: text(stderr) }
}

fn file(text: &str) -> NamedTempFile {
    let mut file = NamedTempFile::new().unwrap();
    file.write_all(text.as_bytes()).unwrap();
    file
}

#[test]
fn an_outlook_is_printed_for_people() {
    let ran = run(&["outlook", "--site", "gull-stairs", "--hours", "48"], &[]);
    assert!(matches!(ran.code, 0 | 1), "{} {}", ran.code, ran.err);
    assert!(ran.out.starts_with("Gull Stairs, 47.360 N 31.120 W\nFeed demo-showers, 0 min old\n"), "{}", ran.out);
    assert!(ran.out.contains("Caution: Never look at the Sun"), "{}", ran.out);
    assert_eq!(ran.err, "");
}

#[test]
fn the_exit_code_tells_cron() {
    let question = |threshold| {
        run(&["outlook", "--site", "gull-stairs", "--hours", "72", "--json", "--threshold", threshold], &[])
    };
    let some = question("0.01");
    let answer: serde_json::Value = serde_json::from_str(&some.out).unwrap();
    assert_eq!(some.code == 0, !answer["windows"].as_array().unwrap().is_empty());
    // At the pole in midwinter, where the demo does not reach and the Sun does not either.
    let none = run(&["outlook", "--lat", "-89", "--lon", "0", "--from", "2030-06-20T00:00:00Z", "--hours", "24"], &[]);
    assert_eq!(none.code, 1, "{}", none.err);
    assert!(none.out.contains("No window with a chance of 0.3 or more."), "{}", none.out);
}

#[test]
fn unusable_arguments_are_named_and_end_with_2() {
    let ran = run(&["outlook", "--lat", "91", "--lon", "abc", "--hours", "-3"], &[]);
    assert_eq!((ran.code, ran.out.as_str()), (2, ""));
    for line in [
        "rainward: --lat: 91 is out of range: lat must lie between -90 and 90 deg",
        "rainward: --lon: \"abc\" is not a number: lon must lie between -180 and 180 deg",
        "rainward: --hours: -3 is out of range: hours must lie between 1 and 240 h",
    ] {
        assert!(ran.err.contains(line), "{line}\n{}", ran.err);
    }
    assert_eq!(run(&["outlook"], &[]).code, 2);
    assert_eq!(run(&["outlook", "--sight", "x"], &[]).code, 2);
    assert_eq!(run(&["feed", "check", "nothing"], &[]).code, 2);
}

#[test]
fn an_unusable_configuration_is_named_and_ends_with_2() {
    let bad = file("listen = \"127.0.0.1:0\"\nlisten_on = 3\n");
    let ran = run(&["--config", bad.path().to_str().unwrap(), "outlook", "--lat", "1", "--lon", "1"], &[]);
    assert_eq!(ran.code, 2);
    assert!(ran.err.contains("unknown key `listen_on`; did you mean `listen`?"), "{}", ran.err);
    let missing = run(&["--config", "/no/such/file.toml", "outlook", "--lat", "1", "--lon", "1"], &[]);
    assert!(missing.code == 2 && missing.err.contains("/no/such/file.toml"), "{}", missing.err);
    let wrong = run(&["outlook", "--site", "gull-stairs"], &[("RAINWARD_LISTN", "x")]);
    assert!(wrong.code == 2 && wrong.err.contains("did you mean `listen`?"), "{}", wrong.err);
    let secret = file(&format!(
        "[[feeds]]\nname = \"a\"\nurl = \"http://127.0.0.1/\"\nformat = \"json\"\nheaders = {{ K = \"${{NOT_SET}}\" }}\n{MAPPING}"
    ));
    let unset = run(&["--config", secret.path().to_str().unwrap(), "outlook", "--lat", "1", "--lon", "1"], &[]);
    assert!(unset.code == 2 && unset.err.contains("NOT_SET"), "{}", unset.err);
}

#[test]
fn a_taken_port_is_named_and_ends_with_2() {
    let holder = std::net::TcpListener::bind("127.0.0.1:0").unwrap();
    let address = holder.local_addr().unwrap().to_string();
    let ran = run(&["serve", "--listen", &address], &[]);
    assert!(ran.code == 2 && ran.err.contains(&address), "{} {}", ran.code, ran.err);
}

#[tokio::test(flavor = "multi_thread")]
async fn a_feed_is_tried_out_before_it_is_trusted() {
    let server = Server::start(|_| reply(200, &[("Content-Type", "application/json")], FORECAST.as_bytes())).await;
    let config = file(&format!(
        "[[feeds]]\nname = \"coast\"\nurl = \"{}/point?lat={{lat}}&lon={{lon}}\"\nformat = \"json\"\n{MAPPING}",
        server.url
    ));
    let path = config.path().to_str().unwrap().to_owned();
    let check =
        move |path: String| run(&["--config", &path, "feed", "check", "coast", "--lat", "47.4", "--lon", "-31.1"], &[]);
    let asked = path.clone();
    let good = tokio::task::spawn_blocking(move || check(asked)).await.unwrap();
    assert_eq!((good.code, good.err.as_str()), (0, ""));
    for part in [
        "HTTP 200",
        "application/json",
        "temperature",
        "Cel",
        "2031-05-04 00:00 to 2031-05-04 01:00",
        "mm/h",
        "Not given: ",
        "no cloud given",
    ] {
        assert!(good.out.contains(part), "{part}\n{}", good.out);
    }
    assert_eq!(server.asked()[0].path, "/point?lat=47.4&lon=-31.1");
    server.now_do(|_| reply(500, &[], b"no"));
    let bad = tokio::task::spawn_blocking(move || check(path)).await.unwrap();
    assert!(bad.code == 3 && bad.out.contains("NOT READ") && bad.out.contains("500"), "{} {}", bad.code, bad.out);
}

#[test]
fn nonsense_in_limits_and_log_is_refused_with_the_bound() {
    for (text, words) in [
        ("[limits]\nconnections = 9000000000000000000", "limits.connections: "),
        ("[limits]\ndocuments_mb = 0", "between 1 and 1000000 MB"),
        ("[log]\nlevel = \"loud\"", "log.level: \"loud\" must be one of"),
    ] {
        let bad = file(text);
        let ran = run(&["--config", bad.path().to_str().unwrap(), "serve", "--listen", "127.0.0.1:0"], &[]);
        assert!(ran.code == 2 && ran.err.contains(words), "{text}: {} {}", ran.code, ran.err);
    }
}

#[test]
fn a_closed_pipe_is_no_fault() {
    let mut child = Command::new(env!("CARGO_BIN_EXE_rainward"))
        .args(["outlook", "--site", "gull-stairs", "--json", "--hours", "240"])
        .stdout(std::process::Stdio::piped())
        .stderr(std::process::Stdio::piped())
        .spawn()
        .unwrap();
    drop(child.stdout.take());
    let ended = child.wait_with_output().unwrap();
    assert!(matches!(ended.status.code(), Some(0 | 1)), "{ended:?}");
    assert_eq!(String::from_utf8_lossy(&ended.stderr), "");
}

#[test]
fn weather_that_does_not_reach_the_place_is_no_weather() {
    let ran = run(&["outlook", "--lat", "10", "--lon", "10", "--hours", "48"], &[]);
    assert!(ran.code == 3 && ran.err.contains("the feed says nothing of"), "{} {}", ran.code, ran.err);
}
