//! A mail server that is not there at first loses nothing.

use serde_json::Value;

use crate::export::small_study;
use crate::mailbox::{Mailbox, silent_port};
use crate::plant::{Design, Plant, RECIPIENTS};
use crate::program::{Service, log, nothing_owed};

const DESIGN: Design<'_> = Design {
    parts: 5,
    appraisers: &["KL", "MO"],
    trials: 2,
};

#[test]
fn mail_server_down() {
    let port = silent_port();
    let plant = Plant::new(DESIGN, Some(port));
    for run in small_study(DESIGN.parts, DESIGN.appraisers, DESIGN.trials, 3) {
        plant.put(&format!("{}.csv", run.name()), &run.text());
    }
    let mut service = Service::start(&plant);
    let was_tried = |s: &Value| {
        let owed = s["owed"].as_array().expect("owed notices");
        owed.len() == RECIPIENTS.len() && owed.iter().any(|o| !o["last_error"].is_null())
    };
    let status = service.wait_until("a try", was_tried);
    assert_eq!(status["rounds"][0]["state"], "complete");
    for (owed, recipient) in status["owed"]
        .as_array()
        .expect("owed notices")
        .iter()
        .zip(RECIPIENTS)
    {
        assert_eq!(owed["channel"], "mail");
        assert_eq!(owed["recipient"], recipient);
        assert_eq!(owed["refused"], false);
        assert_eq!(owed["plan"], "impeller hub");
    }

    let Some(mailbox) = Mailbox::open_on("mail_server_down", port, 0) else {
        return;
    };
    service.wait_until("everything delivered", nothing_owed);
    let messages = mailbox.messages();
    let mut recipients: Vec<&str> = messages.iter().map(|m| m.recipient.as_str()).collect();
    recipients.sort_unstable();
    assert_eq!(recipients, RECIPIENTS, "{}", log(&plant));
    service.stop();
}
