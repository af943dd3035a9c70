"""Heat: any network of masses, paths and Foster chains, solved by its exact modes.

Read in this order: `modes` (what a solved network is), `reduction` (from a network to its modes), `refusals` (networks
that cannot be), `propagator` (a block of steps), with `unequal` and `equal` steps, `ladders` (Foster and Cauer), and
`transfer` (a state into a changed network).
"""

from tideleg.heat.ladders import cauer_to_foster, foster_to_cauer
from tideleg.heat.modes import Modes, Response, stack
from tideleg.heat.propagator import Propagator
from tideleg.heat.reduction import modes
from tideleg.heat.transfer import transferred

__all__ = ["Modes", "Propagator", "Response", "cauer_to_foster", "foster_to_cauer", "modes", "stack", "transferred"]
