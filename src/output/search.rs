//! Which cases of a directed search get a file, and what file a rare finding has.

use crate::circuit::NetId;
use crate::findings::RuleKey;
use crate::instance::Instance;
use crate::proof::Claim;
use crate::review::Review;
use crate::sweep::Finding;

/// Cases with a smaller margin that get a file, at most; all that break a rule do.
const MARGINS: usize = 12;

/// A case with its file.
pub(super) struct CaseFile<'a> {
    /// The question, by number.
    pub question: u32,
    /// The name of the file.
    pub name: String,
    /// The case.
    pub case: &'a Instance,
}

/// The cases of a review's search that are written: those that break a rule in the order of the questions, then of every
/// rule and net the one with the smallest margin, smallest first.
pub(super) fn case_files(review: &Review) -> Vec<CaseFile<'_>> {
    let Some(search) = &review.search else { return Vec::new() };
    let with_case = search.searched.iter().filter_map(|it| Some((it, it.case.as_deref()?)));
    let (broken, mut less): (Vec<_>, Vec<_>) = with_case.partition(|(it, _)| it.breach.is_some());
    less.sort_by_key(|(it, _)| (it.margin, it.question));
    let mut seen: Vec<(RuleKey, u32, Option<NetId>)> = Vec::new();
    less.retain(|(it, _)| {
        let question = &review.asked.questions[it.question as usize];
        let key = (question.rule, question.index, question.net);
        let new = !seen.contains(&key);
        seen.push(key);
        new
    });
    less.truncate(MARGINS);
    let all = broken.into_iter().chain(less).enumerate();
    all.map(|(n, (it, case))| CaseFile { question: it.question, name: format!("worst-{}.toml", n + 1), case }).collect()
}

/// The file of a question's case.
pub(super) fn file_of<'a>(files: &'a [CaseFile<'_>], question: Option<u32>) -> Option<&'a str> {
    files.iter().find(|it| Some(it.question) == question).map(|it| it.name.as_str())
}

/// The claim that a rare finding refutes.
pub(super) fn rare_claim<'a>(review: &'a Review, finding: &Finding) -> Option<&'a Claim> {
    let question = finding.subject.question.filter(|_| finding.rare)?;
    review.proof.as_ref()?.claims.iter().find(|claim| claim.question == question)
}

/// The file of the witness of a rare finding.
pub(super) fn rare_file(review: &Review, finding: &Finding) -> Option<String> {
    let question = rare_claim(review, finding)?.question;
    let proof = review.proof.as_ref()?;
    let mut files = proof.claims.iter().zip(proof.witness_files());
    files.find(|(claim, _)| claim.question == question).and_then(|(_, file)| file)
}
