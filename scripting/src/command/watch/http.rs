//! As much of HTTP/1.1 (RFC 9112) as a page on this machine needs: GET, one request a connection, few bytes, short waits.
//!
//! A page of another site must not read results through a name that it makes point to 127.0.0.1, so requests are
//! answered only under this machine's own names.

use std::io::{Read, Write};
use std::net::{TcpListener, TcpStream};
use std::sync::Arc;
use std::sync::atomic::{AtomicUsize, Ordering};
use std::time::Duration;

/// Longest head of a request.
const LONGEST: usize = 16 * 1024;

/// How long a client may keep its connection waiting.
const PATIENCE: Duration = Duration::from_secs(5);

/// Connections served at once.
const MOST: usize = 32;

/// What is sent back.
#[derive(Clone, Debug)]
pub struct Answer {
    status: &'static str,
    kind: &'static str,
    policy: Option<Arc<str>>,
    body: Arc<str>,
}

impl Answer {
    /// A page with its content-security policy.
    pub fn page(html: &Arc<str>, policy: &Arc<str>) -> Self {
        Answer {
            status: "200 OK",
            kind: "text/html; charset=utf-8",
            policy: Some(Arc::clone(policy)),
            body: Arc::clone(html),
        }
    }

    /// Data.
    pub fn json(text: String) -> Self {
        Answer { status: "200 OK", kind: "application/json", policy: None, body: text.into() }
    }

    fn refusal(status: &'static str, words: &str) -> Self {
        Answer { status, kind: "text/plain; charset=utf-8", policy: None, body: format!("{words}\n").into() }
    }

    fn head(&self) -> String {
        let policy = self.policy.as_deref().unwrap_or("default-src 'none'");
        let allow = if self.status.starts_with("405") { "Allow: GET\r\n" } else { "" };
        format!(
            "HTTP/1.1 {}\r\nContent-Type: {}\r\nContent-Length: {}\r\nContent-Security-Policy: {policy}; frame-ancestors 'none'\r\n\
             X-Content-Type-Options: nosniff\r\nReferrer-Policy: no-referrer\r\nCross-Origin-Resource-Policy: same-origin\r\n\
             Cache-Control: no-store\r\n{allow}Connection: close\r\n\r\n",
            self.status,
            self.kind,
            self.body.len()
        )
    }
}

