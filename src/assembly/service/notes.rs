//! What a reader must know of tanks and cases, said beside the result.

use super::super::listed;
use super::super::load::Loaded;
use super::{Service, State};
use crate::error::Warning;

/// Warnings about the service of an assembly in some states of it.
pub(in crate::assembly) fn notes(
    service: &Service,
    loaded: &Loaded,
    states: &[State],
) -> Vec<Warning> {
    let path = Some(loaded.file.path.to_string_lossy().into_owned());
    let mut out = Vec::new();
    let payload = service.payload();
    if !payload.is_empty() {
        let first = service.cases().iter().find(|c| !c.with.is_empty());
        out.push(Warning {
            kind: "in-cases-only".into(),
            message: format!(
                "{} stand only in the cases that name them in `with`: not counted without a case",
                listed(&payload)
            ),
            path: path.clone(),
            line: first.map(|c| c.line),
            advice: "see the figures of each case, or choose one with --case".into(),
        });
    }
    out.extend(states.iter().flat_map(|s| service.pool_warnings(s)));
    out
}

impl Service {
    /// A warning for every tank whose liquid lies in separate pools in a state.
    pub fn pool_warnings(&self, state: &State) -> Vec<Warning> {
        let of_case = match state.case {
            Some(c) => format!(" in case `{}`", self.cases()[c].name),
            None => String::new(),
        };
        let apart = self.separate_pools(state).into_iter();
        apart
            .map(|(n, pools)| {
                let tank = &self.tanks()[n];
                let volumes: Vec<String> = pools
                    .iter()
                    .map(|p| format!("{:.6} l", p.volume * 1e3))
                    .collect();
                Warning {
                    kind: "separate-pools".into(),
                    message: format!(
                        "the liquid of tank `{}` lies in {} pools{of_case}, taken at one level: {}",
                        tank.path,
                        pools.len(),
                        volumes.join(", ")
                    ),
                    path: Some(tank.place.0.to_string_lossy().into_owned()),
                    line: Some(tank.place.1),
                    advice: "where no pipe joins them, each keeps a level of its own: make each a \
                             [[tank]] with its own fill"
                        .into(),
                }
            })
            .collect()
    }
}
