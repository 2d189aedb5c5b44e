//! A picture under construction.

use std::fmt::Write;

/// Colours and fonts by class. Classes `a` to `d` are the series.
const STYLE: &str = "\
.ground{fill:#ffffff}
text{font:13px system-ui,-apple-system,'Segoe UI','DejaVu Sans',Helvetica,Arial,sans-serif;fill:#1a1a1a}
.title{font-size:15px;font-weight:600}
.small{font-size:12px;fill:#555555}
.code{font-family:ui-monospace,'DejaVu Sans Mono',Menlo,Consolas,monospace;font-size:12px}
.axis{stroke:#1a1a1a;stroke-width:1;fill:none}
.grid{stroke:#dcdcdc;stroke-width:1;fill:none}
.shade{fill:#8a8a8a;fill-opacity:0.16;stroke:none}
.line{fill:none;stroke-width:2;stroke-linejoin:round}
.dash{stroke-dasharray:7 4}
.dots{stroke-dasharray:2 4;stroke-linecap:round}
.bar{stroke-width:1.5;fill:none}
.a{stroke:#0072b2}.a.mark{fill:#0072b2}
.b{stroke:#d55e00}.b.mark{fill:#d55e00}
.c{stroke:#007d5b}.c.mark{fill:#ffffff}
.d{stroke:#9c4f86}.d.mark{fill:#ffffff}
.mark{stroke-width:1.8}
.halo{paint-order:stroke;stroke:#ffffff;stroke-width:4px;stroke-linejoin:round}
@media (prefers-color-scheme:dark){
.ground{fill:#14171c}
text{fill:#e8e8e8}
.small{fill:#b0b0b0}
.axis{stroke:#e8e8e8}
.grid{stroke:#353b45}
.shade{fill:#a9b4c4;fill-opacity:0.18}
.a{stroke:#56b4e9}.a.mark{fill:#56b4e9}
.b{stroke:#f0a030}.b.mark{fill:#f0a030}
.c{stroke:#2cc79b}.c.mark{fill:#14171c}
.d{stroke:#e39bc9}.d.mark{fill:#14171c}
.halo{stroke:#14171c}
}";

/// Where a text is anchored.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Anchor {
    Start,
    Middle,
    End,
}

/// Shapes of marks.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Shape {
    Circle,
    Square,
    Diamond,
    Star,
}

/// A picture under construction; lengths in pixels, y downwards.
pub(super) struct Svg {
    body: String,
    width: f64,
    height: f64,
    name: String,
    about: String,
}

impl Svg {
    /// An empty picture with a name and a description for those who cannot see
    /// it.
    pub(super) fn new(width: f64, height: f64, name: &str, about: &str) -> Self {
        Svg {
            body: String::new(),
            width,
            height,
            name: escape(name),
            about: escape(about),
        }
    }

    /// One element; numbers are given with one decimal.
    fn element(&mut self, text: std::fmt::Arguments<'_>) {
        // Writing to a string cannot fail.
        let _ = self.body.write_fmt(text);
        self.body.push('\n');
    }

    pub(super) fn line(&mut self, class: &str, from: (f64, f64), to: (f64, f64)) {
        let ((x1, y1), (x2, y2)) = (from, to);
        self.element(format_args!(
            r#"<line class="{class}" x1="{x1:.1}" y1="{y1:.1}" x2="{x2:.1}" y2="{y2:.1}"/>"#
        ));
    }

    pub(super) fn polyline(&mut self, class: &str, points: &[(f64, f64)]) {
        let mut list = String::new();
        for (x, y) in points {
            let _ = write!(list, "{x:.1},{y:.1} ");
        }
        let list = list.trim_end();
        self.element(format_args!(
            r#"<polyline class="{class}" points="{list}"/>"#
        ));
    }

    pub(super) fn rectangle(&mut self, class: &str, from: (f64, f64), to: (f64, f64)) {
        let (x, y) = (from.0.min(to.0), from.1.min(to.1));
        let (width, height) = ((to.0 - from.0).abs(), (to.1 - from.1).abs());
        self.element(format_args!(
            r#"<rect class="{class}" x="{x:.1}" y="{y:.1}" width="{width:.1}" height="{height:.1}"/>"#
        ));
    }

    pub(super) fn text(&mut self, class: &str, at: (f64, f64), anchor: Anchor, text: &str) {
        let anchor = anchor_word(anchor);
        let (x, y) = at;
        let text = escape(text);
        self.element(format_args!(
            r#"<text class="{class}" x="{x:.1}" y="{y:.1}" text-anchor="{anchor}">{text}</text>"#
        ));
    }

    /// A text that runs upwards, centred.
    pub(super) fn upright(&mut self, class: &str, at: (f64, f64), text: &str) {
        let (x, y) = at;
        let text = escape(text);
        self.element(format_args!(
            r#"<text class="{class}" transform="translate({x:.1} {y:.1}) rotate(-90)" text-anchor="middle">{text}</text>"#
        ));
    }

    /// A mark of about `size` pixels in radius.
    pub(super) fn mark(&mut self, class: &str, shape: Shape, at: (f64, f64), size: f64) {
        let (x, y) = at;
        match shape {
            Shape::Circle => self.element(format_args!(
                r#"<circle class="{class} mark" cx="{x:.1}" cy="{y:.1}" r="{size:.1}"/>"#
            )),
            Shape::Square => self.element(format_args!(
                r#"<rect class="{class} mark" x="{:.1}" y="{:.1}" width="{:.1}" height="{:.1}"/>"#,
                x - size,
                y - size,
                2.0 * size,
                2.0 * size
            )),
            Shape::Diamond => self.corners(class, at, &[size * 1.35; 4]),
            Shape::Star => {
                let radii: Vec<f64> = (0..10)
                    .map(|corner| size * if corner % 2 == 0 { 1.7 } else { 0.75 })
                    .collect();
                self.corners(class, at, &radii);
            }
        }
    }

    /// A closed shape with corners at equal angles, the first one on top.
    fn corners(&mut self, class: &str, at: (f64, f64), radii: &[f64]) {
        let mut list = String::new();
        for (corner, radius) in radii.iter().enumerate() {
            let angle = std::f64::consts::TAU * corner as f64 / radii.len() as f64;
            let (x, y) = (at.0 + radius * angle.sin(), at.1 - radius * angle.cos());
            let _ = write!(list, "{x:.1},{y:.1} ");
        }
        let list = list.trim_end();
        self.element(format_args!(
            r#"<polygon class="{class} mark" points="{list}"/>"#
        ));
    }

    /// The finished document.
    pub(super) fn finish(self) -> String {
        let Svg {
            body,
            width,
            height,
            name,
            about,
        } = self;
        format!(
            r#"<?xml version="1.0" encoding="UTF-8"?>
<svg xmlns="http://www.w3.org/2000/svg" viewBox="0 0 {width:.0} {height:.0}" width="{width:.0}" height="{height:.0}" role="img" aria-labelledby="name about">
<title id="name">{name}</title>
<desc id="about">{about}</desc>
<style>
{STYLE}
</style>
<rect class="ground" width="100%" height="100%"/>
{body}</svg>
"#
        )
    }
}

fn anchor_word(anchor: Anchor) -> &'static str {
    match anchor {
        Anchor::Start => "start",
        Anchor::Middle => "middle",
        Anchor::End => "end",
    }
}

/// About how wide a text is in pixels at 13 pixels; for layout, never exact.
pub(super) fn width_of(text: &str) -> f64 {
    6.8 * text.chars().count() as f64
}

/// At most `most` characters, the middle left out where there are more.
pub(super) fn shortened(text: &str, most: usize) -> String {
    let letters: Vec<char> = text.chars().collect();
    if letters.len() <= most {
        return text.to_owned();
    }
    let head = most / 2;
    let tail = most - head - 1;
    let first: String = letters[..head].iter().collect();
    let last: String = letters[letters.len() - tail..].iter().collect();
    format!("{first}…{last}")
}

/// Text as XML 1.0 allows it: markup escaped, forbidden control characters
/// replaced.
fn escape(text: &str) -> String {
    let mut escaped = String::with_capacity(text.len());
    for letter in text.chars() {
        match letter {
            '&' => escaped.push_str("&amp;"),
            '<' => escaped.push_str("&lt;"),
            '>' => escaped.push_str("&gt;"),
            '"' => escaped.push_str("&quot;"),
            '\t' | '\n' | '\r' => escaped.push(' '),
            letter if letter < ' ' || letter == '\u{fffe}' || letter == '\u{ffff}' => {
                escaped.push('\u{fffd}');
            }
            letter => escaped.push(letter),
        }
    }
    escaped
}

#[cfg(test)]
mod tests {
    use super::*;

    /// XML 1.0, section 2.2 (characters) and 2.4 (markup).
    #[test]
    fn texts_cannot_break_the_document() {
        assert_eq!(escape("a<b & \"c\">"), "a&lt;b &amp; &quot;c&quot;&gt;");
        assert_eq!(escape("\u{1b}[0m\u{0}"), "\u{fffd}[0m\u{fffd}");
    }

    #[test]
    fn long_texts_lose_their_middle() {
        assert_eq!(shortened("0101", 8), "0101");
        assert_eq!(shortened("0123456789", 7), "012…789");
    }
}
