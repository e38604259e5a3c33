//! Node values brought together at a site.

use crate::model::{CoastRule, Flag, FlagSet, Missing, NodeId, SpatialRule, Stencil};
use crate::units::{ComingFrom, Compass};

/// Wind at the nodes of one step, as components; a source without direction has a speed alone.
#[derive(Debug)]
pub struct NodeWinds<'a> {
    /// Nodes in increasing order.
    pub nodes: &'a [NodeId],
    /// First number of each node: component towards the east, or speed, m/s.
    pub first: &'a [f64],
    /// Second number: component towards the north, m/s, or the direction it comes from, degrees; empty for speed alone.
    pub second: &'a [f64],
    /// Whether the second number is a direction.
    pub second_is_direction: bool,
    /// Whether a node's numbers are preliminary; empty where none is.
    pub preliminary: &'a [bool],
}

/// Wind at a site at one step.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct SiteStep {
    /// Component towards the east, m/s; NaN for speed alone.
    pub eastward_m_s: f64,
    /// Component towards the north, m/s.
    pub northward_m_s: f64,
    /// Speed interpolated as a scalar, m/s.
    pub scalar_speed_m_s: f64,
}

impl NodeWinds<'_> {
    /// The flags of a node's numbers.
    fn flags(&self, node: NodeId) -> FlagSet {
        let place = self.nodes.binary_search(&node).ok();
        match place.and_then(|place| self.preliminary.get(place)) {
            Some(true) => FlagSet::of(Flag::PreliminaryVersion),
            _ => FlagSet::default(),
        }
    }

    /// Components and speed at a node; `None` where either number is missing.
    fn at(&self, node: NodeId) -> Option<SiteStep> {
        let place = self.nodes.binary_search(&node).ok()?;
        let first = self.first[place];
        if self.second.is_empty() {
            let speed = Some(first).filter(|speed| speed.is_finite() && *speed >= 0.0)?;
            return Some(SiteStep { eastward_m_s: f64::NAN, northward_m_s: f64::NAN, scalar_speed_m_s: speed });
        }
        let second = self.second[place];
        let (eastward_m_s, northward_m_s) = if self.second_is_direction {
            if first == 0.0 {
                (0.0, 0.0)
            } else {
                Compass::<ComingFrom>::from_degrees(second).ok()?.components(Some(first).filter(|speed| *speed > 0.0)?)
            }
        } else {
            (first, second)
        };
        let speed = libm::hypot(eastward_m_s, northward_m_s);
        speed.is_finite().then_some(SiteStep { eastward_m_s, northward_m_s, scalar_speed_m_s: speed })
    }
}

/// Wind at a site from its stencil, with the flags that this step adds.
///
/// # Errors
/// The reason, when nodes that the rule needs are missing.
pub fn wind_at_site(
    stencil: &Stencil,
    rule: &SpatialRule,
    winds: &NodeWinds<'_>,
) -> Result<(SiteStep, FlagSet), Missing> {
    if let SpatialRule::Nearest { .. } = rule {
        let first = stencil.nodes.iter().find_map(|(node, _)| Some((winds.at(*node)?, winds.flags(*node))));
        return first.ok_or(Missing::LandOrMissing);
    }
    let keeps_rest = !matches!(rule, SpatialRule::Bilinear(CoastRule::Missing));
    let mut sum = SiteStep { eastward_m_s: 0.0, northward_m_s: 0.0, scalar_speed_m_s: 0.0 };
    let mut valid = 0.0;
    let mut lost = false;
    let mut flags = FlagSet::default();
    for (node, weight) in &stencil.nodes {
        if *weight == 0.0 {
            continue;
        }
        match winds.at(*node) {
            Some(wind) => {
                sum.eastward_m_s += weight * wind.eastward_m_s;
                sum.northward_m_s += weight * wind.northward_m_s;
                sum.scalar_speed_m_s += weight * wind.scalar_speed_m_s;
                valid += weight;
                flags = flags.union(winds.flags(*node));
            }
            None if keeps_rest => lost = true,
            None => return Err(Missing::LandOrMissing),
        }
    }
    if valid <= 0.0 {
        return Err(Missing::LandOrMissing);
    }
    if !lost {
        return Ok((sum, flags));
    }
    let scaled = SiteStep {
        eastward_m_s: sum.eastward_m_s / valid,
        northward_m_s: sum.northward_m_s / valid,
        scalar_speed_m_s: sum.scalar_speed_m_s / valid,
    };
    flags.insert(Flag::CoastRenormalised);
    Ok((scaled, flags))
}
