//! A small writer of SVG: lines, marks, words; looks come from classes alone.

use std::borrow::Cow;
use std::fmt::Write as _;

/// Shapes of marks: a series is known by its shape as well as by its colour.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Shape {
    /// A disc.
    Circle,
    /// A square on its corner.
    Diamond,
    /// A triangle that points up.
    Triangle,
    /// A triangle that points down.
    Drop,
    /// A square.
    Square,
}

/// Where a text stands from its point.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Anchor {
    /// To the right of it.
    Start,
    /// Around it.
    Middle,
    /// To the left of it.
    End,
}

/// The inside of an SVG element, written from left to right. Lengths are in CSS pixels at natural size.
#[derive(Debug, Clone, Default)]
pub struct Drawing {
    body: String,
}

impl Drawing {
    /// Nothing drawn yet.
    pub fn new() -> Self {
        Drawing::default()
    }

    /// The elements.
    pub fn into_body(self) -> String {
        self.body
    }

    /// A straight line.
    pub fn line(&mut self, class: &str, from: (f64, f64), to: (f64, f64)) {
        let [x1, y1, x2, y2] = [from.0, from.1, to.0, to.1].map(length);
        let _ = write!(
            self.body,
            r#"<line class="{class}" x1="{x1}" y1="{y1}" x2="{x2}" y2="{y2}"/>"#
        );
    }

