"""What may be different from the plan, and how likely: unknowns as standard normal latents, structures as hypotheses.

Every unknown is a latent z with prior N(0, 1), so that the prior is |z|^2 / 2 whatever the plan. Beside them stand
hypotheses on structure, with prior weights: the plan as it stands, a change of reach or an unrecorded confluence in a
gap between stations, a large smooth misfit, and readings noisier than stated.
"""

from dataclasses import dataclass

import numpy as np
from scipy.special import ndtr

from calc.plausible import Members
from calc.spread import PlanSpread

PLAN, CHANGE, CONFLUENCE = 0, 1, 2
STATED, MISFIT, NOISY = 0, 1, 2
# Reaeration follows velocity and depth as in the published formulas: U^0.5/H^1.5 to U/H^1.67.
_KA_VELOCITY, _KA_DEPTH = 0.6, -1.65
_MOST_GAPS = 10


@dataclass(frozen=True)
class FitSettings:
    """What the estimate and the siting assume, and the thresholds of "may we leave". Defaults from simulated rivers."""

    noise_mg_l: float = 0.12
    bias_mg_l: float = 0.10
    misfit_mg_l: float = 0.05
    misfit_length: float = 0.3
    large_misfit_mg_l: float = 0.30
    noisier: float = 2.5
    replicate_prior: float = 6.0
    weight_change: float = 0.24
    weight_confluence: float = 0.24
    weight_misfit: float = 0.06
    weight_noisier: float = 0.06
    new_reach_log_depth: float = 0.35
    new_reach_log_velocity: float = 0.30
    new_reach_log_ka: float = 0.15
    known_reach_log_depth: float = 0.15
    known_reach_log_velocity: float = 0.15
    known_reach_log_ka: float = 0.25
    inflow_log_flow: float = 0.5
    inflow_do_mg_l: float = 0.5
    inflow_log_cbod: float = 0.5
    confluence_share_low: float = 0.02
    confluence_share_high: float = 0.34
    confluence_deficit_mg_l: float = 0.9
    confluence_deficit_sd_mg_l: float = 0.6
    confluence_cbod_mg_l: float = 3.0
    confluence_log_cbod: float = 0.6
    settling_from: float = 0.2
    settling_to: float = 3.0
    settling_log_end: float = 0.3
    structure_to: float = 2.5
    draws: int = 512
    inflation: float = 1.1
    do_stretch: float = 1.05
    place_stretch: float = 1.0
    scale_do_mg_l: float = 0.15
    scale_place: float = 0.15
    scale_regret_mg_l: float = 0.04
    weigh_place: float = 1.0
    weigh_regret: float = 1.0
    enough_of_best: float = 0.75
    fewest_stations: int = 4
    between: float = 0.95
    do_half_mg_l: float = 0.30
    place_half: float = 0.20
    regret_mg_l: float = 0.04


@dataclass(frozen=True)
class Hypotheses:
    """Structures, one a row: structure and error kind as codes, the gap in which it lies [km], log prior weight."""

    structure: np.ndarray
    errors: np.ndarray
    from_km: np.ndarray
    to_km: np.ndarray
    log_prior: np.ndarray

    def rows(self, chosen):
        """Return the hypotheses at these places."""
        return Hypotheses(*(value[chosen] for value in vars(self).values()))


def hypotheses(edges_km, settings):
    """Return the Hypotheses for gaps between edges (upstream first)."""
    gaps = np.diff(edges_km)
    share = gaps / gaps.sum() if len(gaps) else gaps
    rest = 1 - settings.weight_misfit - settings.weight_noisier
    plan = rest - settings.weight_change - settings.weight_confluence if len(gaps) else rest
    count = len(gaps)
    weight = [[plan, settings.weight_misfit, settings.weight_noisier]]
    weight += [settings.weight_change * share, settings.weight_confluence * share]
    return Hypotheses(
        structure=np.repeat([PLAN, CHANGE, CONFLUENCE], [3, count, count]),
        errors=np.array([STATED, MISFIT, NOISY] + [STATED] * (2 * count)),
        from_km=np.concatenate([np.zeros(3), edges_km[:-1], edges_km[:-1]]),
        to_km=np.concatenate([np.zeros(3), edges_km[1:], edges_km[1:]]),
        log_prior=np.log(np.maximum(np.concatenate(weight), 1e-12)),
    )


