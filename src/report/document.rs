//! report.json, read back: the only thing that the page is made of.

use serde_json::Value;

use crate::failure::RequestError;
use crate::figures::{Figures, SCHEMA};

/// A report.json that can be drawn.
#[derive(Clone, Debug)]
pub struct Document {
    pub figures: Figures,
}

impl Document {
    /// Reads the text of a report.json, known to a person as `name`.
    ///
    /// # Errors
    /// [`RequestError`] where it is no JSON, of another schema, cut short or no report.
    pub fn read(name: &str, json: &str) -> Result<Document, RequestError> {
        let refuse = |why: String| {
            let remedy = "make it again with `platewright compare`, which writes the page too";
            RequestError::new(format!("{name} cannot be drawn: {why}"), remedy)
        };
        let value: Value = serde_json::from_str(json).map_err(|error| refuse(format!("it is damaged: {error}")))?;
        match value.get("schema").and_then(Value::as_u64) {
            Some(schema) if schema == u64::from(SCHEMA) => {}
            Some(schema) => return Err(refuse(format!("it has schema {schema}, and this version reads {SCHEMA}"))),
            None => return Err(refuse("it names no schema, so it is no report of this program".to_owned())),
        }
        if value.get("configurations").and_then(Value::as_array).is_none_or(Vec::is_empty) {
            return Err(refuse("it holds no configuration".to_owned()));
        }
        let figures: Figures =
            serde_json::from_value(value).map_err(|error| refuse(format!("it is damaged: {error}")))?;
        Ok(Document { figures })
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn refusal(json: &str) -> String {
        match Document::read("report.json", json) {
            Err(RequestError::Refused { problem, .. }) => problem,
            other => panic!("{other:?}"),
        }
    }

    #[test]
    fn what_cannot_be_drawn_is_refused_with_the_reason() {
        assert!(refusal("").contains("damaged"));
        assert!(refusal("{\"schema\":1,\"configurations\":[{\"name\":").contains("damaged"));
        assert!(refusal("[1, 2]").contains("no schema"));
        assert!(refusal("{\"schema\":2,\"configurations\":[]}").contains("schema 2"));
        assert!(refusal("{\"schema\":1,\"configurations\":[]}").contains("no configuration"));
        let missing = refusal("{\"schema\":1,\"title\":null,\"configurations\":[{\"name\":\"a\"}]}");
        assert!(missing.contains("operating_point"), "{missing}");
    }
}
