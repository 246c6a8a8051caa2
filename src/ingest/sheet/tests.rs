//! Sheets right and wrong on purpose.

use proptest::prelude::*;

use super::*;
use crate::model::Sex;

fn problems(text: &str) -> Vec<String> {
    parse_sheet(text.as_bytes())
        .unwrap_err()
        .iter()
        .map(|p| format!("{}: {} ({})", p.row.unwrap_or(0), p.what, p.cure))
        .collect()
}

fn rows(text: &str) -> Vec<SheetRow> {
    parse_sheet(text.as_bytes()).unwrap().0
}

const PLAIN: &str = "sample\tpopulation\tyear\nA1\tAlder\t2003\nA2\tAlder\t2019.5\n";

#[test]
fn tabs_commas_semicolons_byte_order_mark_and_crlf_read_alike() {
    let expected = rows(PLAIN);
    assert_eq!(expected.len(), 2);
    assert_eq!(
        (expected[1].visit.as_str(), expected[1].year),
        ("2019.5", 2019.5)
    );
    for delimiter in [",", ";", "\t"] {
        let text = PLAIN.replace('\t', delimiter);
        assert_eq!(rows(&text), expected);
        assert_eq!(
            rows(&format!("\u{feff}{}", text.replace('\n', "\r\n"))),
            expected
        );
    }
}

#[test]
fn every_column_is_read() {
    let text = "Batch,replicate_of,generation,SEX,visit,year,population,sample,remark\n\
                b1,,0,F,founding,2003,Alder,A1,\"big, old\"\n\
                b2,A1,NA,unknown,,2003.0,Alder,A1b,\n";
    let rows = rows(text);
    assert_eq!(rows[0].sex, Some(Sex::Female));
    assert_eq!(
        (rows[0].visit.as_str(), rows[0].generation),
        ("founding", Some(0.0))
    );
    assert_eq!(rows[0].batch.as_deref(), Some("b1"));
    assert_eq!(
        (rows[1].visit.as_str(), rows[1].generation, rows[1].sex),
        ("2003", None, None)
    );
    assert_eq!(rows[1].replicate_of.as_deref(), Some("A1"));
    assert_eq!(rows[1].row, 3);
}

#[test]
fn dates_alone_are_fractional_years_and_beside_years_whole_ones() {
    let alone = rows("sample,population,date\nA1,Alder,2019-07-02\n");
    assert_eq!(alone[0].year, 2019.0 + 182.0 / 365.0);
    assert_eq!(alone[0].visit, "2019");
    let beside = rows("sample,population,year,date\nA1,Alder,,2019-07-02\nA2,Alder,2003,\n");
    assert_eq!((beside[0].year, beside[1].year), (2019.0, 2003.0));
}

#[test]
fn all_problems_are_told_at_once_in_the_order_of_the_file() {
    let text = "sample,population,year,sex,generation,replicate_of\n\
                A1,Alder,2003,F,0,\n\
                ,Alder,2003,,,\n\
                A2,,2003,,,\n\
                A3,Alder,,,,\n\
                A4,Alder,last,X,F1,A9\n\
                A1,Birch,2003,,,A1\n\
                A5,Al@der,2003\n\
                A6,Al@der,2003,,,\n\
                A1,Alder,2003,,,A4\n";
    let told = problems(text);
    let expected = [
        "3: sample is blank",
        "4: population is blank",
        "5: year is blank",
        "6: year 'last' is not a number",
        "6: sex 'X' is not known",
        "6: generation 'F1' is not a number",
        "6: replicate_of names 'A9', which the sheet does not list",
        "7: sample 'A1' is listed in row 2 already, there under population 'Alder', here under 'Birch'",
        "7: sample 'A1' is a replicate of itself",
        "8: the row has 3 columns, the header row has 6",
        "9: population 'Al@der' holds '@'",
        "10: sample 'A1' is listed in row 2 already (keep one row",
        "10: replicate_of names 'A4', which is a replicate itself",
    ];
    assert_eq!(told.len(), expected.len(), "{told:#?}");
    for (told, expected) in told.iter().zip(expected) {
        assert!(told.starts_with(expected), "{told}\n{expected}");
    }
}

#[test]
fn a_missing_column_does_not_hide_other_problems() {
    let told = problems("Sample,pop,year\nA1,Alder,soon\n,Alder,2003\n");
    assert_eq!(told.len(), 3, "{told:#?}");
    assert!(
        told[0].contains("if 'pop' is meant, name it 'population'"),
        "{told:?}"
    );
}

