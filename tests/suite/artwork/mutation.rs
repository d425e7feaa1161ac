//! Files with bytes changed at random are read or refused, never a panic and never without end.

use super::world::{board, file, import, job};
use proptest::prelude::*;

const GERBER: &str = "%TF.FileFunction,Copper,L1,Top*%%FSLAX46Y46*%%MOMM*%G75*G04 #@! TO.N,A*\
    %AMR*0 c*$3=$1x2*21,1,$1,$2,0,0,$3*1,0,0.2,0,0*7,0,0,1,0.5,0.1,45*%%ADD10C,0.5X0.1*%%ADD11R,1X0.5*%%ADD12R,1X2X3*%\
    %ADD13O,1X2*%%ADD14P,1X6X30*%%ADD15C,0.2*%D10*X0Y0D03*%LPC*%D11*X1000000Y0D03*%LPD*%D15*X0Y0D02*G01X2000000D01*\
    G03*X3000000Y1000000I0J1000000D01*G36*X0Y0D02*G01*X500000D01*Y500000D01*X0Y0D01*G37*%SRX2Y2I1J1*%D12*X0Y0D03*%SR*%\
    %ABD20*%D13*X0Y0D03*%AB*%%LR30*%%LMX*%%LS1.5*%D20*X5000000Y0D03*%TO.N,B*%D14*X9000000D03*%TD*%M02*";
const DRILL: &str = "M48\n; #@! TF.FileFunction,Plated,1,1,PTH\nFMAT,2\nMETRIC,TZ\n;FILE_FORMAT=3:3\nT1C0.3\nT2C0.5\n%\nG90\nG05\n\
    T1\nX1000Y2000\nX1.5\nR3X1.0\nT2\nX1.0Y1.0G85X2.0Y2.0\nG00X0Y0\nM15\nG01X1.0\nG03X2.0Y1.0A1.0\nM16\nG05\nT0\nM30\n";
const JOB_FILE: &str =
    r#"{"FilesAttributes":[{"Path":"a.gbr","FileFunction":"Copper,L1,Top","FilePolarity":"Positive"}]}"#;

/// Replace, insert or delete at a place; the bytes are those that matter to the formats, or any.
fn mutated(text: &'static str) -> impl Strategy<Value = Vec<u8>> {
    let byte = prop_oneof![proptest::sample::select(b"%*DGMXYIJ0123456789.-+,$\n".to_vec()), any::<u8>()];
    let edit = (any::<prop::sample::Index>(), 0..4u8, byte);
    proptest::collection::vec(edit, 1..12).prop_map(move |edits| {
        let mut bytes = text.as_bytes().to_vec();
        for (at, what, byte) in edits {
            let k = at.index(bytes.len());
            match what {
                0 => bytes[k] = byte,
                1 => bytes.insert(k, byte),
                2 if bytes.len() > 1 => drop(bytes.remove(k)),
                _ => bytes.truncate((k + 1).max(bytes.len() * 3 / 4)),
            }
        }
        bytes
    })
}

proptest! {
    #![proptest_config(ProptestConfig { cases: 384, failure_persistence: None, ..ProptestConfig::default() })]

    #[test]
    fn gerber_never_panics(bytes in mutated(GERBER)) {
        let _ = import(&[file(0, "a.gtl", bytes)], &job(), &board(1));
    }

    #[test]
    fn drill_never_panics(bytes in mutated(DRILL)) {
        let _ = import(&[file(0, "a.drl", bytes)], &job(), &board(1));
    }

    #[test]
    fn job_file_never_panics(bytes in mutated(JOB_FILE)) {
        let _ = import(&[file(0, "a.gbrjob", bytes)], &job(), &board(1));
    }
}

/// What: the files that are mutated are good themselves, so that the mutations reach everything.
#[test]
fn the_unmutated_files_are_good() {
    let files = [file(0, "a.gtl", GERBER), file(1, "a.drl", DRILL), file(2, "a.gbrjob", JOB_FILE)];
    if let Err(errors) = import(&files, &job(), &board(1)) {
        panic!("{errors}");
    }
}
