//! Puts the figures of a netlist together, case by case, in the order of the contract.

use super::looked_at::{self, Loop, Time, Transfer};
use super::modes::{self, ModeFigure};
use super::requirements::{self, Bound, Subject, Verdict};
use super::stability::Stability;
use super::tell;
use crate::algebra::{Fraction, IBig};
use crate::diagnostics::{Code, Diagnostic};
use crate::flow::forms::{CaseLaws, Forms};
use crate::flow::system::Question;
use crate::netlist::{
    Asked, CaseId, Clauses, Metric, Netlist, Pair, RequestKind, Requirement, RequirementKind, SignalId,
};
use crate::results::assess::{Absent, CaseFigures, RequirementFigure};
use crate::source::Span;

/// What an assessment gives.
#[derive(Clone, Debug, Default)]
pub struct Assessed {
    /// Figures case by case; files and lines of requirements are not filled in yet.
    pub cases: Vec<CaseFigures>,
    /// What could not be worked out, and why.
    pub diagnostics: Vec<Diagnostic>,
}

/// Assesses nominal and each case that an `in` names.
pub(super) fn assess(netlist: &Netlist) -> Assessed {
    let mut forms = match Forms::new(netlist) {
        Ok(forms) => forms,
        Err(diagnostic) => return Assessed { cases: Vec::new(), diagnostics: vec![diagnostic] },
    };
    let asked = Questions::new(&mut forms);
    let mut out = Assessed::default();
    for case in asked.cases(&forms) {
        if let Some(laws) = forms.laws(case) {
            out.cases.extend(of_case(&mut forms, &laws, &asked, case));
        }
    }
    out.diagnostics = forms.diagnostics;
    out
}

/// Requests and requirements with the cases for which they are asked.
struct Questions<'n> {
    requests: Vec<(&'n RequestKind, &'n Clauses, Span, Vec<Option<CaseId>>)>,
    requirements: Vec<(&'n Requirement, Vec<Option<CaseId>>)>,
}

impl<'n> Questions<'n> {
    fn new(forms: &mut Forms<'n>) -> Self {
        let net = forms.netlist();
        let requests =
            net.requests.iter().map(|r| (&r.kind, &r.clauses, r.span, forms.cases_of(&r.clauses.cases, r.span)));
        let requests = requests.collect();
        let requirements = net.requirements.iter().map(|r| (r, forms.cases_of(&r.clauses.cases, r.span))).collect();
        Self { requests, requirements }
    }

    /// All cases that are asked for, nominal first; nominal itself is left out where nothing asks for it and `in all`
    /// left it out for want of a value.
    fn cases(&self, forms: &Forms<'n>) -> Vec<Option<CaseId>> {
        let lists = self.requests.iter().map(|r| &r.3).chain(self.requirements.iter().map(|r| &r.1));
        let mut all: Vec<Option<CaseId>> = lists.flatten().copied().collect();
        if !forms.diagnostics.iter().any(|d| d.code == Code::ParameterWithoutValue) {
            all.push(None);
        }
        all.sort_unstable();
        all.dedup();
        all
    }
}

/// The figures of one case while they are gathered.
struct Gathered<'f, 'n> {
    forms: &'f mut Forms<'n>,
    laws: &'f CaseLaws<'n>,
    time: Time,
    loops: Vec<Loop>,
    transfers: Vec<Transfer>,
}

fn signals(asked: &[Asked]) -> (Vec<SignalId>, Vec<String>) {
    let mut list: Vec<(SignalId, String)> = asked.iter().map(|a| (a.signal, a.text.clone())).collect();
    list.sort_by_key(|a| a.0);
    list.dedup_by_key(|a| a.0);
    list.into_iter().unzip()
}

impl Gathered<'_, '_> {
    /// The place of a loop in the list, worked out where it is new; `None`, and told, where it can't be.
    fn loop_at(&mut self, at: &Asked, open: &[Asked], span: Span) -> Option<usize> {
        let open = signals(open);
        if let Some(place) = self.loops.iter().position(|l| l.at == at.signal && l.open == open.0) {
            return Some(place);
        }
        let form = self.forms.return_ratio(self.laws, at.signal, &open.0, span)?;
        self.loops.push(Loop::new((at.signal, at.text.clone()), open, &form, self.laws, &self.time)?);
        Some(self.loops.len() - 1)
    }

