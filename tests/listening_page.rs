//! The listener's page in a real browser, opened from a file.

#[path = "support/browser.rs"]
mod browser;
mod support;

use browser::Browser;

#[test]
fn smoke() {
    let page = std::env::var("PAGE").unwrap();
    let browser = Browser::start();
    let shots = std::path::PathBuf::from(std::env::var("SHOTS").unwrap());
    browser.open(std::path::Path::new(&page));
    let shot = |name: &str| {
        use base64::Engine;
        for (width, scheme) in [(360, "light"), (360, "dark"), (800, "light"), (1400, "dark"), (1400, "light")] {
            browser.tool(
                "Emulation.setEmulatedMedia",
                serde_json::json!({"features": [{"name": "prefers-color-scheme", "value": scheme}]}),
            );
            browser.tool(
                "Emulation.setDeviceMetricsOverride",
                serde_json::json!({"width": width, "height": 900, "deviceScaleFactor": 1, "mobile": false}),
            );
            let wide = browser.value("document.documentElement.scrollWidth");
            if wide.as_i64().unwrap() > width {
                println!("{name} {width}: scrolls sideways, {wide}");
            }
            let image = browser.tool("Page.captureScreenshot", serde_json::json!({"captureBeyondViewport": true, "clip": {"x":0,"y":0,"width":width,"height": browser.value("Math.max(900,document.documentElement.scrollHeight)"),"scale":1}}));
            let bytes = base64::engine::general_purpose::STANDARD.decode(image["data"].as_str().unwrap()).unwrap();
            std::fs::write(shots.join(format!("{name}-{width}-{scheme}.png")), bytes).unwrap();
        }
    };
    shot("start");
    browser.click("#begin");
    browser.wait("!document.getElementById('deck').hidden");
    std::thread::sleep(std::time::Duration::from_millis(700));
    browser.keys("MK2");
    shot("beside");
    browser.click("#way-which");
    shot("which");
    browser.click("#run-begin");
    shot("run");
    for trial in 0..16 {
        std::thread::sleep(std::time::Duration::from_millis(60));
        browser.keys("X");
        browser.keys(if trial % 2 == 0 { "1" } else { "2" });
        browser.keys("\n");
    }
    shot("result");
    println!("{:?}", browser.console());
    browser.click("#save");
    std::thread::sleep(std::time::Duration::from_millis(500));
    for f in std::fs::read_dir(browser.downloads()).unwrap() {
        let p = f.unwrap().path();
        println!("{p:?}");
        std::fs::copy(&p, shots.join("answers.json")).unwrap();
    }
}
