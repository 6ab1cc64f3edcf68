//! What every page keeps, whatever the round.

/// What holds of every page: elements closed in order, every position a number in the picture, nothing loaded.
pub(super) fn sound(page: &str) {
    let mut open = Vec::new();
    for piece in page.split('<').skip(1) {
        let (tag, _) = piece.split_once('>').unwrap();
        let name = tag.split_whitespace().next().unwrap();
        match name.strip_prefix('/') {
            Some(closed) => assert_eq!(open.pop(), Some(closed), "in {tag}"),
            None if ["!DOCTYPE", "meta"].contains(&name) => {}
            None => open.push(name),
        }
    }
    assert!(open.is_empty(), "{open:?}");
    let drawn: String = page
        .split("<svg")
        .skip(1)
        .map(|s| s.split("</svg>").next().unwrap())
        .collect();
    for value in drawn
        .split("=\"")
        .skip(1)
        .map(|v| v.split('"').next().unwrap())
    {
        if let Some(percent) = value.strip_suffix('%').and_then(|v| v.parse::<f64>().ok()) {
            assert!((0.0..=100.0).contains(&percent), "{value}");
        }
        assert!(!value.contains("NaN") && !value.contains("inf"), "{value}");
    }
    assert!(!page.contains("NaN") && !page.contains("inf%"));
    for outside in [
        "http:", "https:", "<script", "<link", "<img", "@import", "url(h", "url(/",
    ] {
        assert!(!page.contains(outside), "{outside}");
    }
    for tag in page
        .split('<')
        .filter_map(|piece| piece.split_once('>'))
        .map(|(tag, _)| tag)
    {
        assert!(!tag.contains(" src="), "{tag}");
    }
    let headings: Vec<u32> = page
        .split("<h")
        .skip(1)
        .filter_map(|s| s.chars().next()?.to_digit(10))
        .collect();
    assert_eq!(headings.iter().filter(|h| **h == 1).count(), 1);
    assert!(
        headings.windows(2).all(|w| w[1] <= w[0] + 1),
        "{headings:?}"
    );
    let ids: Vec<&str> = page
        .split(" id=\"")
        .skip(1)
        .map(|s| s.split('"').next().unwrap())
        .collect();
    let distinct: std::collections::BTreeSet<&&str> = ids.iter().collect();
    assert_eq!(ids.len(), distinct.len());
    for target in page
        .split("href=\"#")
        .skip(1)
        .map(|s| s.split('"').next().unwrap())
    {
        assert!(ids.contains(&target), "{target}");
    }
}
