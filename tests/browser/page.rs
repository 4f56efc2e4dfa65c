//! The page in a real Chromium, as its user meets it.
//!
//! `cargo xtask test` serves the built page and tells its address in `STRIKELINE_PAGE`.

use serde_json::json;
use strikeline_design::check::check;
use strikeline_design::design::Design;
use strikeline_design::{file, link, report};
use strikeline_tests::browser::{Browser, Scheme};

fn report_of(design: &Design) -> String {
    let checked = check(design).expect("sound");
    let answers = report::answer(&checked);
    let further = report::further(&checked, &answers);
    report::json(&design.name, &checked, &answers, &further, report::Extras::default()).to_string()
}

async fn whole_path(browser: &Browser) {
    // It opens on the worked example, with a verdict.
    browser.open("").await;
    assert!(browser.text(".word").await.contains("Borderline"));
    assert_eq!(browser.text(".facts .value").await, "353");

    // A change gives a new verdict at once.
    browser.fill("board.pairs", "2").await;
    assert!(
        browser.text(".word").await.contains("Holds"),
        "two pairs hold: {}",
        browser.text(".sentence").await
    );

    // What is wrong stands at its field; the last good result stays, marked.
    browser.fill("leads.load_section", "0.75 m").await;
    let fault = browser.text("#f-leads-load_section-fault").await;
    assert!(fault.contains("0.75 m is a length"), "{fault}");
    assert!(browser.text("#stale").await.contains("last good result"));
    assert!(browser.text(".word").await.contains("Holds"));
    let invalid = browser
        .script("return document.getElementById('f-leads-load_section').getAttribute('aria-invalid')")
        .await;
    assert_eq!(invalid, json!("true"));
    browser.fill("leads.load_section", "AWG 18").await;
    assert_eq!(browser.text("#stale").await, "");

    // Undo takes back all that was typed into the field.
    browser.script("document.getElementById('undo').click()").await;
    let back = browser.script("return document.getElementById('f-leads-load_section').value").await;
    assert_eq!(back, json!("0.75 mm²"));
}

/// Hazards, wiring, margins, map, time and current, charging: below the results, a moment later.
async fn safety(browser: &Browser) {
    browser.open("").await;
    browser.until("document.getElementById('charging')").await;
    let ids =
        browser.script("return [...document.querySelectorAll('#further h2')].map(h => h.id).join(' ')").await;
    assert_eq!(ids, json!("hazards wiring margins time-and-current charging"));
    let checks = browser.text("#further p").await;
    assert!(checks.contains("checks were made"), "{checks}");

    // Without a board it is not built so, whatever the current alone would do.
    browser.fill("board.arrangement", "no_board").await;
    assert!(browser.text(".word").await.contains("Fails"));
    let said = browser.text(".sentence").await;
    assert!(said.starts_with("Do not build it so"), "{said}");
    browser.until("document.querySelectorAll('.hazards .stop').length >= 2").await;
    browser.script("document.getElementById('undo').click()").await;
    assert!(browser.text(".word").await.contains("Borderline"));

    // A class of board fills the board's fields; one step back takes it away again.
    browser
        .script("const list = document.getElementById('board-class'); list.value = 'three_level'; list.dispatchEvent(new Event('change', { bubbles: true }))")
        .await;
    let second = "return document.getElementById('f-board-stage2').value";
    let filled = browser.script(second).await;
    assert!(filled.as_str().is_some_and(|t| t.ends_with("V")), "{filled}");
    assert!(browser.text("#notice").await.contains("Undo takes it back"));
    browser.script("document.getElementById('undo').click()").await;
    assert_eq!(browser.script(second).await, json!(""));
}

async fn links(browser: &Browser) {
    // The address holds the design: opened elsewhere it gives the same.
    let mut design = Design::demo();
    design.set("cell.capacity", "2,8 Ah");
    design.set("load.strike", "3.45 V");
    browser.open(&link::encode(&design)).await;
    let capacity = browser.script("return document.getElementById('f-cell-capacity').value").await;
    assert_eq!(capacity, json!("2,8 Ah"));
    let address = browser.script("return location.hash").await;
    assert_eq!(address, json!(link::encode(&design)));

    // A damaged, newer or hostile link is one sentence, and no script of it runs.
    for (bad, said) in [("#1.AAAA", "damaged"), ("#9.abc", "version 9")] {
        browser.open(bad).await;
        let notice = browser.text("#notice").await;
        assert!(notice.contains(said) && notice.contains("unchanged"), "{bad}: {notice}");
        assert!(!browser.text(".word").await.is_empty());
    }
    let mut hostile = Design::demo();
    hostile.name = "<img src=x onerror=\"window.broken=1\">".into();
    hostile.set("cell.capacity", "\"><img src=x onerror=\"window.broken=1\">");
    browser.open(&link::encode(&hostile)).await;
    assert!(browser.text("#f-cell-capacity-fault").await.contains("does not begin with a number"));
    assert_eq!(browser.script("return window.broken === undefined").await, json!(true));
}

