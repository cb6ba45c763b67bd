//! A picture as SVG text. Everything that stands in it goes through here: numbers to a tenth, text escaped.

use std::fmt::Write;

use crate::terminal::plain;

/// Average width of a character over the height of the letters, a little more than the widest of the page's fonts needs.
const CHARACTER: f64 = 0.58;

/// Where a text is held.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Anchor {
    Start,
    Middle,
    End,
}

/// A finished picture.
#[derive(Clone, Debug, PartialEq)]
pub struct Picture {
    /// Name of its file.
    pub name: String,
    /// The element, without a style of its own.
    pub svg: String,
}

/// A picture in the making.
#[derive(Clone, Debug)]
pub struct Canvas {
    width: f64,
    height: f64,
    body: String,
    taken: Vec<Box>,
}

/// A box that text fills.
#[derive(Clone, Copy, Debug, PartialEq)]
struct Box {
    left: f64,
    top: f64,
    right: f64,
    bottom: f64,
}

impl Box {
    fn meets(&self, other: &Box) -> bool {
        self.left < other.right && other.left < self.right && self.top < other.bottom && other.top < self.bottom
    }
}

/// Text of 12 units' height at a place.
#[derive(Clone, Copy, Debug)]
pub struct Label<'a> {
    pub text: &'a str,
    pub class: &'static str,
    pub x: f64,
    pub y: f64,
    pub anchor: Anchor,
}

impl Canvas {
    pub fn new(width: f64, height: f64) -> Canvas {
        Canvas { width, height, body: String::new(), taken: Vec::new() }
    }

