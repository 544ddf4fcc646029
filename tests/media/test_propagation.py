"""Propagation of uncertainty against published examples."""

import pytest

from twlocate.media import propagate
from twlocate.quantity import Quantity


def test_thermal_expansion_of_nist_tn_1900():
    # A. Possolo, NIST Technical Note 1900, example E13: L0, T0, L1, T1 give 1.7266e-5 with u = 1.76e-6 per K
    found = propagate(
        lambda q: (q["l1"] - q["l0"]) / (q["l0"] * (q["t1"] - q["t0"])),
        {
            "l0": Quantity(1.4999, 1e-4),
            "l1": Quantity(1.5021, 2e-4),
            "t0": Quantity(288.15, 0.02),
            "t1": Quantity(373.10, 0.05),
        },
    )
    assert found.quantity.value == pytest.approx(1.7266e-5, abs=1e-9)
    assert found.quantity.u == pytest.approx(1.76e-6, abs=1e-8)
    assert [row.name for row in found.contributions[:2]] == ["l1", "l0"]


def test_shares_add_to_one_and_held_inputs_are_left_out():
    inputs = {"a": Quantity(3.0, 0.3), "b": Quantity(4.0, 0.4), "held": Quantity(2.0)}
    found = propagate(lambda q: q["held"] * (q["a"] - q["b"]), inputs)
    assert found.quantity == Quantity(-2.0, pytest.approx(1.0))
    assert {row.name: row.share for row in found.contributions} == {
        "a": pytest.approx(0.36),
        "b": pytest.approx(0.64),
    }
    assert sum(row.size**2 for row in found.contributions) == pytest.approx(found.quantity.u**2)


def test_nothing_uncertain_gives_no_uncertainty():
    found = propagate(lambda q: q["a"] ** 2, {"a": Quantity(3.0)})
    assert found.quantity == Quantity(9.0, 0.0)
    assert found.contributions == ()
