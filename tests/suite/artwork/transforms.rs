//! Mirrored, rotated, scaled, repeated and cleared images have the areas they must have.

use super::world::{board, import, job, mapped};
use chargeskin::artwork::{Artwork, ArtworkOptions, read};
use std::f64::consts::PI;

const HEAD: &str = "%FSLAX46Y46*%%MOMM*%G75*%ADD10C,1*%%ADD11R,2X1*%%ADD12C,0.2*%\
    %AMTRI*4,1,3,0,0,3,0,0,1,0,0,0*%%ADD13TRI*%%LPD*%G01*";

fn artwork(body: &str) -> Artwork {
    let text = format!("{HEAD}{body}M02*");
    import(&[mapped(0, "L1", text)], &job(), &board(1)).unwrap().value
}

fn area(body: &str) -> f64 {
    let artwork = artwork(body);
    artwork.grid.area(artwork.copper.iter().map(|c| c.region.area()).sum()) * 1e6
}

fn near(found: f64, wanted: f64) {
    // Rounding to 1 nm along outlines of some 20 mm is 2e-5 mm2.
    assert!((found - wanted).abs() < 2e-5, "{found} {wanted}");
}

/// What: LM, LR, LS on a flash, and all three together. Derived: areas scale with the square, else stay.
#[test]
fn apertures_are_mirrored_rotated_and_scaled() {
    near(area("D13*X0Y0D03*"), 1.5);
    near(area("%LMX*%D13*X0Y0D03*"), 1.5);
    near(area("%LMXY*%%LR30*%D13*X0Y0D03*"), 1.5);
    near(area("%LMY*%%LR90*%%LS2*%D13*X0Y0D03*"), 6.0);
    let turned = artwork("%LR90*%D13*X0Y0D03*");
    let bounds = turned.copper[0].region.bounds().unwrap();
    assert_eq!((bounds.lo.x, bounds.hi.x, bounds.lo.y, bounds.hi.y), (-1_000_000, 0, 0, 3_000_000));
    let mirrored = artwork("%LMX*%D13*X0Y0D03*");
    let bounds = mirrored.copper[0].region.bounds().unwrap();
    assert_eq!((bounds.lo.x, bounds.hi.x, bounds.lo.y, bounds.hi.y), (-3_000_000, 0, 0, 1_000_000));
}

/// What: step-repeat, blocks, blocks in blocks, mirrored blocks. Derived: counts times one.
#[test]
fn repeats_and_blocks_multiply() {
    let square = "D11*X0Y0D03*";
    near(area(&format!("%SRX3Y2I3J2*%{square}%SR*%")), 12.0);
    near(area(&format!("%SRX3Y2I3J2*%{square}")), 12.0);
    near(area(&format!("%SRX1Y1I0J0*%{square}")), 2.0);
    near(area(&format!("%ABD20*%{square}X5000000D03*%AB*%D20*X0Y0D03*Y9000000D03*")), 8.0);
    let nested =
        format!("%ABD20*%{square}%AB*%%ABD21*%D20*X0Y0D03*X4000000D03*%AB*%%LMX*%%LR90*%D21*X0Y0D03*");
    near(area(&nested), 4.0);
    near(area(&format!("%ABD20*%%SRX2Y1I3J0*%{square}%SR*%%AB*%D20*X0Y0D03*")), 4.0);
}

/// What: polarity acts in file order, and a clear flash of a block swaps the block's own polarity.
#[test]
fn polarity_is_composited_in_order() {
    let hole = PI / 4.0 * 0.04;
    near(area("D11*X0Y0D03*%LPC*%D12*X0Y0D03*"), 2.0 - hole);
    near(area("%LPC*%D12*X0Y0D03*%LPD*%D11*X0Y0D03*"), 2.0);
    near(area("D11*X0Y0D03*%LPC*%D10*X0Y0D03*%LPD*%D12*X0Y0D03*"), 2.0 - PI / 4.0 + hole);
    let block = "%ABD20*%%LPD*%D10*X0Y0D03*%LPC*%D12*X0Y0D03*%AB*%%LPD*%";
    near(area(&format!("{block}D20*X0Y0D03*")), PI / 4.0 - hole);
    near(area(&format!("{block}D11*X0Y0D03*%LPC*%D20*X0Y0D03*")), 2.0 - PI / 4.0 + hole);
}

