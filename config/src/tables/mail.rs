//! `[mail]`: how to reach the mail server.

use crate::address::{is_address, is_sender};
use crate::checked::{Mail, Password, Tls};
use crate::folders::Folders;
use crate::walk::{Node, Table};

pub(crate) fn mail(node: &Node<'_>, folders: &Folders<'_>) -> Option<Mail> {
    let table = node.table("a [mail] table")?;
    let server = table
        .need("server", "the mail server's host name")
        .and_then(|node| host(&node));
    let hint = "say \"none\" only for a server on the same machine or in a trusted network";
    let tls = table.need_hint("tls", "\"none\", \"starttls\" or \"implicit\"", hint);
    let tls = tls.and_then(|node| {
        node.word(&[
            ("none", Tls::None),
            ("starttls", Tls::StartTls),
            ("implicit", Tls::Implicit),
        ])
    });
    let port = match table.get("port") {
        Some(node) => node
            .whole(1..=65_535, "a port")
            .and_then(|port| u16::try_from(port).ok()),
        None => tls.map(|tls| match tls {
            Tls::None => 25,
            Tls::StartTls => 587,
            Tls::Implicit => 465,
        }),
    };
    let login = login(&table, tls, folders);
    let from = table
        .need(
            "from",
            "the sender, such as \"Restudy <restudy@halden.example>\"",
        )
        .and_then(|node| sender(&node));
    table.later(&[
        "ca",
        "ca_file",
        "hello",
        "test_every",
        "limit_per_hour",
        "reply_to",
        "credential",
    ]);
    table.finish();
    Some(Mail {
        server: server?,
        port: port?,
        tls: tls?,
        login: login?,
        from: from?,
    })
}

fn host(node: &Node<'_>) -> Option<String> {
    let host = node.name()?;
    if host.contains(|c: char| !(c.is_ascii_alphanumeric() || ".-:[]_".contains(c))) {
        node.fault("a host name such as \"mail.halden.example\"");
        return None;
    }
    Some(host.to_owned())
}

fn sender(node: &Node<'_>) -> Option<String> {
    let from = node.name()?;
    if !is_sender(from) {
        node.fault("an address such as \"Restudy <restudy@halden.example>\"");
        return None;
    }
    Some(from.to_owned())
}

/// `Some(None)`: no login.
#[allow(clippy::option_option)]
fn login(
    table: &Table<'_>,
    tls: Option<Tls>,
    folders: &Folders<'_>,
) -> Option<Option<(String, Password)>> {
    let (user, file, variable) = (
        table.get("user"),
        table.get("password_file"),
        table.get("password_env"),
    );
    if table.get("password").is_some() {
        table.place_of("password").fault_hint(
            "a password",
            "no password in this file",
            "name a file with `password_file` or a variable with `password_env`",
        );
        return None;
    }
    let secret = match (&file, &variable) {
        (Some(_), Some(variable)) => {
            variable
                .place
                .fault("`password_env` beside `password_file`", "one of the two");
            return None;
        }
        (Some(file), None) => Some(folders.path(file).map(Password::File)?),
        (None, Some(variable)) => Some(Password::Environment(environment(variable)?)),
        (None, None) => None,
    };
    match (user, secret) {
        (None, None) => Some(None),
        (Some(user), None) => {
            user.fault_hint(
                "`password_file` or `password_env` beside it",
                "a server that needs no password needs no user either",
            );
            None
        }
        (None, Some(_)) => {
            table
                .place
                .below("user")
                .fault("nothing, and a password", "the name to log in with");
            None
        }
        (Some(user), Some(secret)) => {
            let name = user.name()?.to_owned();
            if tls == Some(Tls::None) {
                user.place.fault_hint(
                    "a login with tls = \"none\"",
                    "tls = \"starttls\" or \"implicit\"",
                    "the password would travel in clear text",
                );
                return None;
            }
            Some(Some((name, secret)))
        }
    }
}

fn environment(node: &Node<'_>) -> Option<String> {
    let name = node.name()?;
    if name.starts_with(|c: char| c.is_ascii_digit())
        || name.contains(|c: char| !(c.is_ascii_alphanumeric() || c == '_'))
    {
        // Not shown: it may be the password itself.
        node.place.fault(
            "a text that is no such name",
            "the name of an environment variable",
        );
        return None;
    }
    Some(name.to_owned())
}

/// The addresses of a list.
pub(crate) fn addresses(node: &Node<'_>) -> Option<Vec<String>> {
    let names = node.names("a list of mail addresses")?;
    let mut sound = true;
    for (address, node) in &names {
        if !is_address(address) {
            node.fault("a mail address such as \"quality@halden.example\"");
            sound = false;
        }
    }
    sound.then(|| {
        names
            .into_iter()
            .map(|(address, _)| address.to_owned())
            .collect()
    })
}