def gap_edges(from_km, to_km, stations_km):
    """Return the edges of gaps between distinct stations from one end to the other, the narrowest merged."""
    inner = stations_km[(stations_km > from_km) & (stations_km < to_km)]
    edges = np.unique(np.concatenate([[from_km], inner, [to_km]]))
    while len(edges) - 1 > _MOST_GAPS:
        pairs = edges[2:] - edges[:-2]
        edges = np.delete(edges, 1 + int(pairs.argmin()))
    return edges if to_km > from_km else np.array([from_km])


class Latents:
    """The unknowns of one plan, and how they turn into Members around it."""

    def __init__(self, plan, spread, settings, scale_km, *, head_known=False):
        """Take a single plan, its PlanSpread, FitSettings, the predicted critical distance, and whether stations above
        the outfall tell of the head."""
        self.plan, self.spread, self.settings = plan, spread or PlanSpread(), settings
        self.outfall_km = plan.from_km if plan.outfall_km is None else plan.outfall_km
        self.scale_km = scale_km
        self.names = ["kd", "ka", "velocity", "cbod", "deficit", "net"]
        if plan.head.nbod_mg_l > 0 or any(inflow.water.nbod_mg_l > 0 for inflow in plan.inflows):
            self.names.append("nbod")
        self.names += ["settling"] if any(reach.ks20_per_day > 0 for reach in plan.reaches) else []
        self.names += ["head"] if head_known else []
        self.further = [at for at, reach in enumerate(plan.reaches) if at and reach.from_km > self.outfall_km]
        self.tributaries = [at for at, inflow in enumerate(plan.inflows) if inflow.kind == "tributary"]
        for at in self.further:
            self.names += [f"{name} {at}" for name in ("depth", "velocity", "ka")]
        for at in self.tributaries:
            self.names += [f"inflow {name} {at}" for name in ("flow", "do", "cbod")]
        self.names += ["place", "first", "second", "third"]
        self.column = {name: place for place, name in enumerate(self.names)}
        self.count = len(self.names)

    def members(self, z, found):
        """Return the Members of latents z (n, k) under the Hypotheses found, one a row."""
        n, spread = len(z), self.spread
        columns = np.ascontiguousarray(z.T)

        def latent(name):
            return columns[self.column[name]]

        cbod = np.exp(spread.log_cbod * latent("cbod"))
        nbod = np.exp(spread.log_nbod * latent("nbod")) if "nbod" in self.column else 1.0
        shift = spread.initial_deficit_mg_l * latent("deficit")
        head = 0.0
        if "head" in self.column:
            # Two shares of one uncertainty, so that its size stays what the plan says.
            shift, head = 0.6 * shift, 0.8 * spread.initial_deficit_mg_l * latent("head")
        return Members(
            n,
            **self._reaches(latent, n),
            **self._inflows(latent, n),
            **self._structure(latent, found),
            cbod=cbod,
            nbod=nbod,
            shift_mg_l=shift + self.plan.initial_deficit_shift_mg_l,
            head_do_mg_l=head,
            settling_ends_km=self._settling(latent),
        )

    def _reaches(self, latent, n):
        spread, reaches = self.spread, self.plan.reaches
        ka = np.repeat(np.exp(spread.log_ka * latent("ka"))[None], len(reaches), axis=0)
        velocity = np.repeat(np.exp(spread.log_velocity * latent("velocity"))[None], len(reaches), axis=0)
        kd = np.exp(spread.log_kd * latent("kd"))
        sod, ks = np.ones((len(reaches), n)), np.ones((len(reaches), n))
        for at in self.further:
            log_depth, log_velocity, log_ka = self._further_spread(at)
            deeper = log_depth * latent(f"depth {at}")
            faster = log_velocity * latent(f"velocity {at}")
            velocity[at] *= np.exp(faster)
            ka[at] *= np.exp(_KA_VELOCITY * faster + _KA_DEPTH * deeper + log_ka * latent(f"ka {at}"))
            sod[at] = ks[at] = np.exp(-deeper)
        depth = np.array([reach.depth_m for reach in reaches])[:, None]
        net = (spread.net_demand_mg_l_per_day + spread.net_demand_g_m2_per_day / depth) * latent("net")
        return {"kd": kd, "ka": ka, "velocity": velocity, "sod": sod, "ks": ks, "net_mg_l_per_day": net}

    def _further_spread(self, at):
        """Return the spread of depth, velocity and ka of a further reach.

        One planned exactly like the reach above it says that the river changes there, but not by how much.
        """
        above, here, settings = self.plan.reaches[at - 1], self.plan.reaches[at], self.settings
        if (above.depth_m, above.velocity_m_s) == (here.depth_m, here.velocity_m_s):
            return settings.new_reach_log_depth, settings.new_reach_log_velocity, settings.new_reach_log_ka
        return settings.known_reach_log_depth, settings.known_reach_log_velocity, settings.known_reach_log_ka

    def _inflows(self, latent, n):
        if not self.tributaries:
            return {}
        settings, count = self.settings, len(self.plan.inflows)
        flow, cbod, do = np.ones((count, n)), np.ones((count, n)), np.zeros((count, n))
        for at in self.tributaries:
            flow[at] = np.exp(settings.inflow_log_flow * latent(f"inflow flow {at}"))
            do[at] = settings.inflow_do_mg_l * latent(f"inflow do {at}")
            cbod[at] = np.exp(settings.inflow_log_cbod * latent(f"inflow cbod {at}"))
        return {"inflow_flow": flow, "inflow_do_mg_l": do, "inflow_cbod": cbod}

    def _settling(self, latent):
        ends_km, settings = self.plan.settling_ends_km, self.settings
        if "settling" not in self.column:
            return ends_km
        z = latent("settling")
        if np.isfinite(ends_km):
            return self.outfall_km + (ends_km - self.outfall_km) * np.exp(settings.settling_log_end * z)
        span = settings.settling_to - settings.settling_from
        return self.outfall_km + self.scale_km * (settings.settling_from + span * ndtr(z))

    def _structure(self, latent, found):
        """Return the place and size of the change of reach or confluence of each row."""
        settings = self.settings
        first, second, third = latent("first"), latent("second"), latent("third")
        inside = found.from_km + (found.to_km - found.from_km) * ndtr(latent("place"))
        changes, joins = found.structure == CHANGE, found.structure == CONFLUENCE
        faster = settings.new_reach_log_velocity * first * changes
        deeper = settings.new_reach_log_depth * second * changes
        low, high = np.log(settings.confluence_share_low), np.log(settings.confluence_share_high)
        return {
            "break_km": np.where(changes | joins, inside, np.inf),
            "change_velocity": np.exp(faster),
            "change_ka": np.exp(
                _KA_VELOCITY * faster + _KA_DEPTH * deeper + settings.new_reach_log_ka * third * changes
            ),
            "change_ks": np.exp(-deeper),
            "change_sod": np.exp(-deeper),
            "share": np.where(joins, np.exp(low + (high - low) * ndtr(first)), 0.0),
            "join_deficit_mg_l": settings.confluence_deficit_mg_l + settings.confluence_deficit_sd_mg_l * second,
            "join_cbod_mg_l": settings.confluence_cbod_mg_l * np.exp(settings.confluence_log_cbod * third),
        }
