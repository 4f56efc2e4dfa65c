//! The browser part: takes what is typed, hands it on, puts the answer in its place. It decides nothing.

use std::cell::RefCell;
use std::rc::Rc;

use strikeline_design::catalogue::{FIELDS, field};
use strikeline_design::check::{self, Checked, Fault};
use strikeline_design::design::Design;
use strikeline_design::report::Answers;
use strikeline_design::{file, link, report, shipped};
use wasm_bindgen::JsCast;
use wasm_bindgen::prelude::*;
use web_sys::{
    Document, Element, Event, HtmlElement, HtmlInputElement, HtmlSelectElement, HtmlTextAreaElement, Window,
};

use crate::chart::Chart;
use crate::form;
use crate::number::fixed;
use crate::{further, results, sentences};

/// Where the last design is kept in the browser.
const KEPT: &str = "strikeline.design";
/// Where the last design without a fault is kept.
const SOUND: &str = "strikeline.sound";
/// How many steps back are kept.
const MOST_STEPS: usize = 200;

struct Page {
    window: Window,
    document: Document,
    design: Design,
    before: Vec<Design>,
    after: Vec<Design>,
    charts: Vec<Chart>,
    further_charts: Vec<Chart>,
    checked: Option<Checked>,
    answers: Option<Answers>,
    /// Draws what stands below the results, once the results are on the screen.
    later: Option<js_sys::Function>,
    /// Whether that is waited for.
    due: bool,
    /// A link was opened: one's own kept design is left alone; what is changed stands in the address.
    visiting: bool,
    /// The field typed into last: one step back for all that is typed into it.
    typing: Option<String>,
    /// The first computation after opening: nothing has been changed yet, so nothing is written.
    first: bool,
}

type Shared = Rc<RefCell<Page>>;

/// The report of a design file, as the batch command prints it; the message of a fault otherwise.
#[wasm_bindgen]
pub fn report_json(design: &str) -> String {
    match file::from_json(design) {
        Ok(design) => match check::check(&design) {
            Ok(checked) => {
                let answers = report::answer(&checked);
                let further = report::further(&checked, &answers);
                report::json(&design.name, &checked, &answers, &further, report::Extras::default())
                    .to_string()
            }
            Err(faults) => {
                faults.iter().map(|f| format!("{}: {}", f.key, f.message)).collect::<Vec<_>>().join("\n")
            }
        },
        Err(error) => error.to_string(),
    }
}

/// Starts the page.
pub fn start() {
    std::panic::set_hook(Box::new(|_| {
        if let Some(notice) =
            web_sys::window().and_then(|w| w.document()).and_then(|d| d.get_element_by_id("notice"))
        {
            notice.set_text_content(Some(
                "Something went wrong inside this page. Reload it; your design is kept.",
            ));
            notice.remove_attribute("hidden").ok();
        }
    }));
    let Some(window) = web_sys::window() else { return };
    let Some(document) = window.document() else { return };
    let page = Page {
        window,
        document,
        design: Design::demo(),
        before: Vec::new(),
        after: Vec::new(),
        charts: Vec::new(),
        further_charts: Vec::new(),
        checked: None,
        answers: None,
        later: None,
        due: false,
        visiting: false,
        typing: None,
        first: false,
    };
    let shared = Rc::new(RefCell::new(page));
    let weak = Rc::downgrade(&shared);
    let later = Closure::<dyn FnMut()>::new(move || {
        if let Some(shared) = weak.upgrade()
            && let Ok(mut page) = shared.try_borrow_mut()
        {
            page.draw_further();
        }
    });
    shared.borrow_mut().later = later.into_js_value().dyn_into().ok();
    shared.borrow_mut().open_first();
    listen(&shared);
}

impl Page {
    fn element(&self, id: &str) -> Option<Element> {
        self.document.get_element_by_id(id)
    }

    fn notice(&self, text: &str) {
        if let Some(notice) = self.element("notice") {
            notice.set_text_content(Some(text));
            if text.is_empty() {
                notice.set_attribute("hidden", "").ok();
            } else {
                notice.remove_attribute("hidden").ok();
            }
        }
    }

    /// A link's design, else the kept one, else the example.
    fn open_first(&mut self) {
        let fragment = self.window.location().hash().unwrap_or_default();
        match self.stored(KEPT) {
            Some(Ok(design)) => self.design = design,
            Some(Err(error)) => self.notice(&format!("The design kept in this browser cannot be read: {error}. It is left as it is until you change something.")),
            None => {}
        }
        // The last sound design gives the result to show while the kept one has faults.
        if check::check(&self.design).is_err()
            && let Some(Ok(sound)) = self.stored(SOUND)
            && let Ok(checked) = check::check(&sound)
        {
            self.checked = Some(checked);
            self.draw();
        }
        self.first = true;
        self.open_fragment(&fragment);
        self.show_form();
        self.compute();
    }

