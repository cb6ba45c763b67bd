//! Chromium with a page from a file, driven through chromedriver by the W3C WebDriver protocol.
//! Each test binary uses a part of it.
#![allow(dead_code)]

use std::net::{TcpListener, TcpStream};
use std::path::Path;
use std::process::{Child, Command, Stdio};
use std::time::{Duration, Instant};

use serde_json::{Value, json};
use tempfile::TempDir;

/// Keep headless Chromium from going anywhere but to its page.
const FLAGS: [&str; 9] = [
    "--headless=new",
    "--no-sandbox",
    "--disable-gpu",
    "--disable-quic",
    "--no-first-run",
    "--disable-background-networking",
    "--disable-component-update",
    "--disable-sync",
    "--window-size=1200,900",
];
const PATIENCE: Duration = Duration::from_secs(30);

/// A browser window.
pub struct Browser {
    driver: Child,
    agent: ureq::Agent,
    session: String,
    /// The profile, and where downloads go.
    folder: TempDir,
}

impl Browser {
    /// Starts one.
    ///
    /// # Panics
    /// If chromium or chromedriver is missing or does not start; tools/run-tests installs both.
    pub fn start() -> Browser {
        let port = TcpListener::bind("127.0.0.1:0").and_then(|free| free.local_addr()).expect("a free port").port();
        let driver = Command::new("chromedriver")
            .arg(format!("--port={port}"))
            .stdout(Stdio::null())
            .stderr(Stdio::null())
            .spawn()
            .unwrap_or_else(|error| {
                panic!(
                    "chromedriver does not start ({error}): tools/run-tests installs it (Debian: chromium-driver)"
                )
            });
        let folder = TempDir::new().expect("a temporary folder");
        let started = Instant::now();
        while TcpStream::connect(("127.0.0.1", port)).is_err() {
            assert!(started.elapsed() < PATIENCE, "chromedriver does not answer");
            std::thread::sleep(Duration::from_millis(50));
        }
        let config = ureq::Agent::config_builder()
            .http_status_as_error(false)
            .proxy(None)
            .timeout_global(Some(2 * PATIENCE));
        let root = format!("http://127.0.0.1:{port}/session");
        let mut browser = Browser { driver, agent: config.build().into(), session: root, folder };
        let mut args: Vec<String> = FLAGS.iter().map(|&flag| flag.to_owned()).collect();
        args.push(format!("--user-data-dir={}", browser.folder.path().join("profile").display()));
        let options = json!({ "args": args });
        let wanted = json!({"capabilities": {"alwaysMatch": {
            "browserName": "chrome",
            "goog:chromeOptions": options,
            "goog:loggingPrefs": {"browser": "ALL"},
            "unhandledPromptBehavior": "accept",
        }}});
        let session = browser.post("", &wanted);
        let id = session["sessionId"].as_str().unwrap_or_else(|| {
            panic!("Chromium does not start: {session}; tools/run-tests installs it (Debian: chromium)")
        });
        browser.session = format!("{}/{id}", browser.session);
        let downloads = browser.downloads();
        std::fs::create_dir(&downloads).expect("made");
        browser.tool("Browser.setDownloadBehavior", json!({"behavior": "allow", "downloadPath": downloads}));
        browser
    }

    /// Where downloads go.
    pub fn downloads(&self) -> std::path::PathBuf {
        self.folder.path().join("downloads")
    }

    /// Opens a page from a file.
    pub fn open(&self, page: &Path) {
        let page = page.canonicalize().expect("the page is there");
        self.post("/url", &json!({"url": format!("file://{}", page.display())}));
    }

    /// Runs the body of a function in the page and returns what it returns; a promise is awaited.
    pub fn run(&self, script: &str) -> Value {
        self.post("/execute/sync", &json!({"script": script, "args": []}))
    }

    /// The value of an expression.
    pub fn value(&self, expression: &str) -> Value {
        self.run(&format!("return {expression}"))
    }