    pub fn line(&mut self, class: &str, (x1, y1): (f64, f64), (x2, y2): (f64, f64)) {
        let (x1, y1, x2, y2) = (tenths(x1), tenths(y1), tenths(x2), tenths(y2));
        self.add(format_args!(r#"<line class="{class}" x1="{x1}" y1="{y1}" x2="{x2}" y2="{y2}"/>"#));
    }

    pub fn polyline(&mut self, class: &str, points: &[(f64, f64)]) {
        self.path(class, points, false);
    }

    pub fn polygon(&mut self, class: &str, points: &[(f64, f64)]) {
        self.path(class, points, true);
    }

    fn path(&mut self, class: &str, points: &[(f64, f64)], closed: bool) {
        if points.len() < 2 {
            return;
        }
        let mut data = String::new();
        for (k, (x, y)) in points.iter().enumerate() {
            let command = if k == 0 { 'M' } else { ' ' };
            let _ = write!(data, "{command}{} {}", tenths(*x), tenths(*y));
        }
        let end = if closed { "Z" } else { "" };
        self.add(format_args!(r#"<path class="{class}" d="{data}{end}"/>"#));
    }

    pub fn rectangle(&mut self, class: &str, x: f64, y: f64, width: f64, height: f64) {
        let (x, y, width, height) = (tenths(x), tenths(y), tenths(width), tenths(height));
        self.add(format_args!(r#"<rect class="{class}" x="{x}" y="{y}" width="{width}" height="{height}"/>"#));
    }

    pub fn circle(&mut self, class: &str, (x, y): (f64, f64), radius: f64) {
        let (x, y, radius) = (tenths(x), tenths(y), tenths(radius));
        self.add(format_args!(r#"<circle class="{class}" cx="{x}" cy="{y}" r="{radius}"/>"#));
    }

    /// A mark of one of four shapes, so that colour is not all that tells lines apart.
    pub fn mark(&mut self, class: &str, shape: usize, (x, y): (f64, f64), size: f64) {
        match shape % 4 {
            0 => self.circle(class, (x, y), size),
            1 => self.rectangle(class, x - size, y - size, 2.0 * size, 2.0 * size),
            2 => {
                let points = [(x, y - 1.3 * size), (x + 1.2 * size, y + size), (x - 1.2 * size, y + size)];
                self.polygon(class, &points);
            }
            _ => {
                let reach = 1.4 * size;
                self.polygon(class, &[(x, y - reach), (x + reach, y), (x, y + reach), (x - reach, y)]);
            }
        }
    }

    /// Text at its place, whatever is there.
    pub fn label(&mut self, label: Label<'_>) {
        self.taken.push(room(&label));
        let Label { text, class, x, y, anchor } = label;
        let anchor = match anchor {
            Anchor::Start => "",
            Anchor::Middle => r#" text-anchor="middle""#,
            Anchor::End => r#" text-anchor="end""#,
        };
        let (x, y, text) = (tenths(x), tenths(y), escaped(text));
        self.add(format_args!(r#"<text class="{class}" x="{x}" y="{y}"{anchor}>{text}</text>"#));
    }

    /// Text at the first of `places` that is free and inside the picture; false where none is.
    pub fn label_where_free(&mut self, label: Label<'_>, places: &[(f64, f64, Anchor)]) -> bool {
        for &(x, y, anchor) in places {
            let label = Label { x, y, anchor, ..label };
            if self.is_free(&label) {
                self.label(label);
                return true;
            }
        }
        false
    }

    fn is_free(&self, label: &Label<'_>) -> bool {
        let room = room(label);
        let inside = room.left >= 0.0 && room.top >= 0.0 && room.right <= self.width && room.bottom <= self.height;
        inside && self.taken.iter().all(|taken| !taken.meets(&room))
    }

    pub fn open_group(&mut self, class: &str) {
        self.add(format_args!(r#"<g class="{class}">"#));
    }

    pub fn close_group(&mut self) {
        self.add(format_args!("</g>"));
    }

    fn add(&mut self, element: std::fmt::Arguments<'_>) {
        let _ = self.body.write_fmt(element);
        self.body.push('\n');
    }

    /// The picture, told to who cannot see it as `description`.
    pub fn finish(self, name: String, class: &str, description: &str) -> Picture {
        let (width, height, body) = (tenths(self.width), tenths(self.height), self.body);
        let description = escaped(description);
        let svg = format!(
            r#"<svg class="picture {class}" viewBox="0 0 {width} {height}" role="img" aria-label="{description}">{body}</svg>"#
        );
        Picture { name, svg }
    }
}

impl Picture {
    /// The picture as a file that stands alone, in light colours.
    pub fn file(&self, style: &str) -> String {
        let head = r#"<svg xmlns="http://www.w3.org/2000/svg" "#;
        let rest = self.svg.strip_prefix("<svg ").unwrap_or(&self.svg);
        let (opening, body) = rest.split_once('>').unwrap_or((rest, ""));
        format!("{head}{opening}><style>{style}</style>{body}\n")
    }
}

/// Estimated width of a text at 12 units' height.
pub fn text_width(text: &str) -> f64 {
    12.0 * CHARACTER * text.chars().count() as f64
}

fn room(label: &Label<'_>) -> Box {
    let width = text_width(label.text);
    let left = match label.anchor {
        Anchor::Start => label.x,
        Anchor::Middle => label.x - width / 2.0,
        Anchor::End => label.x - width,
    };
    Box { left: left - 1.0, top: label.y - 10.5, right: left + width + 1.0, bottom: label.y + 3.5 }
}

/// A coordinate to a tenth, in few characters.
fn tenths(value: f64) -> String {
    let text = format!("{value:.1}");
    let short = text.strip_suffix(".0").unwrap_or(&text);
    if short == "-0" { "0".to_owned() } else { short.to_owned() }
}

/// Text that is safe between tags and in attributes, its hidden signs written out.
pub fn escaped(text: &str) -> String {
    let mut out = String::with_capacity(text.len());
    for c in plain(text).chars() {
        match c {
            '&' => out.push_str("&amp;"),
            '<' => out.push_str("&lt;"),
            '>' => out.push_str("&gt;"),
            '"' => out.push_str("&quot;"),
            '\'' => out.push_str("&#39;"),
            c => out.push(c),
        }
    }
    out
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn text_cannot_leave_its_place() {
        assert_eq!(escaped("</script>\"'&\u{202e}"), "&lt;/script&gt;&quot;&#39;&amp;\\u{202e}");
    }

    #[test]
    fn a_label_goes_where_nothing_stands() {
        let mut canvas = Canvas::new(100.0, 100.0);
        let label = Label { text: "10 V", class: "t", x: 0.0, y: 0.0, anchor: Anchor::Start };
        let places = [(10.0, 50.0, Anchor::Start), (10.0, 70.0, Anchor::Start)];
        assert!(canvas.label_where_free(label, &places));
        assert!(canvas.label_where_free(label, &places));
        assert!(!canvas.label_where_free(label, &places));
        assert!(!canvas.label_where_free(label, &[(90.0, 20.0, Anchor::Start)]), "it would leave the picture");
    }
}