    /// The place of a transfer function in the list.
    fn transfer(&mut self, to: &Asked, from: &Asked, open: &[Asked], span: Span) -> Option<usize> {
        let open = signals(open);
        let same = |t: &Transfer| t.to.0 == to.signal && t.from.0 == from.signal && t.open == open.0;
        if let Some(place) = self.transfers.iter().position(same) {
            return Some(place);
        }
        let question = Question { from: from.signal, to: to.signal, open: &open.0 };
        let form = self.forms.transfer(self.laws, &question, span)?;
        let ends = ((to.signal, to.text.clone()), (from.signal, from.text.clone()));
        self.transfers.push(Transfer::new(ends.0, ends.1, open, &form, self.laws, &self.time)?);
        Some(self.transfers.len() - 1)
    }

    fn request(&mut self, kind: &RequestKind, clauses: &Clauses, span: Span) {
        let net = self.forms.netlist();
        match kind {
            RequestKind::Transfer { to, from } => {
                self.transfer(to, from, &clauses.open, span);
            }
            RequestKind::All => {
                let named = |signal| Asked { signal, text: net.signal_name(signal).to_owned() };
                for to in net.outputs() {
                    for from in net.inputs() {
                        self.transfer(&named(to), &named(from), &clauses.open, span);
                    }
                }
            }
            // Of several signals: each loop with the others closed.
            RequestKind::Loop { at } => {
                for at in at {
                    self.loop_at(at, &clauses.open, span);
                }
            }
            // Zeros are told by `derive`.
            RequestKind::Zeros { .. } => {}
        }
    }
}

/// The loop or the transfer function of which a metric is.
enum Of<'m> {
    Modes,
    Loop(&'m Asked),
    Transfer(&'m Pair),
}

fn subject(metric: &Metric) -> Of<'_> {
    match metric {
        Metric::GainMargin(at)
        | Metric::PhaseMargin(at)
        | Metric::DelayMargin(at)
        | Metric::ModulusMargin(at)
        | Metric::Crossover(at) => Of::Loop(at),
        Metric::Peak(pair)
        | Metric::Bandwidth(pair)
        | Metric::Magnitude(pair, ..)
        | Metric::Overshoot(pair)
        | Metric::RiseTime(pair)
        | Metric::SettlingTime(pair, _)
        | Metric::FinalValue(pair, _) => Of::Transfer(pair),
        Metric::DampingRatio | Metric::DecayRate => Of::Modes,
    }
}

fn of_case<'n>(
    forms: &mut Forms<'n>,
    laws: &CaseLaws<'n>,
    asked: &Questions<'n>,
    case: Option<CaseId>,
) -> Option<CaseFigures> {
    let time = if forms.is_sampled() { Time::Sampled(forms.period(laws)?) } else { Time::Continuous };
    let whole = forms.whole(laws)?;
    let whole = looked_at::quasi(&whole, laws)?;
    let stability = looked_at::count(&whole, &time);
    let name = forms.name_of(case);
    let mut gathered = Gathered { forms, laws, time: time.clone(), loops: Vec::new(), transfers: Vec::new() };
    for (kind, clauses, span, _) in asked.requests.iter().filter(|r| r.3.contains(&case)) {
        gathered.request(kind, clauses, *span);
    }
    let mut subjects = Vec::new();
    for (requirement, _) in asked.requirements.iter().filter(|r| r.1.contains(&case)) {
        let open = &requirement.clauses.open;
        let place = match &requirement.kind {
            RequirementKind::Stable => Some(0),
            RequirementKind::Figure { metric, .. } => match subject(metric) {
                Of::Modes => Some(0),
                Of::Loop(at) => gathered.loop_at(at, open, requirement.span),
                Of::Transfer(pair) => gathered.transfer(&pair.to, &pair.from, open, requirement.span),
            },
        };
        subjects.push((*requirement, place));
    }
    let Gathered { loops, transfers, forms, .. } = gathered;
    let shown: Vec<(String, Vec<IBig>)> = transfers
        .iter()
        .filter(|t| t.open.is_empty())
        .map(|t| (format!("{}/{}", t.to.1, t.from.1), t.shown()))
        .chain(
            loops
                .iter()
                .filter(|l| l.open.is_empty())
                .map(|l| (format!("loop at {}", l.text), looked_at::shown(&l.shown))),
        )
        .collect();
    let polynomial = looked_at::shown(&whole);
    let mut absent = Absent::new();
    let found = modes::modes(&polynomial, &time, &shown);
    let complete = match (&found, whole.terms.len()) {
        (Err(why), _) => Err(why.clone()),
        (Ok(_), 0 | 1) => Ok(()),
        (Ok(_), _) => Err("dead time in a loop makes the modes infinitely many".to_owned()),
    };
    if let Err(why) = &complete {
        absent.insert("modes", why.clone());
    }
    let modes = found.unwrap_or_default();
    let judged = subjects
        .into_iter()
        .map(|(requirement, place)| {
            let verdict = judge(
                forms,
                laws,
                requirement,
                place,
                &stability,
                (&modes, &polynomial, &complete),
                &loops,
                &transfers,
            );
            figure(requirement, verdict)
        })
        .collect();
    Some(CaseFigures {
        name,
        variable: if matches!(time, Time::Continuous) { "s" } else { "z" },
        stability: tell::stability(&stability, &time),
        modes: modes.iter().map(tell::mode).collect(),
        absent,
        loops: loops.iter().map(tell::one_loop).collect(),
        transfers: transfers.iter().map(tell::transfer).collect(),
        requirements: judged,
    })
}

