//! The report and the page of a run that goes on: bytes, names, limits; what a browser makes of them is in `browser`.

use std::io::{BufRead, BufReader, Read, Write};
use std::net::TcpStream;
use std::process::{Child, Stdio};

use epiloom::archive::{Archive, Label, OrderKey, RunHeader, Snapshot, Writer};

use crate::support::{Bench, SMALL_CELL};

/// What no text of an archive may do to a page.
pub const HOSTILE: &str =
    "</script><script>document.documentElement.dataset.acted=1</script><img src=x onerror=alert(1)>";

/// A script whose names try to act, with every kind of snapshot.
pub fn hostile_script() -> String {
    let cell = SMALL_CELL.replace("\"emitter\"", "\"<script>alert(1)</script>\"");
    format!(
        "// <script>alert(2)</script> & \"what\" a script may say\n{cell}
store(\"light J-V\", cell.jv(lamp));
store(\"dark J-V\", cell.jv(dark(), 0.V, 1.V, 50.mV));
store(\"at 0.5 V\", cell.at(0.5.V, lamp));
store(\"response\", cell.eqe(400.nm, 850.nm, 10.nm));
store(\"between two decimals\", [#{{ row: 1, tie: 1930444431351087.25 }}, #{{ row: 2, tie: 1.00000762939453125 }}, #{{ row: 3, tie: -6e-05 }}]);
store(`{HOSTILE}`, #{{ voc: cell.jv(lamp, [0.V]).voc, share: 0.25 }});
"
    )
}

/// A run of that script with its page.
pub fn hostile_page() -> Bench {
    let bench = Bench::with("hostile.rhai", &hostile_script());
    bench.ends(0, &["run", "hostile.rhai", "--quiet"]);
    let ran = bench.ends(0, &["report", "hostile.epiloom", "-o", "report.html"]);
    assert_eq!(ran.out, "report.html\n");
    bench
}

/// Source of truth: the HTML standard: the only script elements are the page's own two and its data blocks, whose content has
/// letters of base64 alone; the policy names nothing but digests. The same archive gives the same page.
#[test]
fn a_page_holds_no_markup_but_its_own() {
    let bench = hostile_page();
    let page = String::from_utf8(bench.bytes("report.html")).expect("UTF-8");
    let scripts: Vec<&str> = page.match_indices("<script").map(|(at, _)| &page[at..]).collect();
    let own = scripts.iter().filter(|text| text.starts_with("<script>")).count();
    assert_eq!(own, 2, "the library and the page's script");
    for block in scripts.iter().filter(|text| text.starts_with("<script type=\"text/plain\"")) {
        let inside =
            block.split_once('>').and_then(|(_, rest)| rest.split_once("</script>")).expect("an end").0;
        assert!(inside.bytes().all(|b| b.is_ascii_alphanumeric() || b"+/=".contains(&b)));
    }
    assert_eq!(own + 1 + 6, scripts.len(), "records, six snapshots, and no other");
    assert!(!page.contains("<img") && !page.contains("javascript:"));
    assert!(
        page.contains("&lt;script&gt;alert(2)&lt;/script&gt; &amp; &quot;what&quot;"),
        "the script shows as itself"
    );
    let policy =
        page.split("Content-Security-Policy\" content=\"").nth(1).and_then(|rest| rest.split('"').next());
    let policy = policy.expect("a policy").replace("&#39;", "'");
    assert!(policy.starts_with("default-src 'none'; script-src 'sha256-"), "{policy}");
    for word in policy.split([' ', ';']).filter(|word| !word.is_empty()) {
        let known =
            ["default-src", "script-src", "style-src", "base-uri", "form-action", "'none'"].contains(&word);
        assert!(known || word.starts_with("'sha256-"), "{word}");
    }
    bench.ends(0, &["report", "hostile.epiloom", "--out", "again.html"]);
    assert!(bench.bytes("report.html") == bench.bytes("again.html"));
    // nothing that the page's own script does turns text into markup
    let script = page.rsplit("<script>").next().expect("a script");
    for way in [
        "innerHTML",
        "outerHTML",
        "insertAdjacentHTML",
        "document.write",
        "eval(",
        "new Function",
        "XMLHttpRequest",
        "WebSocket",
    ] {
        assert!(!script.contains(way), "{way}");
    }
}

/// Source of truth: the promises of the manual: default name, the archive itself kept, damage told, an unfinished one shown.
#[test]
fn a_page_is_written_beside_and_never_over_its_archive() {
    let bench = Bench::with(
        "small.rhai",
        &format!(
            "{SMALL_CELL}store(\"light\", cell.jv(lamp, [0.V, 0.5.V]));\nstore(\"more\", cell.at(0.2.V, lamp));"
        ),
    );
    bench.ends(0, &["run", "small.rhai", "--quiet"]);
    assert_eq!(bench.ends(0, &["report", "small.epiloom"]).out, "small.html\n");
    let before = bench.bytes("small.epiloom");
    let refused = bench.ends(5, &["report", "small.epiloom", "-o", "./small.epiloom"]);
    assert!(refused.err.contains("is the archive itself"), "{}", refused.err);
    assert!(bench.bytes("small.epiloom") == before);
    bench.ends(5, &["report", "nowhere.epiloom"]);
    // one damaged snapshot: the other is shown, and the exit code tells
    let mut bytes = before;
    let at = bytes.len() * 3 / 4;
    bytes[at] ^= 1;
    std::fs::write(bench.path("torn.epiloom"), &bytes).expect("written");
    let ran = bench.run(&["report", "torn.epiloom", "-o", "torn.html"]);
    assert_eq!(ran.code, 3, "{}", ran.err);
    let page = String::from_utf8(bench.bytes("torn.html")).expect("UTF-8");
    assert!(page.contains("damaged"), "the page names what is damaged");
}

/// A hundred real snapshots: a curve and a bias point of each of fifty thicknesses.
pub fn hundred() -> Bench {
    let cell = SMALL_CELL
        .replace("let base = input(\"base\", 500.nm);\n", "")
        .replace("let cell =", "fn cell_of(thin, base) {")
        .replace("]);\nlet lamp", "])\n}\nlet lamp");
    let script = format!(
        "{cell}for i in 0..50 {{\n    let base = (300 + 20 * i).nm;\n    let cell = cell_of(thin, base);\n    \
         store(`light, ${{base}}`, cell.jv(lamp));\n    store(`at maximum power, ${{base}}`, cell.at(0.7.V, lamp));\n}}\n"
    );
    let bench = Bench::with("hundred.rhai", &script);
    bench.ends(0, &["run", "hundred.rhai", "--quiet"]);
    bench
}

/// Source of truth: the limit of mail, 2 MB for a hundred snapshots; what is left out is said; without the limit nothing is.
#[test]
fn a_hundred_snapshots_stay_under_two_megabytes() {
    let bench = hundred();
    assert_eq!(Archive::open(&bench.path("hundred.epiloom")).expect("an archive").entries().len(), 100);
    let ran = bench.ends(0, &["report", "hundred.epiloom", "-o", "report.html"]);
    let size = bench.bytes("report.html").len();
    assert!(size < 2_000_000, "{size}");
    assert!(size > 1_700_000, "as many rows as there is room for: {size}");
    assert!(ran.err.contains("--all-rows"), "{}", ran.err);
    let ran = bench.ends(0, &["report", "hundred.epiloom", "-o", "all.html", "--all-rows"]);
    assert!(ran.err.is_empty() && bench.bytes("all.html").len() > 2_000_000, "{}", ran.err);
}

/// A run that a test steers: it stores when it is told to.
pub struct SlowRun {
    /// Its folder.
    pub bench: Bench,
    writer: Option<Writer<'static>>,
    header: RunHeader,
    stored: Vec<Snapshot>,
    count: u64,
}

impl SlowRun {
    /// A run that has begun and stored one snapshot.
    pub fn begin() -> Self {
        let bench = Bench::with(
            "slow.rhai",
            &format!("{SMALL_CELL}store(\"point\", cell.jv(lamp, [0.V, 0.4.V, 0.8.V]));"),
        );
        bench.ends(0, &["run", "slow.rhai", "--quiet", "--out", "model.epiloom"]);
        let model = Archive::open(&bench.path("model.epiloom")).expect("an archive");
        let header = model.run().expect("a run").clone();
        let stored = vec![model.snapshot("point").expect("a snapshot")];
        let writer = Writer::create(&bench.path("slow.epiloom"), &header).expect("a writer");
        let mut run = SlowRun { bench, writer: Some(writer), header, stored, count: 0 };
        run.store();
        run
    }

    /// Stores one more snapshot.
    pub fn store(&mut self) {
        let mut snapshot = self.stored[0].clone();
        let order = OrderKey { step: self.count, point: 0 };
        snapshot.label = Label { name: format!("point {}", self.count), order, ..snapshot.label };
        self.count += 1;
        self.writer.as_mut().expect("a run that goes on").append(&snapshot).expect("stored");
    }

    /// Ends well.
    pub fn finish(&mut self) {
        self.writer.take().expect("a run that goes on").finish(&self.header).expect("finished");
    }

    /// `epiloom watch` and the address that it prints.
    pub fn watch(&self) -> (Child, String) {
        let mut child = self
            .bench
            .command(&["watch", "slow.epiloom"])
            .stdout(Stdio::piped())
            .stderr(Stdio::piped())
            .spawn()
            .expect("the command starts");
        let mut address = String::new();
        BufReader::new(child.stdout.take().expect("a pipe")).read_line(&mut address).expect("an address");
        (child, address.trim().to_string())
    }
}

/// Head and body of what a server answers.
fn ask(address: &str, request: &str) -> (String, String) {
    let host = address.trim_start_matches("http://").trim_end_matches('/');
    let mut stream = TcpStream::connect(host).expect("a server");
    stream.write_all(request.replace("HOST", host).as_bytes()).expect("sent");
    let mut answer = String::new();
    stream.read_to_string(&mut answer).expect("an answer");
    let (head, body) = answer.split_once("\r\n\r\n").expect("a head");
    (head.to_string(), body.to_string())
}

/// Source of truth: the promise of the manual: this machine's names alone, news as they land, the end with the run.
#[test]
fn a_run_is_watched_from_this_machine_alone_until_it_ends() {
    let mut run = SlowRun::begin();
    let (child, address) = run.watch();
    assert!(address.starts_with("http://127.0.0.1:"), "{address}");
    let get = "GET / HTTP/1.1\r\nHost: HOST\r\n\r\n";
    let (head, body) = ask(&address, get);
    assert!(head.starts_with("HTTP/1.1 200") && head.contains("connect-src 'self'"), "{head}");
    assert!(body.contains("point 0") && !body.contains("point 1"));
    for (host, status) in [("evil.example", 421), ("evil.example:80", 421), ("127.0.0.1:1", 421)] {
        let (head, body) = ask(&address, &format!("GET / HTTP/1.1\r\nHost: {host}\r\n\r\n"));
        assert!(head.starts_with(&format!("HTTP/1.1 {status}")), "{host}: {head}");
        assert!(!body.contains("point"), "nothing is given away");
    }
    let version = |address: &str| ask(address, "GET /state HTTP/1.1\r\nHost: HOST\r\n\r\n").1;
    let before = version(&address);
    assert!(before.contains("\"running\":true"), "{before}");
    run.store();
    while version(&address) == before {
        std::thread::sleep(std::time::Duration::from_millis(20));
    }
    assert!(ask(&address, get).1.contains("point 1"));
    run.finish();
    let ended = child.wait_with_output().expect("it ends with the run");
    assert_eq!(ended.status.code(), Some(0));
    assert!(String::from_utf8_lossy(&ended.stderr).contains("the run has ended"));
    let late = run.bench.ends(5, &["watch", "slow.epiloom"]);
    assert!(late.err.contains("epiloom report slow.epiloom"), "{}", late.err);
    let early = run.bench.ends(5, &["watch", "nowhere.epiloom"]);
    assert!(early.err.contains("start one first"), "{}", early.err);
}

/// Source of truth: the exit code of an archive that has no end; the snapshots stay where they were.
#[test]
fn a_run_that_stops_before_its_end_is_told() {
    let mut run = SlowRun::begin();
    let (child, _) = run.watch();
    drop(run.writer.take());
    let ended = child.wait_with_output().expect("it ends with the run");
    assert_eq!(ended.status.code(), Some(3));
    assert!(String::from_utf8_lossy(&ended.stderr).contains("slow.epiloom.unfinished"));
    let left = run.bench.ends(5, &["watch", "slow.epiloom"]);
    assert!(left.err.contains("a run has stopped there"), "{}", left.err);
    assert_eq!(run.bench.ends(3, &["report", "slow.epiloom.unfinished"]).out, "slow.html\n");
}