async fn same_report(browser: &Browser) {
    browser.open("").await;
    let mut designs = vec![Design::demo()];
    for (key, text) in [
        ("use.ambient", "-10 °C"),
        ("load.law", "power"),
        ("load.surge", "1.5 A"),
        ("load.esr", "20 mΩ"),
        ("second.fitted", "yes"),
        ("board.arrangement", "no_board"),
        ("cell.chemistry", "lfp_cylinder"),
        ("leads.fuse", "quick"),
        ("load.known", "estimated"),
    ] {
        let mut design = designs.last().expect("one").clone();
        design.set(key, text);
        designs.push(design);
    }
    for (k, design) in designs.iter().enumerate() {
        let script = format!("return window.wasmBindings.report_json({})", json!(file::to_json(design)));
        let page = browser.script(&script).await;
        assert_eq!(page, json!(report_of(design)), "design {k}: page and native differ");
    }
    println!("   native and page: the same report to the last bit for {} designs", designs.len());
}

/// The median of a list of times.
fn median(times: &mut [f64]) -> f64 {
    times.sort_by(f64::total_cmp);
    times[times.len() / 2]
}

/// What a loop of plain arithmetic takes in the browser on the machine that the limit was set on, quiet, in ms.
const YARDSTICK: f64 = 200.0;

/// How many times slower than that the machine is now; 1 at least, 2 at most.
async fn slower(browser: &Browser) -> f64 {
    let script = "const begin = performance.now(); let x = 1; for (let k = 0; k < 2e7; k++) { x = Math.sqrt(x + k) * 1.000001 } window.kept = x; return performance.now() - begin";
    let mut times = Vec::new();
    for _ in 0..5 {
        times.push(browser.script(script).await.as_f64().expect("a time"));
    }
    let now = median(&mut times);
    println!("   a loop of arithmetic takes {now:.0} ms in the browser, {YARDSTICK} ms on a quiet machine");
    (now / YARDSTICK).clamp(1.0, 2.0)
}

async fn quick(browser: &Browser) {
    browser.open("").await;
    // A machine that is slow at everything is slow at this too: the limit goes with it.
    let limit = 50.0 * slower(browser).await;
    let number = |v: serde_json::Value| v.as_str().and_then(|t| t.parse::<f64>().ok()).expect("a time");
    // Something else on the machine may take a round; all of them are printed, the quietest is held to the limit.
    let mut best = f64::INFINITY;
    for round in 1..=3 {
        let (mut times, mut answers) = (Vec::new(), Vec::new());
        for k in 0..21 {
            browser.fill("cell.capacity", &format!("1.{k:02} Ah")).await;
            times.push(number(browser.script("return document.body.getAttribute('data-chain-ms')").await));
            answers.push(number(
                browser.script("return document.getElementById('results').dataset.answersMs").await,
            ));
        }
        let (all, computed) = (median(&mut times), median(&mut answers));
        println!(
            "   from a changed field to the drawn page, round {round}: median {all:.1} ms, slowest {:.1} ms; {computed:.1} ms of it the answers",
            times[times.len() - 1]
        );
        best = best.min(all);
        if best <= limit {
            return;
        }
    }
    panic!("median {best} ms at best; at most {limit:.0} ms on this machine now");
}

async fn narrow(browser: &Browser) {
    browser.open("").await;
    for (width, scheme) in [(390, Scheme::Light), (320, Scheme::Dark), (1400, Scheme::Dark)] {
        browser.view(width, 900).await;
        browser.scheme(scheme).await;
        let over = browser.script("return [...document.querySelectorAll('main, aside, header, .part, figure, svg')].filter(e => e.getBoundingClientRect().right > innerWidth + 1).map(e => e.tagName + '.' + (e.getAttribute('class') ?? ''))").await;
        assert_eq!(over, json!([]), "{width} px: what stands out");
        let wide = browser.script("return document.documentElement.scrollWidth").await;
        assert_eq!(wide, json!(width), "{width} px: the page scrolls sideways");
    }
    browser.scheme(Scheme::Light).await;
}

async fn quiet(browser: &Browser) {
    browser.open("").await;
    browser.fill("use.press", "2 s").await;
    let foreign = browser
        .script("return performance.getEntriesByType('resource').map(e => e.name).filter(n => !n.startsWith(location.origin) && !n.startsWith('data:'))")
        .await;
    assert_eq!(foreign, json!([]), "a request left the page's own address");
    assert_eq!(browser.errors().await, Vec::<String>::new(), "the console showed errors in one of the parts");
    // And the console is heard: what is written to it comes back.
    browser.script("console.error('heard')").await;
    assert_eq!(browser.errors().await.len(), 1);
}

#[test]
fn page_in_a_browser() {
    let runtime = tokio::runtime::Builder::new_current_thread().enable_all().build().expect("a runtime");
    runtime.block_on(async {
        let browser = Browser::start().await;
        whole_path(&browser).await;
        safety(&browser).await;
        links(&browser).await;
        same_report(&browser).await;
        quick(&browser).await;
        narrow(&browser).await;
        quiet(&browser).await;
    });
}