    /// Waits until an expression is true.
    pub fn wait(&self, expression: &str) {
        let started = Instant::now();
        while self.value(expression) != json!(true) {
            assert!(started.elapsed() < PATIENCE, "never true: {expression}");
            std::thread::sleep(Duration::from_millis(30));
        }
    }

    /// Clicks on what a CSS selector finds, as a person would.
    pub fn click(&self, selector: &str) {
        let found = self.post("/element", &json!({"using": "css selector", "value": selector}));
        let element = found.as_object().and_then(|found| found.values().next()).and_then(Value::as_str);
        let element = element.unwrap_or_else(|| panic!("{selector}: {found}"));
        // Into the middle: what is fixed to the window's edge may lie over the rest.
        self.run(&format!("document.querySelector({}).scrollIntoView({{block: 'center'}})", json!(selector)));
        self.post(&format!("/element/{element}/click"), &json!({}));
    }

    /// Presses keys one after another; Enter is '\n'.
    pub fn keys(&self, keys: &str) {
        let stroke = |key: char| {
            // The protocol's own code for Enter.
            let value = if key == '\n' { '\u{e007}' } else { key }.to_string();
            [json!({"type": "keyDown", "value": value}), json!({"type": "keyUp", "value": value})]
        };
        let actions: Vec<Value> = keys.chars().flat_map(stroke).collect();
        self.post("/actions", &json!({"actions": [{"type": "key", "id": "keys", "actions": actions}]}));
    }

    /// A command of Chromium's own developer tools.
    pub fn tool(&self, command: &str, parameters: Value) -> Value {
        self.post("/goog/cdp/execute", &json!({"cmd": command, "params": parameters}))
    }

    /// Messages of the page's console: errors and refusals.
    pub fn console(&self) -> Vec<String> {
        let log = self.post("/se/log", &json!({"type": "browser"}));
        let entries = log.as_array().cloned().unwrap_or_default();
        entries.iter().map(|entry| entry["message"].to_string()).collect()
    }

    fn post(&self, path: &str, body: &Value) -> Value {
        let url = format!("{}{path}", self.session);
        let mut answer = self.agent.post(&url).send_json(body).unwrap_or_else(|error| panic!("{url}: {error}"));
        let status = answer.status();
        let mut answer: Value = answer.body_mut().read_json().unwrap_or_else(|error| panic!("{url}: {error}"));
        assert!(status.is_success(), "{path}: {}", answer["value"]["message"]);
        answer["value"].take()
    }
}

impl Drop for Browser {
    fn drop(&mut self) {
        // Ends Chromium; chromedriver goes with the process below.
        let _ = self.agent.delete(&self.session).call();
        let _ = self.driver.kill();
        let _ = self.driver.wait();
    }
}

impl Browser {
    /// A script that every page runs before its own.
    pub fn before_pages(&self, script: &str) {
        self.tool("Page.addScriptToEvaluateOnNewDocument", json!({"source": script}));
    }

    /// Presses Tab until the element with this id has the focus, as a person without a pointer does.
    pub fn tab_to(&self, id: &str) {
        for _ in 0..60 {
            if self.value("document.activeElement.id") == json!(id) {
                return;
            }
            // The protocol's own code for Tab.
            self.keys("\u{e004}");
        }
        panic!("Tab never reaches {id}");
    }

    /// Waits for the one file that is downloaded next to those known, and returns it.
    pub fn download(&self, known: usize) -> std::path::PathBuf {
        let started = Instant::now();
        loop {
            let entries = std::fs::read_dir(self.downloads()).expect("a folder");
            let mut files: Vec<_> = entries.filter_map(|entry| Some(entry.ok()?.path())).collect();
            files.retain(|path| path.extension().is_some_and(|ending| ending == "json"));
            files.sort_by_key(|path| path.metadata().and_then(|metadata| metadata.modified()).ok());
            if files.len() > known {
                return files.pop().expect("a file");
            }
            assert!(started.elapsed() < PATIENCE, "nothing was downloaded");
            std::thread::sleep(Duration::from_millis(50));
        }
    }
}
