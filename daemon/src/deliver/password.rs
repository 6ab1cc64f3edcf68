//! The password for the mail server, looked up when it is needed and kept nowhere.

use std::io::Read as _;

use restudy_config::Password;

/// Longer passwords are a wrong file.
const LENGTH_MAX: u64 = 4096;

/// Reads a password.
///
/// # Errors
/// One sentence; never with the password.
pub fn read(from: &Password) -> Result<String, String> {
    match from {
        Password::Environment(name) => std::env::var(name).map_err(|_| {
            format!("the environment variable `{name}` for the mail password is not set")
        }),
        Password::File(path) => from_file(path),
    }
}

fn from_file(path: &std::path::Path) -> Result<String, String> {
    let unreadable = |e: std::io::Error| format!("the mail password cannot be read: {e}");
    let file = fs_err::File::open(path).map_err(unreadable)?;
    only_ours(&file.metadata().map_err(unreadable)?)
        .map_err(|why| format!("the password file `{}` {why}", path.display()))?;
    let mut text = String::new();
    file.take(LENGTH_MAX)
        .read_to_string(&mut text)
        .map_err(unreadable)?;
    let password = text.lines().next().unwrap_or_default();
    if password.is_empty() {
        return Err(format!("the password file `{}` is empty", path.display()));
    }
    Ok(password.to_owned())
}

#[cfg(unix)]
fn only_ours(metadata: &std::fs::Metadata) -> Result<(), String> {
    use std::os::unix::fs::PermissionsExt as _;
    let mode = metadata.permissions().mode() & 0o777;
    if mode & 0o077 != 0 {
        return Err(format!(
            "is open to others (mode {mode:04o}); expected 0600: chmod 600"
        ));
    }
    Ok(())
}

#[cfg(not(unix))]
fn only_ours(_: &std::fs::Metadata) -> Result<(), String> {
    Ok(())
}

#[cfg(unix)]
#[cfg(test)]
mod tests {
    use super::*;
    use std::os::unix::fs::PermissionsExt as _;

    fn file(mode: u32, text: &str) -> (tempfile::TempDir, Password) {
        let folder = tempfile::tempdir().unwrap();
        let path = folder.path().join("mail-password");
        fs_err::write(&path, text).unwrap();
        fs_err::set_permissions(&path, std::fs::Permissions::from_mode(mode)).unwrap();
        (folder, Password::File(path))
    }

    #[test]
    fn a_file_of_ours_gives_its_first_line() {
        let (_folder, password) = file(0o600, "hunter two\n");
        assert_eq!(read(&password).unwrap(), "hunter two");
    }

    #[test]
    fn a_file_open_to_others_is_refused_without_its_content() {
        for mode in [0o640, 0o604, 0o660] {
            let (_folder, password) = file(mode, "hunter two\n");
            let sentence = read(&password).unwrap_err();
            assert!(
                sentence.contains("expected 0600") && !sentence.contains("hunter"),
                "{sentence}"
            );
        }
    }

    #[test]
    fn nothing_there_is_one_sentence() {
        let (_folder, empty) = file(0o600, "\n");
        assert!(read(&empty).unwrap_err().ends_with("is empty"));
        let absent = Password::Environment("RESTUDY_TEST_NO_SUCH_VARIABLE".into());
        assert!(
            read(&absent)
                .unwrap_err()
                .contains("`RESTUDY_TEST_NO_SUCH_VARIABLE`")
        );
    }
}
