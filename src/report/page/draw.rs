//! Small words for drawing: pictures with a title and a description, marks with
//! a value each.

use svg::node::element::{
    Description, Group, Line, Path, Polygon, Rectangle, SVG, Text, Title, path::Data,
};

/// An empty picture `width` by `height` in its own units. One whose marks can be
/// reached says so with `values`.
pub fn picture(
    id: &str,
    (width, height): (f64, f64),
    title: &str,
    description: &str,
    values: bool,
) -> SVG {
    let (title_id, description_id) = (format!("{id}-title"), format!("{id}-text"));
    let picture = SVG::new()
        .set("viewBox", format!("0 0 {} {}", short(width), short(height)))
        .set("id", id)
        .set("style", format!("--w:{}px", short(width)))
        .set("aria-labelledby", title_id.clone())
        .set("aria-describedby", description_id.clone())
        .set("role", if values { "group" } else { "img" })
        .add(Title::new(title).set("id", title_id))
        .add(
            Description::new()
                .set("id", description_id)
                .add(svg::node::Text::new(description)),
        );
    if values {
        picture.set("class", "values").set("tabindex", 0)
    } else {
        picture
    }
}

/// A group that tells `value` when pointed at or stepped to.
pub fn mark(value: &str) -> Group {
    Group::new()
        .set("class", "mark")
        .set("role", "img")
        .set("tabindex", -1)
        .add(Title::new(value))
}

pub fn line(from: (f64, f64), to: (f64, f64), class: &str) -> Line {
    Line::new()
        .set("x1", short(from.0))
        .set("y1", short(from.1))
        .set("x2", short(to.0))
        .set("y2", short(to.1))
        .set("class", class)
}

pub fn rectangle(at: (f64, f64), size: (f64, f64), class: &str) -> Rectangle {
    Rectangle::new()
        .set("x", short(at.0))
        .set("y", short(at.1))
        .set("width", short(size.0.max(0.0)))
        .set("height", short(size.1.max(0.0)))
        .set("class", class)
}

pub fn polygon(points: &[(f64, f64)], class: &str) -> Polygon {
    let points: Vec<String> = points
        .iter()
        .map(|(x, y)| format!("{},{}", short(*x), short(*y)))
        .collect();
    Polygon::new()
        .set("points", points.join(" "))
        .set("class", class)
}

pub fn polyline(points: &[(f64, f64)], class: &str) -> Path {
    let mut data = Data::new();
    for (index, (x, y)) in points.iter().enumerate() {
        let point = (rounded(*x), rounded(*y));
        data = if index == 0 {
            data.move_to(point)
        } else {
            data.line_to(point)
        };
    }
    Path::new().set("d", data).set("class", class)
}

pub fn label(at: (f64, f64), text: &str, class: &str) -> Text {
    Text::new(text)
        .set("x", short(at.0))
        .set("y", short(at.1))
        .set("class", class)
}

/// A coordinate with two decimals, none where none are needed.
pub fn short(value: f64) -> String {
    let text = format!("{:.2}", value + 0.0);
    text.trim_end_matches('0').trim_end_matches('.').to_owned()
}

fn rounded(value: f64) -> f32 {
    ((value * 100.0).round() / 100.0) as f32
}

/// A round step that splits `range` into about `count`.
pub fn round_step(range: f64, count: f64) -> f64 {
    let rough = range / count;
    let power = 10.0_f64.powf(rough.log10().floor());
    let share = rough / power;
    let factor = if share <= 1.0 {
        1.0
    } else if share <= 2.0 {
        2.0
    } else if share <= 5.0 {
        5.0
    } else {
        10.0
    };
    factor * power
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn names_from_a_tower_file_cannot_break_a_picture() {
        let text = picture("a", (10.0, 10.0), "<b> & \"c\"", "'", true)
            .add(mark("</svg><script>"))
            .add(label((0.0, 0.0), "<i>", "a\"b"))
            .to_string();
        assert!(!text.contains("<script>") && !text.contains("<i>") && !text.contains("<b>"));
        assert!(text.contains("&lt;b&gt; &amp;"));
        assert!(text.contains("a&quot;b"));
    }

    #[test]
    fn steps_of_axes_are_round() {
        assert_eq!(round_step(10.0, 5.0), 2.0);
        assert_eq!(round_step(0.7, 5.0), 0.2);
        assert_eq!(short(1.50), "1.5");
    }
}