    /// Opens the design of a fragment, or says in a sentence why not.
    fn open_fragment(&mut self, fragment: &str) -> bool {
        if fragment.len() < 2 {
            return false;
        }
        match link::decode(fragment) {
            Ok(design) if design == self.design => false,
            Ok(design) => {
                self.before.push(std::mem::replace(&mut self.design, design));
                self.after.clear();
                self.visiting = true;
                self.notice("Opened from a link. Your own design stays kept in this browser; what you change here stands in the address, and Undo goes back.");
                true
            }
            Err(link::LinkError::NotALink) => false,
            Err(error) => {
                self.notice(&format!("The link was not opened: {error}. Your own design is unchanged."));
                false
            }
        }
    }

    /// A design kept in the browser.
    fn stored(&self, key: &str) -> Option<Result<Design, file::FileError>> {
        let text = self.storage().and_then(|s| s.get_item(key).ok().flatten())?;
        Some(file::from_json(&text))
    }

    fn storage(&self) -> Option<web_sys::Storage> {
        self.window.local_storage().ok().flatten()
    }

    /// Keeps the design and puts its link into the address.
    fn keep(&self) {
        let fragment = link::encode(&self.design);
        if let Ok(history) = self.window.history() {
            history.replace_state_with_url(&JsValue::NULL, "", Some(&fragment)).ok();
        }
        if self.visiting || self.first {
            return;
        }
        if check::check(&self.design).is_ok()
            && let Some(storage) = self.storage()
        {
            // Where this fails the next line says so.
            storage.set_item(SOUND, &file::to_json(&self.design)).ok();
        }
        let kept = self.storage().is_some_and(|s| s.set_item(KEPT, &file::to_json(&self.design)).is_ok());
        if let Some(note) = self.element("kept") {
            note.set_text_content(Some(if kept {
                ""
            } else {
                "This browser does not keep designs; save a file."
            }));
        }
    }

    fn show_form(&self) {
        if let Some(aside) = self.element("form") {
            aside.set_inner_html(&form::form(&self.design));
        }
        if let Some(name) = self.element("name").and_then(|e| e.dyn_into::<HtmlInputElement>().ok()) {
            name.set_value(&self.design.name);
        }
    }

    /// From what is entered to the drawn page, and how long it took.
    fn compute(&mut self) {
        let clock = self.window.performance();
        let begin = clock.as_ref().map_or(0.0, web_sys::Performance::now);
        let checked = check::check(&self.design);
        let faults = checked.as_ref().err().cloned().unwrap_or_default();
        self.mark(&faults);
        if let Ok(checked) = checked {
            self.checked = Some(checked);
            self.draw();
        }
        let stale = !faults.is_empty();
        if let Some(main) = self.element("results") {
            main.set_class_name(if stale { "stale" } else { "" });
        }
        if let Some(note) = self.element("stale") {
            note.set_text_content(Some(&sentences::stale(faults.len(), self.checked.is_some())));
        }
        if self.checked.is_none()
            && let Some(main) = self.element("results")
        {
            main.set_text_content(Some("There is no result yet."));
        }
        self.keep();
        self.first = false;
        if let Some(clock) = clock {
            // Reading a size makes the browser lay the new page out before the clock is read.
            let height = self.document.body().map_or(0, |b| b.offset_height());
            let took = clock.now() - begin;
            if let Some(body) = self.document.body() {
                body.set_attribute("data-chain-ms", &fixed(took, 2)).ok();
                body.set_attribute("data-height", &height.to_string()).ok();
            }
        }
    }

    fn draw(&mut self) {
        let Some(checked) = &self.checked else { return };
        let Some(main) = self.element("results") else { return };
        let clock = self.window.performance();
        let begin = clock.as_ref().map_or(0.0, web_sys::Performance::now);
        let answers = report::answer(checked);
        if let Some(clock) = clock {
            main.set_attribute("data-answers-ms", &fixed(clock.now() - begin, 2)).ok();
        }
        let width = f64::from(main.client_width().max(260));
        let drawn = results::results(checked, &answers, width);
        // What was folded stays folded.
        let folded = self.element("events").is_some_and(|e| !e.has_attribute("open"));
        main.set_inner_html(&drawn.markup);
        if folded && let Some(events) = self.element("events") {
            events.remove_attribute("open").ok();
        }
        if let Some(brief) = self.element("brief") {
            let said = sentences::verdict(&checked.nominal, &answers);
            brief.set_text_content(Some(&sentences::brief(&said, &answers)));
            brief.set_class_name(said.tone);
        }
        self.charts = drawn.charts;
        self.answers = Some(answers);
        if !self.due
            && let Some(later) = &self.later
        {
            self.due = self.window.set_timeout_with_callback_and_timeout_and_arguments_0(later, 0).is_ok();
        }
    }

