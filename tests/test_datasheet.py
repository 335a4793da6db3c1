"""Parameters from a data sheet: the law passes through the point that was given."""

from __future__ import annotations

import numpy as np
import pytest

from rfstage.datasheet import (
    junction_from_two_points,
    knee_from_on_resistance,
    knee_from_saturation,
    transfer_from_peak,
    transfer_from_transconductance,
)
from rfstage.device import Device
from rfstage.devicelaw import Law, current, junction_charge
from rfstage.errors import OutOfRangeError


def device(**values):
    usual = {
        "family": "fet",
        "transfer_factor": 2.0,
        "exponent": 1.0,
        "threshold": 3.0,
        "threshold_softness": 0.0,
        "knee_voltage": 0.05,
        "knee_resistance": 0.1,
    }
    return Device(**{**usual, **values})


def amperes(made, control, voltage):
    return float(current(made, control=control, voltage=voltage)[0])


@pytest.mark.parametrize("exponent", [1.0, 1.5, 2.0])
def test_the_law_has_the_given_transconductance_at_the_given_current(exponent):
    k, threshold = transfer_from_transconductance(2.2, current=3.0, control_voltage=4.5, exponent=exponent)
    made = device(transfer_factor=k, threshold=threshold, exponent=exponent)
    assert amperes(made, 4.5, 1e6) == pytest.approx(3.0, rel=1e-12)
    slope = (amperes(made, 4.5 + 1e-5, 1e6) - amperes(made, 4.5 - 1e-5, 1e6)) / 2e-5
    assert slope == pytest.approx(2.2, rel=1e-8)


def test_the_law_has_the_given_peak_at_the_given_control_voltage():
    k = transfer_from_peak(1.2, control_voltage=20.0, threshold=-40.0, exponent=1.5)
    assert amperes(device(transfer_factor=k, threshold=-40.0, exponent=1.5), 20.0, 1e6) == pytest.approx(1.2, rel=1e-12)


def test_an_overdriven_device_has_the_given_on_resistance():
    # with ten times the current to spare the slope at the origin is the knee itself, 1/(R_k + V_k/i0)
    resistance = knee_from_on_resistance(0.14, current=10.0, knee_voltage=0.25)
    made = device(knee_voltage=0.25, knee_resistance=resistance)
    control = 3.0 + 10.0 / 2.0
    slope = amperes(made, control, 1e-6) / 1e-6
    assert 1 / slope == pytest.approx(0.14, rel=1e-9)


def test_the_law_passes_through_a_saturation_point():
    resistance = knee_from_saturation(0.6, current=5.0, flat_current=10.0, knee_voltage=0.1)
    made = device(knee_voltage=0.1, knee_resistance=resistance)
    assert amperes(made, 3.0 + 10.0 / 2.0, 0.6) == pytest.approx(5.0, rel=1e-12)


def test_the_junction_passes_through_both_points():
    made = junction_from_two_points(210e-12, 5.0, second_capacitance=95e-12, second_voltage=28.0)
    law = Law.of([device(junction_capacitance=made)])
    capacitance = junction_charge(law, np.array([[5.0, 28.0]]))[1][0]
    assert capacitance == pytest.approx([210e-12, 95e-12], rel=1e-12)


@pytest.mark.parametrize(
    "call",
    [
        lambda: transfer_from_transconductance(0.0, current=1.0, control_voltage=1.0),
        lambda: transfer_from_transconductance(1.0, current=1.0, control_voltage=1.0, exponent=4.0),
        lambda: transfer_from_peak(1.0, control_voltage=2.0, threshold=2.0),
        lambda: knee_from_on_resistance(0.01, current=1.0, knee_voltage=0.5),
        lambda: knee_from_saturation(0.5, current=2.0, flat_current=2.0, knee_voltage=0.1),
        lambda: junction_from_two_points(1e-10, 5.0, second_capacitance=2e-10, second_voltage=28.0),
        lambda: junction_from_two_points(1e-10, 5.0, second_capacitance=2e-10, second_voltage=5.0),
    ],
)
def test_data_that_make_no_device_are_refused(call):
    with pytest.raises(OutOfRangeError):
        call()