    /// A line through points; closed when it is an area.
    pub fn polyline(
        &mut self,
        class: &str,
        points: impl IntoIterator<Item = (f64, f64)>,
        closed: bool,
    ) {
        let mut d = String::new();
        for (i, (x, y)) in points.into_iter().enumerate() {
            let verb = if i == 0 { 'M' } else { 'L' };
            let _ = write!(d, "{verb}{} {}", length(x), length(y));
        }
        if closed {
            d.push('Z');
        }
        let _ = write!(self.body, r#"<path class="{class}" d="{d}"/>"#);
    }

    /// A rectangle.
    pub fn rectangle(&mut self, class: &str, at: (f64, f64), size: (f64, f64)) {
        let [x, y, w, h] = [at.0, at.1, size.0.max(0.0), size.1.max(0.0)].map(length);
        let _ = write!(
            self.body,
            r#"<rect class="{class}" x="{x}" y="{y}" width="{w}" height="{h}"/>"#
        );
    }

    /// A rectangle filled with slanted lines of a colour class, with a border.
    pub fn hatched(&mut self, class: &str, at: (f64, f64), size: (f64, f64)) {
        let (x, y, w, h) = (at.0, at.1, size.0.max(0.0), size.1.max(0.0));
        self.rectangle(&format!("{class} band"), at, size);
        // Lines x + y = constant, 6 pixels apart, cut to the rectangle: a pattern would need an
        // identifier, unique on the page.
        let mut d = String::new();
        let mut s = 3.0;
        while s < w + h && s < 4000.0 {
            let (x1, y1) = (x + s.min(w), y + (s - w).max(0.0));
            let (x2, y2) = (x + (s - h).max(0.0), y + s.min(h));
            let _ = write!(
                d,
                "M{} {}L{} {}",
                length(x1),
                length(y1),
                length(x2),
                length(y2)
            );
            s += 6.0;
        }
        let _ = write!(self.body, r#"<path class="{class} line hatch" d="{d}"/>"#);
        self.rectangle("box", at, size);
    }

    /// Words at a point on their base line.
    pub fn text(&mut self, class: &str, at: (f64, f64), anchor: Anchor, words: &str) {
        self.words(class, at, anchor, "", words);
    }

    /// Words turned about their point, in degrees clockwise.
    pub fn turned_text(
        &mut self,
        class: &str,
        at: (f64, f64),
        anchor: Anchor,
        degrees: f64,
        words: &str,
    ) {
        let turn = format!(
            r#" transform="rotate({} {} {})""#,
            length(degrees),
            length(at.0),
            length(at.1)
        );
        self.words(class, at, anchor, &turn, words);
    }

    fn words(&mut self, class: &str, at: (f64, f64), anchor: Anchor, turn: &str, words: &str) {
        let anchor = match anchor {
            Anchor::Start => "",
            Anchor::Middle => r#" text-anchor="middle""#,
            Anchor::End => r#" text-anchor="end""#,
        };
        let class = match class {
            "" => String::new(),
            class => format!(r#" class="{class}""#),
        };
        let _ = write!(
            self.body,
            r#"<text{class} x="{}" y="{}"{anchor}{turn}>{}</text>"#,
            length(at.0),
            length(at.1),
            escaped(words)
        );
    }

    /// A name, cut to a width in pixels; what was cut can be read by pointing at it.
    pub fn name(
        &mut self,
        class: &str,
        at: (f64, f64),
        anchor: Anchor,
        (name, width): (&str, f64),
    ) {
        let size = if class.contains("name") { 14.0 } else { 12.0 };
        let short = shortened(name, width, size);
        let is_cut = matches!(short, Cow::Owned(_));
        if is_cut {
            self.begin(name);
        }
        self.text(class, at, anchor, &isolated(&short));
        if is_cut {
            self.end();
        }
    }

    /// A mark of about 9 pixels.
    pub fn mark(&mut self, class: &str, shape: Shape, (x, y): (f64, f64)) {
        let points: &[(f64, f64)] = match shape {
            Shape::Circle => {
                let _ = write!(
                    self.body,
                    r#"<circle class="{class}" cx="{}" cy="{}" r="4"/>"#,
                    length(x),
                    length(y)
                );
                return;
            }
            Shape::Diamond => &[(0.0, -5.2), (5.2, 0.0), (0.0, 5.2), (-5.2, 0.0)],
            Shape::Triangle => &[(0.0, -5.0), (4.8, 3.6), (-4.8, 3.6)],
            Shape::Drop => &[(0.0, 5.0), (4.8, -3.6), (-4.8, -3.6)],
            Shape::Square => &[(-3.8, -3.8), (3.8, -3.8), (3.8, 3.8), (-3.8, 3.8)],
        };
        self.polyline(class, points.iter().map(|&(dx, dy)| (x + dx, y + dy)), true);
    }

    /// Starts a group that tells `title` when pointed at.
    pub fn begin(&mut self, title: &str) {
        let _ = write!(self.body, "<g><title>{}</title>", escaped(title));
    }

    /// Ends the group.
    pub fn end(&mut self) {
        self.body.push_str("</g>");
    }
}

/// A length with at most two decimals; whatever is not a sane length is held at the edge.
pub fn length(x: f64) -> String {
    let held = if x.is_nan() { 0.0 } else { x.clamp(-1e5, 1e5) };
    let text = format!("{held:.2}");
    let text = text.trim_end_matches('0').trim_end_matches('.');
    if text == "-0" { "0" } else { text }.to_owned()
}

/// Text for inside an element or an attribute. Characters that XML forbids become the replacement
/// character.
pub fn escaped(text: &str) -> String {
    let mut out = String::with_capacity(text.len() + 8);
    for c in text.chars() {
        match c {
            '<' => out.push_str("&lt;"),
            '>' => out.push_str("&gt;"),
            '&' => out.push_str("&amp;"),
            '"' => out.push_str("&quot;"),
            '\'' => out.push_str("&#39;"),
            c if is_forbidden(c) => out.push('\u{fffd}'),
            c => out.push(c),
        }
    }
    out
}

/// Characters that neither XML 1.0 nor a page may hold.
pub fn is_forbidden(c: char) -> bool {
    (c.is_control() && !matches!(c, '\n' | '\t')) || matches!(c, '\u{fffe}' | '\u{ffff}')
}

/// The text between directional isolates, where it could change the direction of its neighbours.
pub fn isolated(text: &str) -> Cow<'_, str> {
    if text.is_ascii() {
        Cow::Borrowed(text)
    } else {
        Cow::Owned(format!("\u{2068}{text}\u{2069}"))
    }
}

/// The text, cut with an ellipsis where it is wider than `width` pixels in a font of `size` pixels.
pub fn shortened(text: &str, width: f64, size: f64) -> Cow<'_, str> {
    let mut sum = 0.0;
    let mut keep = 0;
    for (i, c) in text.char_indices() {
        sum += size * advance(c);
        if sum <= width - size {
            keep = i + c.len_utf8();
        }
        if sum > width {
            let cut = text[..keep].trim_end_matches(|c: char| advance(c) == 0.0 || c == ' ');
            return Cow::Owned(format!("{cut}\u{2026}"));
        }
    }
    Cow::Borrowed(text)
}

/// Width of a text in pixels, rather too much than too little: fonts differ.
pub fn width_of(text: &str, size: f64) -> f64 {
    text.chars().map(|c| size * advance(c)).sum()
}

/// Rough advance of a character in parts of the font size.
fn advance(c: char) -> f64 {
    match c {
        'i' | 'j' | 'l' | 'I' | '.' | ',' | ':' | ';' | '\'' | '|' | '!' => 0.32,
        ' ' | '(' | ')' | '[' | ']' | 'f' | 't' | 'r' | '-' | '/' => 0.4,
        'm' | 'w' | 'M' | 'W' | '@' | '%' => 0.93,
        'A'..='Z' | '&' => 0.7,
        '\0'..='\u{ff}' => 0.58,
        '\u{300}'..='\u{36f}' | '\u{200b}'..='\u{200f}' | '\u{202a}'..='\u{202e}' => 0.0,
        '\u{2060}'..='\u{206f}' | '\u{fe00}'..='\u{fe0f}' => 0.0,
        '\u{2000}'..='\u{206f}' => 0.6,
        '\u{100}'..='\u{10ff}' => 0.7,
        _ => 1.05,
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn markup_in_words_stays_words() {
        let mut d = Drawing::new();
        d.text("", (1.0, 2.0), Anchor::Middle, "<script>&\"'\u{0}");
        assert_eq!(
            d.into_body(),
            "<text x=\"1\" y=\"2\" text-anchor=\"middle\">&lt;script&gt;&amp;&quot;&#39;\u{fffd}</text>"
        );
    }

    #[test]
    fn lengths_are_short_and_finite() {
        assert_eq!(length(1.0), "1");
        assert_eq!(length(0.125), "0.12");
        assert_eq!(length(-0.0001), "0");
        assert_eq!(length(f64::INFINITY), "100000");
        assert_eq!(length(f64::NAN), "0");
    }

    #[test]
    fn long_names_are_cut_between_characters() {
        assert_eq!(shortened("Aldermere", 300.0, 12.0), "Aldermere");
        let long = "é".repeat(500);
        let cut = shortened(&long, 100.0, 12.0);
        assert!(cut.ends_with('…') && width_of(&cut, 12.0) <= 105.0, "{cut}");
        assert!(shortened("🦫🦫🦫🦫🦫🦫🦫🦫🦫🦫🦫", 60.0, 12.0).ends_with('…'));
    }

    #[test]
    fn a_cut_name_can_still_be_read() {
        let long = "Aldermere & ".repeat(40);
        let mut d = Drawing::new();
        d.name("name", (0.0, 0.0), Anchor::Start, (&long, 200.0));
        assert!(
            d.into_body()
                .contains(&format!("<title>{}</title>", long.replace('&', "&amp;")))
        );
    }
}