    /// What stands below the results.
    fn draw_further(&mut self) {
        self.due = false;
        let (Some(checked), Some(answers)) = (&self.checked, &self.answers) else { return };
        let Some(place) = self.element("further") else { return };
        let clock = self.window.performance();
        let begin = clock.as_ref().map_or(0.0, web_sys::Performance::now);
        let further = report::further(checked, answers);
        let width = f64::from(place.client_width().max(260));
        let drawn = further::further(checked, answers, &further, width);
        place.set_inner_html(&drawn.markup);
        self.further_charts = drawn.charts;
        if let Some(clock) = clock {
            let took = clock.now() - begin;
            place.set_attribute("data-ms", &fixed(took, 2)).ok();
        }
    }

    /// Faults at their fields, and which fields matter.
    fn mark(&self, faults: &[Fault]) {
        for f in FIELDS {
            let id = form::input_id(f.key);
            let Some(input) = self.element(&id) else { continue };
            let Some(row) = input.parent_element() else { continue };
            if self.design.matters(f) {
                row.remove_attribute("hidden").ok();
            } else {
                row.set_attribute("hidden", "").ok();
            }
            let Some(place) = self.element(&format!("{id}-fault")) else { continue };
            match faults.iter().find(|fault| fault.key == f.key) {
                Some(fault) => {
                    place.set_text_content(Some(&fault.message));
                    place.remove_attribute("hidden").ok();
                    input.set_attribute("aria-invalid", "true").ok();
                    // A fault must not hide in a folded part.
                    if let Ok(Some(folded)) = input.closest("details") {
                        folded.set_attribute("open", "").ok();
                    }
                }
                None => {
                    place.set_attribute("hidden", "").ok();
                    input.remove_attribute("aria-invalid").ok();
                }
            }
        }
    }

    fn remember(&mut self) {
        self.before.push(self.design.clone());
        if self.before.len() > MOST_STEPS {
            self.before.remove(0);
        }
        self.after.clear();
        self.typing = None;
    }

    fn typed(&mut self, key: &str, text: &str) {
        if field(key).is_none() || self.design.get(key) == text {
            return;
        }
        if self.typing.as_deref() != Some(key) {
            self.remember();
            self.typing = Some(key.to_string());
        }
        if !self.design.set(key, text) {
            self.notice("That text is too long to keep.");
        }
        self.compute();
    }

    fn replace(&mut self, design: Design) {
        self.remember();
        self.visiting = false;
        self.design = design;
        self.show_form();
        self.compute();
    }

    /// The board's fields from a class; one step back takes it away again.
    fn start_from(&mut self, key: &str) {
        let mut design = self.design.clone();
        let Some(class) = shipped::board_classes().iter().find(|c| c.key == key) else { return };
        if shipped::apply(&mut design, key) {
            self.replace(design);
            self.notice(&format!("{}: {} Undo takes it back.", class.label, class.about));
            if let Some(list) = self.element(form::CLASS).and_then(|e| e.dyn_into::<HtmlElement>().ok()) {
                list.focus().ok();
            }
        }
    }

    fn step(&mut self, back: bool) {
        let from = if back { self.before.pop() } else { self.after.pop() };
        let Some(design) = from else { return };
        let now = std::mem::replace(&mut self.design, design);
        if back {
            self.after.push(now);
        } else {
            self.before.push(now);
        }
        self.typing = None;
        self.notice("");
        self.show_form();
        self.compute();
    }

    fn save_file(&self) -> Result<(), JsValue> {
        let parts = js_sys::Array::of1(&JsValue::from_str(&file::to_json(&self.design)));
        let blob = web_sys::Blob::new_with_str_sequence(&parts)?;
        let url = web_sys::Url::create_object_url_with_blob(&blob)?;
        let anchor: web_sys::HtmlAnchorElement = self.document.create_element("a")?.dyn_into()?;
        anchor.set_href(&url);
        anchor.set_download("design.strikeline.json");
        anchor.click();
        web_sys::Url::revoke_object_url(&url)
    }

