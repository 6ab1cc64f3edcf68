//! Mail addresses, as strict as is sure to travel: no quoted local parts, no comments.

/// True for `local@domain`.
pub(crate) fn is_address(text: &str) -> bool {
    let Some((local, domain)) = text.split_once('@') else {
        return false;
    };
    let is_atom = |atom: &str| {
        !atom.is_empty()
            && atom
                .chars()
                .all(|c| c.is_ascii_alphanumeric() || "!#$%&'*+-/=?^_`{|}~".contains(c))
    };
    let is_label = |label: &str| {
        !label.is_empty()
            && label.len() <= 63
            && label.chars().all(|c| c.is_alphanumeric() || c == '-')
            && !label.starts_with('-')
            && !label.ends_with('-')
    };
    text.len() <= 254
        && local.len() <= 64
        && local.split('.').all(is_atom)
        && domain.split('.').all(is_label)
}

/// True for an address, alone or as `Name <local@domain>`.
pub(crate) fn is_sender(text: &str) -> bool {
    let Some(rest) = text.strip_suffix('>') else {
        return is_address(text);
    };
    rest.split_once('<').is_some_and(|(name, address)| {
        is_address(address)
            && name.ends_with(' ')
            && !name.trim().is_empty()
            && !name.contains(|c: char| c.is_control() || "<>\"@,;:\\()[]".contains(c))
    })
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn one_at_and_plain_characters() {
        for address in [
            "quality@halden.example",
            "k.lund+grr@mail.halden.example",
            "root@localhost",
            "a@bücher.example",
        ] {
            assert!(is_address(address), "{address}");
            assert!(is_sender(address), "{address}");
        }
        for address in [
            "",
            "quality",
            "@halden.example",
            "a@",
            "a@@b.example",
            "a b@c.example",
            "a@b..example",
            ".a@b.example",
            "a@b.example\n",
            "<a@b.example>",
            "a@-b.example",
        ] {
            assert!(!is_address(address), "{address:?}");
        }
        assert!(is_sender("Restudy <restudy@halden.example>"));
        for sender in [
            "<restudy@halden.example>",
            "Restudy <restudy>",
            "Re\nstudy <a@b.example>",
            "Restudy <a@b.example> x",
            "a@b.example, c <d@e.example>",
        ] {
            assert!(!is_sender(sender), "{sender:?}");
        }
    }
}
