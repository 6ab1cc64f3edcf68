//! Mail addresses in the form in which they travel: the host in ASCII.

use lettre::Address;
use lettre::message::Mailbox;

/// An address.
///
/// # Errors
/// One sentence for a text that no server would take.
pub fn address(text: &str) -> Result<Address, String> {
    let refused = |why: &str| format!("`{}` cannot be mailed to: {why}", super::one_line(text));
    let Some((local, host)) = text.rsplit_once('@') else {
        return Err(refused("it has no @"));
    };
    if !local.is_ascii() {
        return Err(refused("the part before the @ is not ASCII"));
    }
    let host = idna::domain_to_ascii(host).map_err(|_| refused("its host has no ASCII form"))?;
    Address::new(local, &host).map_err(|e| refused(&e.to_string().to_lowercase()))
}

/// A sender, `Restudy <restudy@halden.example>` or the address alone.
///
/// # Errors
/// As [`address`].
pub fn sender(text: &str) -> Result<Mailbox, String> {
    match text.strip_suffix('>').and_then(|rest| rest.split_once('<')) {
        Some((name, plain)) => Ok(Mailbox::new(Some(name.trim().to_owned()), address(plain)?)),
        None => Ok(Mailbox::new(None, address(text)?)),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_host_travels_in_ascii() {
        // Punycode of "bücher": RFC 3492, the algorithm's usual example.
        assert_eq!(
            address("a@bücher.example").unwrap().to_string(),
            "a@xn--bcher-kva.example"
        );
        for plain in [
            "quality@halden.example",
            "k.lund+grr@mail.halden.example",
            "root@localhost",
        ] {
            assert_eq!(address(plain).unwrap().to_string(), plain);
        }
    }

    #[test]
    fn what_no_server_takes_is_one_sentence() {
        for text in [
            "",
            "quality",
            "a@",
            "@halden.example",
            "å@halden.example",
            "a@b.example\r\nRCPT TO:<x@y.example>",
            "a b@c.example",
        ] {
            let sentence = address(text).unwrap_err();
            assert!(
                sentence.contains("cannot be mailed to") && !sentence.contains('\n'),
                "{sentence:?}"
            );
        }
    }

    #[test]
    fn a_sender_may_have_a_name() {
        let mailbox = sender("Restudy, Halden <restudy@halden.example>").unwrap();
        assert_eq!(mailbox.name.as_deref(), Some("Restudy, Halden"));
        assert_eq!(sender("restudy@halden.example").unwrap().name, None);
    }
}