    fn copy_link(&self) {
        let href = self.window.location().href().unwrap_or_default();
        let clipboard = self.window.navigator().clipboard();
        let say = |text: &'static str| {
            let document = self.document.clone();
            Closure::<dyn FnMut(JsValue)>::new(move |_| {
                if let Some(notice) = document.get_element_by_id("notice") {
                    notice.set_text_content(Some(text));
                    notice.remove_attribute("hidden").ok();
                }
            })
        };
        let copied = say("The link is copied. It holds the whole design and sends nothing anywhere.");
        let refused = say("This browser does not let the page copy; take the link from the address line.");
        let _ = clipboard.write_text(&href).then2(&copied, &refused);
        // They are called once, whenever the browser has decided.
        copied.forget();
        refused.forget();
    }

    /// The reading of a chart at a place: the cursor and the words under it.
    fn chart(&self, id: &str) -> Option<&Chart> {
        self.charts.iter().chain(&self.further_charts).find(|c| c.id == id)
    }

    fn read(&self, svg: &Element, index: usize) {
        let Some(chart) = self.chart(&svg.id()) else { return };
        if chart.x.is_empty() {
            return;
        }
        let index = index.min(chart.x.len() - 1);
        let width = svg.get_attribute("width").and_then(|w| w.parse().ok()).unwrap_or(300.0);
        let x = chart.position(index, width);
        if let Ok(Some(cursor)) = svg.query_selector(".cursor") {
            cursor.set_attribute("visibility", "visible").ok();
            cursor.set_attribute("transform", &format!("translate({x:.1} 0)")).ok();
        }
        svg.set_attribute("data-index", &index.to_string()).ok();
        if let Some(reading) = self.element(&format!("{}-reading", chart.id)) {
            reading.set_text_content(Some(&chart.reading(index)));
        }
    }
}

fn on(target: &web_sys::EventTarget, kind: &str, shared: &Shared, act: impl Fn(&mut Page, &Event) + 'static) {
    let shared = Rc::clone(shared);
    let closure = Closure::<dyn FnMut(Event)>::new(move |event: Event| {
        // An event inside an event (a download's click) is not ours.
        if let Ok(mut page) = shared.try_borrow_mut() {
            act(&mut page, &event);
        }
    });
    target.add_event_listener_with_callback(kind, closure.as_ref().unchecked_ref()).ok();
    // Listens as long as the page lives.
    closure.forget();
}

fn text_of(element: &Element) -> Option<String> {
    if let Some(input) = element.dyn_ref::<HtmlInputElement>() {
        return Some(input.value());
    }
    if let Some(area) = element.dyn_ref::<HtmlTextAreaElement>() {
        return Some(area.value());
    }
    element.dyn_ref::<HtmlSelectElement>().map(HtmlSelectElement::value)
}

fn target(event: &Event) -> Option<Element> {
    event.target().and_then(|t| t.dyn_into::<Element>().ok())
}