/// What: spellings that mean the same give the same copper.
#[test]
fn old_spellings_mean_the_same() {
    let modern = artwork("D10*X0Y0D02*X3000000Y0D01*X3000000Y4000000D01*");
    let modal = artwork("G54D10*X0Y0D02*G1X3000000D01*\r\nY4000000*");
    let crlf = artwork("D10*\rX0Y0D02*\rX+3000000D01*\rY+4000000D01*\r");
    let incremental = artwork("D10*X0Y0D02*G91*X3000000Y0D01*X0Y4000000D01*");
    for other in [modal, crlf, incremental] {
        assert_eq!(modern.copper[0].region, other.copper[0].region);
    }
    let inch = "G70*%FSLAX24Y24*%G90*%ICAS*%%OFA0B0*%%IPPOS*%%ASAXBY*%%MIA0B0*%%SFA1B1*%%IR0*%*%ADD10C,0.1*%D10*X0Y0D03*M00*";
    let read = import(&[mapped(0, "L1", inch)], &job(), &board(1)).unwrap().value;
    near(read.layer_area(read.copper[0].layer) * 1e6, PI / 4.0 * 2.54 * 2.54);
}

/// What: macro primitives and expressions. Derived: areas of the shapes.
#[test]
fn macros_have_their_areas() {
    let flash = |content: &str, values: &str| {
        let text = format!("%FSLAX46Y46*%%MOMM*%%AMM*{content}*%%ADD10M{values}*%D10*X0Y0D03*M02*");
        let options = ArtworkOptions { chord_error: 2e-8, ..ArtworkOptions::default() };
        let read = read(&[mapped(0, "L1", text)], &job(), &board(1), &options).unwrap().value;
        read.layer_area(read.copper[0].layer) * 1e6
    };
    near(flash("1,1,$1,0,0", ",2"), PI);
    near(flash("$3=$1X2*21,1,$3,$2,0,0,45", ",1X2"), 4.0);
    near(flash("20,1,0.5,0,0,3,4,0", ""), 2.5);
    near(flash("2,1,0.5,0,0,3,4,0", ""), 2.5);
    near(flash("22,1,2,3,-1,-1,30", ""), 6.0);
    near(flash("5,1,6,0,0,2,0", ""), 1.5 * 3f64.sqrt());
    near(flash("0 a comment, with $1*21,1,2,2,0,0,0*1,0,1,0,0", ""), 4.0 - PI / 4.0);
    near(flash("21,1,(1+2)x2/3,-(0-1),0,0,0", ""), 2.0);
    // A thermal of diameters 2 and 1 with gaps 0.2: ring less four strips.
    let strip = |r: f64, h: f64| 2.0 * (h * (r * r - h * h).sqrt() + r * r * (h / r).asin());
    near(flash("7,0,0,2,1,0.2,0", ""), PI * 0.75 - 2.0 * (strip(1.0, 0.1) - strip(0.5, 0.1)));
    // A moire: one ring 2 / 1.6 and a cross of 0.1 x 2.
    near(
        flash("6,0,0,2,0.2,0.1,1,0.1,1.6,0", ""),
        PI * (1.0 - 0.64) + 2.0 * 1.6 * 0.1 - 0.01 - (3.2 * 0.1 - 2.0 * strip(0.8, 0.05)),
    );
}

/// What: holes of standard apertures, round and rectangular; a rectangle as a pen.
#[test]
fn holes_and_rectangular_pens() {
    let flash = |definition: &str| area(&format!("%ADD30{definition}*%D30*X0Y0D03*"));
    near(flash("C,2X0.5X0.4"), PI - 0.2);
    near(flash("R,2X1X0.5"), 2.0 - PI / 16.0);
    near(flash("O,2X1X0.5X0.5"), 1.0 + PI / 4.0 - 0.25);
    near(flash("P,2X4X45"), 2.0);
    // A 2 x 1 pen moved by (3, 0) and by (3, 2): hull areas.
    near(area("D11*X0Y0D02*X3000000Y0D01*"), 5.0);
    near(area("D11*X0Y0D02*X3000000Y2000000D01*"), 2.0 + 3.0 * 1.0 + 2.0 * 2.0);
}