/// Answers requests for ever; `site` gives what is at a path, `busy` counts the answers that are on their way.
pub fn serve(
    listener: &TcpListener,
    port: u16,
    busy: &Arc<AtomicUsize>,
    site: &(impl Fn(&str) -> Option<Answer> + Clone + Send + 'static),
) {
    for stream in listener.incoming().flatten() {
        if busy.fetch_add(1, Ordering::SeqCst) >= MOST {
            busy.fetch_sub(1, Ordering::SeqCst);
            continue;
        }
        let (site, done) = (site.clone(), Arc::clone(busy));
        std::thread::spawn(move || {
            // a client that has gone away is no fault
            let _ = converse(stream, port, &site);
            done.fetch_sub(1, Ordering::SeqCst);
        });
    }
}

fn converse(mut stream: TcpStream, port: u16, site: &impl Fn(&str) -> Option<Answer>) -> std::io::Result<()> {
    stream.set_read_timeout(Some(PATIENCE))?;
    stream.set_write_timeout(Some(PATIENCE))?;
    let mut head = Vec::new();
    let mut buffer = [0; 2048];
    let answer = loop {
        if let Some(end) = head.windows(4).position(|four| four == b"\r\n\r\n") {
            break respond(&head[..end], port, site);
        }
        if head.len() > LONGEST {
            break Answer::refusal(
                "431 Request Header Fields Too Large",
                "the head of the request is too long",
            );
        }
        match stream.read(&mut buffer)? {
            0 => return Ok(()),
            n => head.extend_from_slice(&buffer[..n]),
        }
    };
    stream.write_all(answer.head().as_bytes())?;
    stream.write_all(answer.body.as_bytes())?;
    stream.flush()
}

/// The answer to the head of a request.
fn respond(head: &[u8], port: u16, site: &impl Fn(&str) -> Option<Answer>) -> Answer {
    let bad = |words: &str| Answer::refusal("400 Bad Request", words);
    let Ok(head) = std::str::from_utf8(head) else { return bad("the request is no text") };
    let mut lines = head.split("\r\n");
    let words: Vec<&str> = lines.next().unwrap_or_default().split(' ').collect();
    let [method, path, version] = words.as_slice() else { return bad("the first line is no request") };
    if !version.starts_with("HTTP/1.") {
        return Answer::refusal("505 HTTP Version Not Supported", "HTTP/1.1 is spoken here");
    }
    let hosts: Vec<&str> = lines
        .filter_map(|line| line.split_once(':'))
        .filter(|(name, _)| name.eq_ignore_ascii_case("host"))
        .map(|(_, value)| value.trim())
        .collect();
    let [host] = hosts.as_slice() else { return bad("one Host is needed") };
    if !is_this_machine(host, port) {
        return Answer::refusal(
            "421 Misdirected Request",
            "this address answers to 127.0.0.1 and localhost alone, on its own port",
        );
    }
    if *method != "GET" {
        return Answer::refusal("405 Method Not Allowed", "GET alone");
    }
    site(path).unwrap_or_else(|| Answer::refusal("404 Not Found", "nothing is here"))
}

/// Whether a request was meant for this server under a name that nobody else can give out.
fn is_this_machine(host: &str, port: u16) -> bool {
    ["127.0.0.1", "localhost"].iter().any(|name| {
        host.get(..name.len()).is_some_and(|begin| begin.eq_ignore_ascii_case(name))
            && host
                .get(name.len()..)
                .is_some_and(|rest| rest == format!(":{port}") || (port == 80 && rest.is_empty()))
    })
}

#[cfg(test)]
mod tests {
    use super::*;

    fn status(head: &str) -> String {
        let site = |path: &str| (path == "/").then(|| Answer::json("{}".to_string()));
        respond(head.as_bytes(), 8123, &site).status.to_string()
    }

    /// Source of truth: RFC 9112 (one Host, 400 otherwise) and RFC 9110 (405, 421), by hand.
    #[test]
    fn only_this_machine_is_answered_to() {
        for host in ["127.0.0.1:8123", "localhost:8123", "LocalHost:8123"] {
            assert_eq!(status(&format!("GET / HTTP/1.1\r\nHost: {host}\r\nAccept: */*")), "200 OK", "{host}");
        }
        for host in [
            "evil.example",
            "evil.example:8123",
            "127.0.0.1",
            "127.0.0.1:80",
            "127.0.0.1:81234",
            "localhost.evil.example:8123",
            "[::1]:8123",
            "",
        ] {
            assert_eq!(
                status(&format!("GET / HTTP/1.1\r\nHost: {host}")),
                "421 Misdirected Request",
                "{host}"
            );
        }
        assert_eq!(status("GET / HTTP/1.1\r\nAccept: */*"), "400 Bad Request");
        assert_eq!(status("GET / HTTP/1.1\r\nHost: 127.0.0.1:8123\r\nhost: evil.example"), "400 Bad Request");
        assert_eq!(status("GET http://evil.example/ HTTP/1.1\r\nHost: 127.0.0.1:8123"), "404 Not Found");
        assert_eq!(status("POST / HTTP/1.1\r\nHost: 127.0.0.1:8123"), "405 Method Not Allowed");
        assert_eq!(status("GET /../etc/passwd HTTP/1.1\r\nHost: 127.0.0.1:8123"), "404 Not Found");
        assert_eq!(status("GET /"), "400 Bad Request");
        assert_eq!(status("GET / SPDY/3\r\nHost: 127.0.0.1:8123"), "505 HTTP Version Not Supported");
    }
}
