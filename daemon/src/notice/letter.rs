//! A message as blocks, and as plain text. The five leading lines stand first and can be read alone.

use super::html;

/// A message before it is text or HTML.
#[derive(Debug, Clone, PartialEq, Eq)]
pub(super) struct Letter {
    pub(super) subject: String,
    pub(super) lead: Vec<Line>,
    pub(super) body: Vec<Block>,
    pub(super) foot: Vec<String>,
}

/// One of the leading lines.
#[derive(Debug, Clone, PartialEq, Eq)]
pub(super) struct Line {
    /// Empty for the first.
    pub(super) label: &'static str,
    pub(super) text: String,
}

/// A paragraph or a list.
#[derive(Debug, Clone, PartialEq, Eq)]
pub(super) enum Block {
    Text(String),
    List { title: String, items: Vec<String> },
}

impl Letter {
    /// As plain text, a line a thought; the mail's encoding breaks what is too long.
    pub(super) fn text(&self) -> String {
        let mut text = String::new();
        for line in &self.lead {
            match line.label {
                "" => add(&mut text, &line.text),
                label => add(&mut text, &format!("{label}: {}", line.text)),
            }
        }
        text.push('\n');
        for block in &self.body {
            match block {
                Block::Text(paragraph) => add(&mut text, paragraph),
                Block::List { title, items } => {
                    add(&mut text, title);
                    for item in items {
                        add(&mut text, &format!("  - {item}"));
                    }
                }
            }
        }
        text.push('\n');
        for line in &self.foot {
            add(&mut text, line);
        }
        text
    }

    /// As a page in one column.
    pub(super) fn html(&self) -> String {
        html::page(self)
    }
}

fn add(text: &mut String, line: &str) {
    text.push_str(line);
    text.push('\n');
}
