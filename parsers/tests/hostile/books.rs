//! The crafted workbooks, each with what must be told of it.

use std::io::{Cursor, Write};

use fs_err as fs;
use zip::ZipWriter;
use zip::write::SimpleFileOptions;

const RELATIONS: &str =
    r#"<Relationships xmlns="http://schemas.openxmlformats.org/package/2006/relationships">"#;
const OFFICE: &str = "http://schemas.openxmlformats.org/officeDocument/2006/relationships";
const MAIN: &str = "http://schemas.openxmlformats.org/spreadsheetml/2006/main";

/// A part that is written piece by piece: a head, a piece so many times, a tail.
struct Part<'a> {
    name: &'a str,
    head: String,
    piece: Vec<u8>,
    times: usize,
    tail: &'a str,
}

fn part<'a>(
    name: &'a str,
    head: impl Into<String>,
    piece: &[u8],
    times: usize,
    tail: &'a str,
) -> Part<'a> {
    Part {
        name,
        head: head.into(),
        piece: piece.to_vec(),
        times,
        tail,
    }
}

fn whole<'a>(name: &'a str, text: &str) -> Part<'a> {
    part(name, text, b"", 0, "")
}

fn archive(parts: &[Part<'_>]) -> Vec<u8> {
    let mut zip = ZipWriter::new(Cursor::new(Vec::new()));
    let options = SimpleFileOptions::default().compression_level(Some(1));
    for part in parts {
        zip.start_file(part.name, options).unwrap();
        zip.write_all(part.head.as_bytes()).unwrap();
        let many = part.piece.repeat(4096);
        for _ in 0..part.times / 4096 {
            zip.write_all(&many).unwrap();
        }
        for _ in 0..part.times % 4096 {
            zip.write_all(&part.piece).unwrap();
        }
        zip.write_all(part.tail.as_bytes()).unwrap();
    }
    zip.finish().unwrap().into_inner()
}

/// Bytes that do not deflate, so that the archive is not refused for deflating too well.
fn ballast(length: usize) -> Vec<u8> {
    let mut state = 0x9E37_79B9_7F4A_7C15_u64;
    (0..length)
        .map(|_| {
            state ^= state << 13;
            state ^= state >> 7;
            state ^= state << 17;
            (state >> 32) as u8
        })
        .collect()
}

fn xlsx(sheet: Part<'_>, texts: Part<'_>, ballast_bytes: usize) -> Vec<u8> {
    let content = "<Types xmlns=\"http://schemas.openxmlformats.org/package/2006/content-types\"/>";
    let root = format!(
        "{RELATIONS}<Relationship Id=\"r1\" Type=\"{OFFICE}/officeDocument\" Target=\"xl/workbook.xml\"/></Relationships>"
    );
    let book = format!(
        "<workbook xmlns=\"{MAIN}\" xmlns:r=\"{OFFICE}\"><sheets><sheet name=\"S\" sheetId=\"1\" r:id=\"r1\"/></sheets></workbook>"
    );
    let relations = format!(
        "{RELATIONS}<Relationship Id=\"r1\" Type=\"{OFFICE}/worksheet\" Target=\"worksheets/sheet1.xml\"/><Relationship Id=\"r2\" Type=\"{OFFICE}/sharedStrings\" Target=\"sharedStrings.xml\"/></Relationships>"
    );
    archive(&[
        whole("[Content_Types].xml", content),
        whole("_rels/.rels", &root),
        whole("xl/workbook.xml", &book),
        whole("xl/_rels/workbook.xml.rels", &relations),
        sheet,
        texts,
        part("xl/media/image1.png", "", &ballast(ballast_bytes), 1, ""),
    ])
}

fn sheet(piece: &str, times: usize) -> Part<'static> {
    part(
        "xl/worksheets/sheet1.xml",
        format!(
            "<worksheet xmlns=\"{MAIN}\"><sheetData><row r=\"1\"><c t=\"inlineStr\"><is><t>part</t></is></c><c t=\"inlineStr\"><is><t>value</t></is></c></row>"
        ),
        piece.as_bytes(),
        times,
        "</sheetData></worksheet>",
    )
}

fn texts(piece: &str, times: usize) -> Part<'static> {
    part(
        "xl/sharedStrings.xml",
        format!("<sst xmlns=\"{MAIN}\">"),
        piece.as_bytes(),
        times,
        "</sst>",
    )
}

fn ods(rows: &str, piece: &str, times: usize, ballast_bytes: usize) -> Vec<u8> {
    const NAMES: &str = "urn:oasis:names:tc:opendocument:xmlns";
    archive(&[
        whole("mimetype", "application/vnd.oasis.opendocument.spreadsheet"),
        whole("META-INF/manifest.xml", "<manifest/>"),
        part(
            "content.xml",
            format!(
                "<office:document-content xmlns:office=\"{NAMES}:office:1.0\" xmlns:table=\"{NAMES}:table:1.0\" xmlns:text=\"{NAMES}:text:1.0\"><office:body><office:spreadsheet><table:table table:name=\"S\">{rows}"
            ),
            piece.as_bytes(),
            times,
            "</table:table-row></table:table></office:spreadsheet></office:body></office:document-content>",
        ),
        part("Pictures/1.png", "", &ballast(ballast_bytes), 1, ""),
    ])
}

fn fixture(name: &str) -> Vec<u8> {
    fs::read(format!(
        "{}/../fixtures/exports/workbooks/{name}",
        env!("CARGO_MANIFEST_DIR")
    ))
    .unwrap()
}

/// A crafted workbook: its name, how it is made, and a piece of what is told of it.
pub(crate) type Crafted = (&'static str, fn() -> Vec<u8>, &'static str);

const MIB: usize = 1 << 20;

fn few() -> Part<'static> {
    texts("<si><t>a</t></si>", 1)
}

pub(crate) const ALL: [Crafted; 10] = [
    ("far.xlsx", || fixture("far-xlsxwriter.xlsx"), "1 read"),
    ("far.xls", || fixture("far-xlwt.xls"), "spans so much"),
    (
        "repeats.ods",
        || fixture("repeats-odfpy.ods"),
        "more than 8388608 cells",
    ),
    (
        "zip-bomb.xlsx",
        || xlsx(sheet(" ", 100 * MIB), few(), 0),
        "text of more than",
    ),
    (
        "one-text.xlsx",
        || xlsx(sheet("x", 100 * MIB), few(), MIB),
        "a text of more than",
    ),
    (
        "more-texts.xlsx",
        || xlsx(sheet("", 0), texts("<si><t>a</t></si>", 4 * MIB), MIB),
        "table of texts",
    ),
    (
        "columns.xlsx",
        || xlsx(sheet("<c><v>1</v></c>", MIB), few(), MIB),
        "columns",
    ),
    (
        "columns.ods",
        || {
            ods(
                "<table:table-row>",
                "<table:table-cell office:value-type=\"float\" office:value=\"1\"/>",
                MIB,
                MIB,
            )
        },
        "columns",
    ),
    (
        "deep.ods",
        || ods("<table:table-row>", "<text:p>", 100_000, MIB),
        "nested deeper",
    ),
    (
        "a-record-of-256-MB.xlsb",
        || archive(&[part("xl/workbook.bin", "", b"\x01\xff\xff\xff\x7f", 1, "")]),
        "within a record",
    ),
];