fn listen(shared: &Shared) {
    let (document, window) = {
        let page = shared.borrow();
        (page.document.clone(), page.window.clone())
    };
    if let Some(form) = document.get_element_by_id("form") {
        on(&form, "input", shared, |page, event| {
            if let Some(element) = target(event)
                && let (Some(key), Some(text)) = (element.get_attribute("data-key"), text_of(&element))
            {
                page.typed(&key, &text);
            }
        });
    }
    if let Some(form) = document.get_element_by_id("form") {
        on(&form, "change", shared, |page, event| {
            if let Some(list) = target(event).filter(|e| e.id() == form::CLASS)
                && let Some(key) = text_of(&list)
            {
                page.start_from(&key);
            }
        });
    }
    if let Some(name) = document.get_element_by_id("name") {
        on(&name, "input", shared, |page, event| {
            if let Some(text) = target(event).as_ref().and_then(text_of) {
                page.remember();
                page.design.name = text.chars().take(200).collect();
                page.keep();
            }
        });
    }
    let click = |id: &str, act: fn(&mut Page)| {
        if let Some(button) = document.get_element_by_id(id) {
            on(&button, "click", shared, move |page, _| act(page));
        }
    };
    click("undo", |page| page.step(true));
    click("redo", |page| page.step(false));
    click("copy", |page| page.copy_link());
    click("print", |page| {
        page.window.print().ok();
    });
    click("example", |page| page.replace(Design::demo()));
    click("save", |page| {
        if page.save_file().is_err() {
            page.notice("This browser does not let a file be saved; copy the link instead.");
        }
    });
    click("open", |page| {
        if let Some(input) = page.element("file").and_then(|e| e.dyn_into::<HtmlElement>().ok()) {
            input.click();
        }
    });
    if let Some(input) = document.get_element_by_id("file") {
        let shared_for_file = Rc::clone(shared);
        on(&input, "change", shared, move |_, event| {
            let chosen = target(event).and_then(|e| e.dyn_into::<HtmlInputElement>().ok());
            if let Some(input) = chosen {
                if let Some(file) = input.files().and_then(|files| files.get(0)) {
                    read_file(&shared_for_file, &file);
                }
                input.set_value("");
            }
        });
    }
    on(&document, "dragover", shared, |_, event| event.prevent_default());
    let shared_for_drop = Rc::clone(shared);
    on(&document, "drop", shared, move |_, event| {
        event.prevent_default();
        let files = event
            .dyn_ref::<web_sys::DragEvent>()
            .and_then(web_sys::DragEvent::data_transfer)
            .and_then(|d| d.files());
        if let Some(file) = files.and_then(|files| files.get(0)) {
            read_file(&shared_for_drop, &file);
        }
    });
    on(&window, "hashchange", shared, |page, _| {
        let fragment = page.window.location().hash().unwrap_or_default();
        if page.open_fragment(&fragment) {
            page.show_form();
            page.compute();
        }
    });
    on(&window, "resize", shared, |page, _| page.draw());
    if let Some(main) = document.get_element_by_id("main") {
        on(&main, "pointermove", shared, |page, event| {
            let Some(svg) = target(event).and_then(|e| e.closest("svg.chart").ok().flatten()) else { return };
            let Some(pointer) = event.dyn_ref::<web_sys::MouseEvent>() else { return };
            let left = svg.get_bounding_client_rect().left();
            let width = svg.get_attribute("width").and_then(|w| w.parse().ok()).unwrap_or(300.0);
            if let Some(chart) = page.chart(&svg.id()) {
                let index = chart.nearest(f64::from(pointer.client_x()) - left, width);
                page.read(&svg, index);
            }
        });
        on(&main, "keydown", shared, |page, event| {
            let Some(key) = event.dyn_ref::<web_sys::KeyboardEvent>().map(web_sys::KeyboardEvent::key) else {
                return;
            };
            let Some(svg) = target(event).and_then(|e| e.closest("svg.chart").ok().flatten()) else { return };
            let index: usize = svg.get_attribute("data-index").and_then(|i| i.parse().ok()).unwrap_or(0);
            let next = match key.as_str() {
                "ArrowRight" => index.saturating_add(1),
                "ArrowLeft" => index.saturating_sub(1),
                "Home" => 0,
                "End" => usize::MAX,
                _ => return,
            };
            event.prevent_default();
            page.read(&svg, next);
        });
    }
}

fn read_file(shared: &Shared, chosen: &web_sys::File) {
    let Ok(reader) = web_sys::FileReader::new() else { return };
    let shared = Rc::clone(shared);
    let done = reader.clone();
    let closure = Closure::once_into_js(move || {
        let text = done.result().ok().and_then(|v| v.as_string()).unwrap_or_default();
        if let Ok(mut page) = shared.try_borrow_mut() {
            match file::from_json(&text) {
                Ok(design) => {
                    page.notice("");
                    page.replace(design);
                }
                Err(error) => {
                    page.notice(&format!("The file was not opened: {error}. Your own design is unchanged."))
                }
            }
        }
    });
    let failed = Closure::<dyn FnMut(Event)>::new(|_| {
        if let Some(notice) =
            web_sys::window().and_then(|w| w.document()).and_then(|d| d.get_element_by_id("notice"))
        {
            notice.set_text_content(Some("The file could not be read. Your own design is unchanged."));
            notice.remove_attribute("hidden").ok();
        }
    });
    reader.set_onerror(Some(failed.as_ref().unchecked_ref()));
    failed.forget();
    reader.set_onload(Some(closure.unchecked_ref()));
    // What is too large is refused by its size, before it is read.
    if chosen.size() > file::LARGEST as f64 {
        if let Some(notice) =
            web_sys::window().and_then(|w| w.document()).and_then(|d| d.get_element_by_id("notice"))
        {
            notice.set_text_content(Some(
                "The file was not opened: it is larger than any design. Your own design is unchanged.",
            ));
            notice.remove_attribute("hidden").ok();
        }
        return;
    }
    reader.read_as_text(chosen).ok();
}
