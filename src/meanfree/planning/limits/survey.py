"""Every limit of an experiment, the gravest first, from one run."""

from __future__ import annotations

from dataclasses import dataclass

from meanfree.integrate.run import Run
from meanfree.planning.limits.heat_limits import heat_limits
from meanfree.planning.limits.limit import Limit, Verdict
from meanfree.planning.limits.motion import WallShare, motion_limits, wall_shares
from meanfree.planning.limits.substances import substance_limits
from meanfree.planning.limits.vessel import vessel_limits
from meanfree.planning.mixture import Mixture
from meanfree.planning.own_time import OwnTime, own_time
from meanfree.planning.request import PlanRequest


@dataclass(frozen=True)
class Survey:
    """All limits, the gravest first; how every gas moves; the time they are held against."""

    run: Run
    limits: tuple[Limit, ...]
    molecules: tuple[WallShare, ...]
    own: OwnTime | None

    def having(self, verdict: Verdict) -> list[Limit]:
        """The limits with that verdict."""
        return [limit for limit in self.limits if limit.verdict is verdict]


def survey(run: Run, request: PlanRequest) -> Survey:
    """Hold a run against every limit of the model, the vessel and the substances."""
    own = own_time(run)
    mixture = Mixture(run.experiment)
    found = [
        *vessel_limits(run, request),
        *substance_limits(run),
        *heat_limits(run, request, mixture),
        *motion_limits(run, request, mixture, own),
    ]
    ordered = sorted(found, key=lambda limit: limit.verdict.rank)
    return Survey(run, tuple(ordered), tuple(wall_shares(mixture, own)), own)
