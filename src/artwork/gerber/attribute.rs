//! X2 and X3 attributes, in all three spellings: `%TO.N,GND*%`, `G04 #@! TO.N,GND*`, `G04 #@!TO.N,GND*`.

/// What an attribute command hangs its value on.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum Target {
    /// The file (`TF`).
    File,
    /// Apertures defined from here on (`TA`).
    Aperture,
    /// Objects made from here on (`TO`).
    Object,
}

/// An attribute command.
#[derive(Debug, Clone, PartialEq, Eq)]
pub(crate) enum Attribute {
    /// `TF`, `TA`, `TO`.
    Set {
        /// What it hangs on.
        target: Target,
        /// Its name, dot included.
        name: String,
        /// Its fields.
        values: Vec<String>,
    },
    /// `TD`: one attribute by name, or all that hang on objects and apertures.
    Delete(Option<String>),
}

/// The attribute command in `text` (`TO.N,GND`); `None` when it is none.
pub(crate) fn parse(text: &[u8]) -> Option<Attribute> {
    let target = match text.get(..2)? {
        b"TF" => Some(Target::File),
        b"TA" => Some(Target::Aperture),
        b"TO" => Some(Target::Object),
        b"TD" => None,
        _ => return None,
    };
    let mut fields = text[2..].split(|b| *b == b',').map(decode);
    let name = fields.next().unwrap_or_default().trim().to_owned();
    match target {
        Some(target) if !name.is_empty() => Some(Attribute::Set { target, name, values: fields.collect() }),
        Some(_) => None,
        None => Some(Attribute::Delete((!name.is_empty()).then_some(name))),
    }
}

/// The attribute in a standard comment, `text` being what follows `G04`.
pub(crate) fn in_comment(text: &[u8]) -> Option<Attribute> {
    let text = text.trim_ascii_start();
    parse(text.strip_prefix(b"#@!")?.trim_ascii())
}

/// A field: UTF-8, else Latin-1; line breaks left out; `\uXXXX` and `\UXXXXXXXX` put in.
fn decode(field: &[u8]) -> String {
    let bytes: Vec<u8> = field.iter().copied().filter(|b| *b != b'\r' && *b != b'\n').collect();
    let text = match String::from_utf8(bytes) {
        Ok(text) => text,
        Err(error) => error.into_bytes().into_iter().map(char::from).collect(),
    };
    if !text.contains('\\') {
        return text;
    }
    let mut out = String::with_capacity(text.len());
    let mut rest = text.as_str();
    while let Some(at) = rest.find('\\') {
        out.push_str(&rest[..at]);
        let digits = match rest.as_bytes().get(at + 1) {
            Some(b'u') => 4,
            Some(b'U') => 8,
            _ => 0,
        };
        let code = rest.get(at + 2..at + 2 + digits).filter(|d| !d.is_empty());
        match code.and_then(|d| u32::from_str_radix(d, 16).ok()).and_then(char::from_u32) {
            Some(letter) => {
                out.push(letter);
                rest = &rest[at + 2 + digits..];
            }
            None => {
                out.push('\\');
                rest = &rest[at + 1..];
            }
        }
    }
    out.push_str(rest);
    out
}

#[cfg(test)]
mod tests {
    use super::*;

    fn net(name: &str) -> Option<Attribute> {
        Some(Attribute::Set { target: Target::Object, name: ".N".into(), values: vec![name.into()] })
    }

    #[test]
    fn three_spellings_and_escapes() {
        assert_eq!(parse(b"TO.N,GND"), net("GND"));
        assert_eq!(in_comment(b" #@! TO.N,GND"), net("GND"));
        assert_eq!(in_comment(b" #@!TO.N,GND"), net("GND"));
        assert_eq!(in_comment(b" just a comment"), None);
        assert_eq!(parse(b"TO.N,\\u00B5C\\u002C1"), net("\u{b5}C,1"));
        assert_eq!(parse(b"TO.N,a\\b"), net("a\\b"));
        assert_eq!(parse(&[b'T', b'O', b'.', b'N', b',', 0xB5]), net("\u{b5}"));
        assert_eq!(parse(b"TD"), Some(Attribute::Delete(None)));
    }
}
