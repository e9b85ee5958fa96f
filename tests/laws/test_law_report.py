"""How often a job reports moves no number out of its band: crossings and holds are found between the reported instants too."""

import pytest

from fem.docket import Limit
from fem.vouch import vouch
from tests.support.cases import box, docket_of, region

STEEL = {"conductivity": 45.0, "density": 7800.0, "specific_heat": 480.0}
FIRING = {"points": [[0.0, 293.15], [3600.0, 593.15], [9000.0, 593.15], [10800.0, 400.0]]}
REACH = Limit(name="reach", at="mid", must="reach", temperature=573.15, within=5400.0)
HOLD = Limit(name="hold", at="mid", must="hold above", temperature=560.0, at_least=2345.0)


def verdicts(report, band=0.3):
    """A steel plate that nears its oven slowly, so that few steps follow a long bend."""
    docket = docket_of(
        [region("plate", box(0.0, 0.0, 0.01, 0.02))],
        {"oven": {"on": ("plate.left",), "film": {"coefficient": 25.0, "ambient": FIRING}}}, stock={"stuff": STEEL},
        end=10800.0, report=report, gauges={"mid": (0.005, 0.01)}, limits=(REACH, HOLD), wanted={"gauges": band},
    )  # fmt: skip
    record = vouch(docket)
    assert record.standing == "vouched"
    return record.verdicts


@pytest.fixture(scope="module")
def narrow():
    return verdicts(60.0, band=0.002)


@pytest.mark.parametrize("report", [60.0, 600.0, 10800.0])
def test_a_crossing_and_a_hold_keep_to_their_bands_whatever_is_reported(report, narrow):
    reach, hold = verdicts(report)
    true_reach, true_hold = narrow
    _, early, late = reach.crossing
    assert early <= true_reach.crossing[0] <= late
    assert abs(hold.margin - true_hold.margin) <= hold.band + true_hold.band
    assert late - early < 60.0  # and the band is worth something