#[test]
fn empty_sheets_and_headers_alone() {
    assert!(problems("")[0].contains("the file is empty"));
    assert!(problems("sample,population,year\n")[0].contains("no sample below"));
}

#[test]
fn text_that_is_not_utf8_is_told_with_row_and_column() {
    let mut bytes = b"sample,population,year,remark\nA1,Alder,2003,\nA2,R".to_vec();
    bytes.extend([0xF8, b'd']);
    bytes.extend(b",2003,sm\xE5\n");
    let told = parse_sheet(&bytes).unwrap_err();
    assert_eq!(told.len(), 1, "a free column is ignored: {told:?}");
    assert_eq!(
        (told[0].row, told[0].what.as_str()),
        (Some(3), "population is not UTF-8 text")
    );
}

#[test]
fn a_date_that_disagrees_and_blank_times_are_told() {
    let told = problems(
        "sample,population,year,date\nA1,Alder,2003,2004-01-01\nA2,Alder,,\nA3,Alder,,soon\n",
    );
    assert!(
        told[0].starts_with("2: year 2003 and date in 2004 disagree"),
        "{told:?}"
    );
    assert!(told[1].starts_with("3: year is blank"), "{told:?}");
    assert!(told[2].starts_with("4: date 'soon'"), "{told:?}");
    assert_eq!(told.len(), 3);
}

#[test]
fn oddities_are_notes() {
    let text = "sample,population,year,replicate_of\nA1,Alder,203,\n,,,\nB1,Birch,2019,A1\n";
    let codes: Vec<&str> = parse_sheet(text.as_bytes())
        .unwrap()
        .1
        .iter()
        .map(|note| note.code)
        .collect();
    assert_eq!(
        codes,
        ["blank_rows", "unusual_years", "replicate_elsewhere"]
    );
}

// SHA-256 of "abc": FIPS 180-4 example; here the digest is of a whole sheet, so only its shape and
// its dependence on every byte are checked beside that of a known string.
#[test]
fn digest_and_size_are_those_of_the_file() {
    let known: String = Sha256::digest(b"abc")
        .iter()
        .map(|b| format!("{b:02x}"))
        .collect();
    assert_eq!(
        known,
        "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad"
    );
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("samples.tsv");
    std::fs::write(&path, PLAIN).unwrap();
    let sheet = read_sheet(&path).unwrap();
    assert_eq!((sheet.bytes, sheet.digest.len()), (PLAIN.len() as u64, 64));
    std::fs::write(&path, format!("{PLAIN}\n")).unwrap();
    assert_ne!(read_sheet(&path).unwrap().digest, sheet.digest);
    let absent = read_sheet(&folder.path().join("absent.tsv")).unwrap_err();
    assert_eq!(absent.exit_code(), 1);
}

// Open data: a tab-delimited sheet with blank sexes and a free column.
#[test]
fn a_real_sheet_reads_without_problems() {
    let path = Path::new(env!("CARGO_MANIFEST_DIR")).join("../shared/data/snail/samples.tsv");
    if !path.exists() {
        eprintln!("SKIPPED: no open data at {}", path.display());
        return;
    }
    let sheet = read_sheet(&path).unwrap();
    let lines = std::fs::read_to_string(&path).unwrap().lines().count();
    assert_eq!(sheet.rows.len(), lines - 1);
}

proptest! {
    /// Any bytes give rows or problems, never a panic.
    #[test]
    fn any_bytes_are_read_or_refused(bytes in proptest::collection::vec(any::<u8>(), 0..300)) {
        let _ = parse_sheet(&bytes);
    }

    /// Any arrangement of sheet-like pieces gives rows or problems, and problems name rows in order.
    #[test]
    fn sheet_like_text_is_read_or_refused(
        pieces in proptest::collection::vec(
            prop_oneof![
                Just("A1"), Just("A2"), Just("Alder"), Just("2003"), Just(","), Just(","),
                Just("\n"), Just("\r\n"), Just("\""), Just("\t"), Just("@"), Just("NA"),
            ],
            0..60,
        )
    ) {
        let text = format!("sample,population,year\n{}", pieces.concat());
        match parse_sheet(text.as_bytes()) {
            Ok((rows, _)) => prop_assert!(!rows.is_empty()),
            Err(problems) => {
                prop_assert!(!problems.is_empty());
                prop_assert!(problems.windows(2).all(|w| w[0].row <= w[1].row));
            }
        }
    }
}
