//! Input that is wrong: one clear error each, by its code.

use super::world::{board, file, import, job, mapped};
use miette::Diagnostic;

fn codes(text: &[u8]) -> Vec<String> {
    let errors = match import(&[mapped(0, "L1", text)], &job(), &board(1)) {
        Ok(_) => return Vec::new(),
        Err(errors) => errors.0,
    };
    errors.iter().map(|error| error.code().unwrap().to_string()).collect()
}

/// What: each broken file gives its error, and only that one.
#[test]
fn broken_gerber_files() {
    let head = "%FSLAX46Y46*%%MOMM*%G75*%ADD10C,1*%D10*";
    let cases: [(&str, &str); 32] = [
        ("X0Y0D03*", "truncated"),
        ("%TF.Part,Single*", "truncated"),
        ("X0Y0D03*M02", "truncated"),
        ("%TO.N,GND%X0Y0D03*", "truncated"),
        ("X1e300Y0D03*M02*", "malformed"),
        ("X99999999999Y0D03*M02*", "out_of_range"),
        ("X123456789012345678901234567890Y0D03*M02*", "malformed"),
        ("D99*X0Y0D03*M02*", "undefined_aperture"),
        ("%ADD11NOPE*%M02*", "undefined_macro"),
        ("%ADD11C,-1*%M02*", "out_of_range"),
        ("%ADD11C,99999*%M02*", "out_of_range"),
        ("%ADD11C*%M02*", "malformed"),
        ("%ADD11P,1X99*%M02*", "malformed"),
        ("%AMX*99,1,2*%%ADD11X*%M02*", "unsupported"),
        ("%AMX*1,1,1/0,0,0*%%ADD11X*%M02*", "out_of_range"),
        ("%AMX*4,1,999999,0,0*%%ADD11X*%M02*", "malformed"),
        ("%AMX*6,0,0,9,0.001,0.001,5000,0,0,0*%%ADD11X*%M02*", "too_many"),
        ("%SRX100000Y100000I1J1*%X0Y0D03*X1Y1D03*%SR*%M02*", "out_of_range"),
        ("%SRX9000Y9000I0.001J0.001*%X0Y0D03*%SR*%M02*", "too_many"),
        ("G36*X0Y0D02*X1000000D01*M02*", "nesting"),
        ("G37*M02*", "nesting"),
        ("G36*X0Y0D03*G37*M02*", "nesting"),
        ("%AB*%M02*", "nesting"),
        ("%ABD20*%X0Y0D03*M02*", "nesting"),
        ("G02*X1000000Y0I9000000J0D01*M02*", "bad_arc"),
        ("%IPNEG*%M02*", "unsupported"),
        ("%KOC*%M02*", "unsupported"),
        ("G12*M02*", "unsupported"),
        ("%SFA1B2*%M02*", "unsupported"),
        ("%ZZ*%M02*", "malformed"),
        ("%ADD11O,2X1*%D11*X0Y0D02*X1000000D01*M02*", "unsupported"),
        ("?*M02*", "malformed"),
    ];
    let mut failures = Vec::new();
    for (body, code) in cases {
        let found = codes(format!("{head}{body}").as_bytes());
        if found != [format!("artwork::gerber::{code}")] {
            failures.push(format!("{body}: {found:?}, expected {code}"));
        }
    }
    for (text, code) in [
        ("%MOMM*%%ADD10C,1*%D10*X0Y0D03*M02*", "undeclared"),
        ("%FSLAX46Y46*%%ADD10C,1*%M02*", "undeclared"),
        ("%FSLAX46Y46*%%MOMM*%X0Y0D03*M02*", "no_aperture"),
        ("%FSLAX46Y46*%%MOMM*%%ADD10C,1*%D10*G02*X1000000Y0I500000J0D01*M02*", "undeclared"),
    ] {
        let found = codes(text.as_bytes());
        if found != [format!("artwork::gerber::{code}")] {
            failures.push(format!("{text}: {found:?}, expected {code}"));
        }
    }
    assert!(failures.is_empty(), "{}", failures.join("\n"));
}

/// What: each broken drill file gives its error, and only that one.
#[test]
fn broken_drill_files() {
    let cases: [(&str, &str); 9] = [
        ("M48\nMETRIC\nT1C0.3\n%\nT1\nX1.0Y1.0\n", "truncated"),
        ("M48\nMETRIC\nT1C0.3\n%\nT2\nX1.0Y1.0\nM30\n", "undefined_tool"),
        ("M48\nT1C0.3\n%\nM30\n", "no_unit"),
        ("M48\nMETRIC\nT1C0.3\n%\nT1\nX1e300Y1.0\nM30\n", "malformed"),
        ("M48\nMETRIC\nT1C0.3\n%\nT1\nX99999.0Y1.0\nM30\n", "out_of_range"),
        ("M48\nMETRIC\nT1C0.3\n%\nT1\nG41\nM30\n", "unsupported"),
        ("M48\nMETRIC\nT1C0.3\n%\nT1\nM25\nM30\n", "unsupported"),
        ("M48\nMETRIC\nT1C0.3\n%\nT1\nwhat?\nM30\n", "malformed"),
        ("M48\nMETRIC\nT1C0.3\n%\nT1\nX100Y100\nM30\n", "digits"),
    ];
    for (text, code) in cases {
        let errors = import(&[file(0, "x.drl", text)], &job(), &board(1)).unwrap_err();
        let found: Vec<String> = errors.0.iter().map(|e| e.code().unwrap().to_string()).collect();
        assert_eq!(found, [format!("artwork::drill::{code}")], "{text}");
    }
}
