//! A recording's health as a few lines to read.

use std::fmt;

use super::finding::Verdict;
use super::health::Health;

impl fmt::Display for Health {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let (width, height) = self.size;
        let what = match (&self.pairs[..], self.of) {
            ([one], 1) => format!("pair {}", one.index),
            ([one], of) => format!("pair {} of {of}", one.index),
            (some, of) => format!("{} of {of} pairs", some.len()),
        };
        let count = |verdict, word: &str| match self.count(verdict) {
            1 => format!("1 {word}"),
            n => format!("{n} {word}s"),
        };
        write!(
            f,
            "health of {what}, {width} x {height} px: {}, {}",
            count(Verdict::Warning, "warning"),
            count(Verdict::Note, "note")
        )?;
        let longest = self.findings.iter().map(|f| f.subject.len()).max();
        let subject = longest.unwrap_or(0);
        for finding in &self.findings {
            let verdict = finding.verdict.text();
            write!(
                f,
                "\n  {verdict:<7}  {:<subject$}  {}",
                finding.subject, finding.text
            )?;
            if !finding.remedy.is_empty() {
                write!(f, "\n  {:<7}  {:<subject$}  - {}", "", "", finding.remedy)?;
            }
        }
        Ok(())
    }
}
