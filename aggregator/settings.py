"""How a run is carried out: everything but the desk's files."""

from __future__ import annotations

from dataclasses import dataclass

DEFAULT_SEED = 20260517

# Streams of random numbers beside those of the fit (0 and 1), one for each stage, so that nothing else moves
# when one of them draws more.
SEATS_STREAM, SCREENS_STREAM, LEAN_STREAM, PREDICTIVE_STREAM, PRIOR_STREAM = 2, 3, 4, 5, 6


@dataclass(frozen=True)
class RunSettings:
    """Length and seed of a run.

    Attributes
    ----------
    seed
        Seed of everything random in the run.
    chains
        Independent chains of the sampler.
    tune
        Warm-up draws in each chain.
    target_accept
        Acceptance that the warm-up steers the sampler's step size to: .7 needs fewer steps per effective draw
        than the usual .8, measured on the demo.
    draws
        Kept draws in each chain. With 500 the largest R-hat comes out at 1.012–1.018, with 1,000 below 1.007.
    """

    seed: int = DEFAULT_SEED
    chains: int = 4
    tune: int = 300
    draws: int = 1000
    target_accept: float = 0.7
