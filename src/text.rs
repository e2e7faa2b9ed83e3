//! Text that came from files is untrusted: terminal controls are made visible before it is shown.

use std::borrow::Cow;

/// `text` with control and direction-changing characters replaced by visible escapes, for a
/// terminal. Ordinary text is returned as it is.
pub fn shown(text: &str) -> Cow<'_, str> {
    if !text.chars().any(is_unsafe) {
        return Cow::Borrowed(text);
    }
    let mut out = String::with_capacity(text.len() + 8);
    for c in text.chars() {
        if is_unsafe(c) {
            out.extend(c.escape_unicode());
        } else {
            out.push(c);
        }
    }
    Cow::Owned(out)
}

/// Controls (C0, C1, DEL) and the characters that reorder or hide text.
fn is_unsafe(c: char) -> bool {
    c.is_control()
        || matches!(c, '\u{200b}'..='\u{200f}' | '\u{2028}'..='\u{202e}' | '\u{2060}'..='\u{206f}' | '\u{feff}')
}

#[cfg(test)]
mod tests {
    use super::shown;

    #[test]
    fn escapes_are_made_visible_and_plain_names_are_kept() {
        assert_eq!(shown("a\u{1b}[31mb"), "a\\u{1b}[31mb");
        assert_eq!(shown("Kühlkörper no. 2"), "Kühlkörper no. 2");
        assert_eq!(shown("x\u{202e}y"), "x\\u{202e}y");
    }
}
