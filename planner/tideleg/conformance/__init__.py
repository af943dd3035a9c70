"""Checks that any plugin can be put through, a stranger's as well as our own.

In a plugin's own tests, three lines are enough:

    from tideleg.conformance import topology_checks
    @pytest.mark.parametrize("check", topology_checks(MyTopology(), {"switching_frequency": "40 kHz"}), ids=str)
    def test_contract(check): check()

Each check is one promise of the contract with a readable name; it raises AssertionError with the numbers. From the
command line: `tideleg plugins check NAME`.
"""

from tideleg.conformance.checks import Check
from tideleg.conformance.cooling import cooling_checks
from tideleg.conformance.life import life_checks
from tideleg.conformance.losses import loss_checks
from tideleg.conformance.profiles import profile_checks
from tideleg.conformance.topologies import topology_checks

__all__ = ["Check", "cooling_checks", "life_checks", "loss_checks", "profile_checks", "topology_checks"]