/// All modes, their polynomial, and whether there are no others.
type AllModes<'f> = (&'f [ModeFigure], &'f [IBig], &'f Result<(), String>);

fn plain(holds: bool, why: Option<String>) -> Verdict {
    Verdict { holds, value: None, unit: None, required: None, slack: None, frequency: None, why }
}

#[allow(clippy::too_many_arguments)] // the figures of one case, each of a kind of its own
fn judge<'n>(
    forms: &mut Forms<'n>,
    laws: &CaseLaws<'n>,
    requirement: &'n Requirement,
    place: Option<usize>,
    stability: &Stability,
    (modes, polynomial, complete): AllModes<'_>,
    loops: &[Loop],
    transfers: &[Transfer],
) -> Verdict {
    let RequirementKind::Figure { metric, comparison, bound, unit } = &requirement.kind else {
        return plain(stability.stable, (!stability.stable).then(|| unstable(stability)));
    };
    let Some(place) = place else { return plain(false, Some("it can't be worked out".to_owned())) };
    let subject = match subject(metric) {
        Of::Modes => Subject::Modes(modes, polynomial, complete),
        Of::Loop(_) => Subject::Loop(&loops[place]),
        Of::Transfer(_) => Subject::Transfer(&transfers[place]),
    };
    let mut value = |expr| match laws.evaluate(expr) {
        Ok(value) => {
            for param in laws.symbols(&value) {
                let name = forms.netlist().param_name(param).to_owned();
                let told =
                    Diagnostic::new(Code::ParameterWithoutValue, format!("a requirement needs a number for `{name}`"))
                        .label(requirement.span, "required here")
                        .help(format!("give it a value: `param {name} = 1`, in a `case`, or by `--set {name}=1`"));
                forms.tell(told);
            }
            value
        }
        Err(told) => {
            forms.tell(*told);
            Fraction::zero()
        }
    };
    let scale = unit.as_ref().map_or_else(Fraction::one, |u| value(u.scale));
    let bound = Bound { comparison: *comparison, value: value(*bound), unit: unit.as_ref(), scale };
    requirements::judge(metric, &subject, laws, &bound)
}

/// Why the whole is not stable, in words.
pub(super) fn unstable(s: &Stability) -> String {
    if let Some(why) = &s.why {
        return why.clone();
    }
    let count = |n: Option<usize>, place: &str| match n {
        Some(1) => Some(format!("1 mode {place}")),
        Some(n) if n > 1 => Some(format!("{n} modes {place}")),
        _ => None,
    };
    let parts: Vec<String> =
        [count(s.outside, "that grow"), count(s.on, "that neither grow nor decay")].into_iter().flatten().collect();
    let text = parts.join(" and ");
    text.replace("1 mode that grow", "1 mode that grows")
        .replace("1 mode that neither grow nor decay", "1 mode that neither grows nor decays")
}

fn figure(requirement: &Requirement, v: Verdict) -> RequirementFigure {
    RequirementFigure {
        text: requirement.text.clone(),
        file: String::new(),
        line: 0,
        holds: v.holds,
        value: v.value,
        unit: v.unit,
        required: v.required,
        slack: v.slack,
        frequency: v.frequency,
        why: v.why,
        span: requirement.span,
    }
}
