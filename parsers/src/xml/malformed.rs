//! What is wrong with text that is not well-formed XML, in our own words.

use quick_xml::Error;
use quick_xml::errors::{IllFormedError, SyntaxError};
use quick_xml::events::attributes::AttrError;

use crate::names::shorten;

pub(super) fn in_words(why: &Error) -> String {
    match why {
        Error::Syntax(why) => of_syntax(why).to_owned(),
        Error::IllFormed(why) => of_form(why),
        Error::InvalidAttr(why) => format!("an attribute of which {}", of_attribute(why)),
        Error::Namespace(_) => "a namespace prefix that may not be declared so".to_owned(),
        Error::Escape(_) => "a reference that means nothing".to_owned(),
        Error::Encoding(_) => "bytes that are no text in its encoding".to_owned(),
        Error::Io(_) => "it cannot be read to its end".to_owned(),
    }
}

fn of_syntax(why: &SyntaxError) -> &'static str {
    match why {
        SyntaxError::InvalidBangMarkup => "`<!` begins neither a comment nor character data",
        SyntaxError::UnclosedPI => "a processing instruction without its `?>`",
        SyntaxError::UnclosedXmlDecl => "a declaration without its `?>`",
        SyntaxError::UnclosedComment => "a comment without its `-->`",
        SyntaxError::UnclosedDoctype => "a document type without its `>`",
        SyntaxError::UnclosedCData => "character data without its `]]>`",
        SyntaxError::UnclosedTag => "a tag without its `>`",
        SyntaxError::UnclosedSingleQuotedAttributeValue
        | SyntaxError::UnclosedDoubleQuotedAttributeValue => "an attribute without its end quote",
    }
}

fn of_form(why: &IllFormedError) -> String {
    match why {
        IllFormedError::MismatchedEndTag { expected, found } => format!(
            "`</{}>` closes the element `{}`",
            shorten(found),
            shorten(expected)
        ),
        IllFormedError::UnmatchedEndTag(name) => {
            format!("`</{}>` closes an element that is not open", shorten(name))
        }
        IllFormedError::MissingEndTag(name) => {
            format!("the element `{}` is not closed", shorten(name))
        }
        IllFormedError::DoubleHyphenInComment => "`--` inside a comment".to_owned(),
        IllFormedError::UnclosedReference => "`&` without the `;` of a reference".to_owned(),
        IllFormedError::MissingDoctypeName => "a document type without a name".to_owned(),
        IllFormedError::MissingDeclVersion(_) | IllFormedError::UnknownVersion => {
            "a declaration of an unknown version".to_owned()
        }
    }
}

pub(super) fn of_attribute(why: &AttrError) -> String {
    match why {
        AttrError::ExpectedEq(_) => "no `=` follows its name",
        AttrError::ExpectedValue(_) => "no value follows its `=`",
        AttrError::UnquotedValue(_) => "its value stands without quotes",
        AttrError::ExpectedQuote(..) => "its value has no end quote",
        AttrError::Duplicated(..) => "its name stands twice in one tag",
    }
    .to_owned()
}
