//! A letter as HTML: one column, inline styles, no images, readable without colour.

use super::letter::{Block, Letter};

/// Dark grey on white: contrast 16 to 1, where 4.5 to 1 is asked for.
const BODY: &str = "margin:0;padding:1em;background:#ffffff;color:#1f1f1f;\
  font-family:system-ui,-apple-system,'Segoe UI',Arial,sans-serif;font-size:16px;line-height:1.5";
const COLUMN: &str = "max-width:40em;margin:0 auto";
const FIRST: &str = "margin:0 0 0.8em 0;font-size:1.15em;font-weight:600";
const PARAGRAPH: &str = "margin:0 0 0.6em 0";
const RULE: &str = "border:0;border-top:1px solid #767676;margin:1.2em 0";
const LIST: &str = "margin:0 0 0.8em 0;padding-left:1.2em";
/// Contrast 7 to 1.
const FOOT: &str = "margin:0 0 0.4em 0;font-size:0.9em;color:#555555";

pub(super) fn page(letter: &Letter) -> String {
    let mut page = format!(
        "<!DOCTYPE html>\n<html lang=\"en\">\n<head>\n<meta charset=\"utf-8\">\n\
         <meta name=\"viewport\" content=\"width=device-width, initial-scale=1\">\n<title>{}</title>\n</head>\n\
         <body style=\"{BODY}\">\n<div style=\"{COLUMN}\">\n",
        escaped(&letter.subject)
    );
    for line in &letter.lead {
        match line.label {
            "" => page.push_str(&element("p", FIRST, &escaped(&line.text))),
            label => {
                let inner = format!("<strong>{label}:</strong> {}", escaped(&line.text));
                page.push_str(&element("p", PARAGRAPH, &inner));
            }
        }
    }
    page.push_str(&format!("<hr style=\"{RULE}\">\n"));
    for block in &letter.body {
        match block {
            Block::Text(text) => page.push_str(&element("p", PARAGRAPH, &escaped(text))),
            Block::List { title, items } => {
                page.push_str(&element("p", "margin:0 0 0.2em 0", &escaped(title)));
                let items: String = items
                    .iter()
                    .map(|item| format!("<li>{}</li>\n", escaped(item)))
                    .collect();
                page.push_str(&element("ul", LIST, &format!("\n{items}")));
            }
        }
    }
    page.push_str(&format!("<hr style=\"{RULE}\">\n"));
    for line in &letter.foot {
        page.push_str(&element("p", FOOT, &escaped(line)));
    }
    page.push_str("</div>\n</body>\n</html>\n");
    page
}

fn element(name: &str, style: &str, inner: &str) -> String {
    format!("<{name} style=\"{style}\">{inner}</{name}>\n")
}

/// Text that may stand in an element or in a quoted attribute.
fn escaped(text: &str) -> String {
    let mut out = String::with_capacity(text.len());
    for c in text.chars() {
        match c {
            '&' => out.push_str("&amp;"),
            '<' => out.push_str("&lt;"),
            '>' => out.push_str("&gt;"),
            '"' => out.push_str("&quot;"),
            '\'' => out.push_str("&#39;"),
            _ => out.push(c),
        }
    }
    out
}

#[cfg(test)]
mod tests {
    use super::super::letter::Line;
    use super::*;

    #[test]
    fn foreign_text_cannot_become_markup() {
        let hostile = "<script>alert('x')</script> & \"bore\"".to_owned();
        let letter = Letter {
            subject: hostile.clone(),
            lead: vec![Line {
                label: "Why",
                text: hostile.clone(),
            }],
            body: vec![Block::List {
                title: hostile.clone(),
                items: vec![hostile.clone()],
            }],
            foot: vec![hostile],
        };
        let page = page(&letter);
        assert!(!page.contains("<script"), "{page}");
        assert_eq!(
            page.matches("&lt;script&gt;alert(&#39;x&#39;)&lt;/script&gt; &amp; &quot;bore&quot;")
                .count(),
            5
        );
    }

    #[test]
    fn every_element_is_closed_in_order() {
        let letter = Letter {
            subject: "s".into(),
            lead: vec![
                Line {
                    label: "",
                    text: "a".into(),
                },
                Line {
                    label: "Next",
                    text: "b".into(),
                },
            ],
            body: vec![
                Block::Text("c".into()),
                Block::List {
                    title: "d".into(),
                    items: vec!["e".into(), "f".into()],
                },
            ],
            foot: vec!["g".into()],
        };
        let page = page(&letter);
        let mut open: Vec<&str> = Vec::new();
        for tag in page
            .split('<')
            .skip(1)
            .filter_map(|rest| rest.split(['>', ' ']).next())
        {
            match tag.strip_prefix('/') {
                Some(name) => assert_eq!(open.pop(), Some(name)),
                None if matches!(tag, "!DOCTYPE" | "meta" | "hr") => {}
                None => open.push(tag),
            }
        }
        assert!(open.is_empty(), "{open:?}");
    }
}
