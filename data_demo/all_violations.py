"""Every violation there is, by name."""

from __future__ import annotations

from data_demo.made_up_false_house import FalseHouse
from data_demo.made_up_herding import Herding
from data_demo.made_up_late_swing import LateSwing
from data_demo.made_up_refusals import PartisanRefusals
from data_demo.made_up_understated_noise import UnderstatedNoise
from data_demo.made_up_violation import Violation

VIOLATIONS: dict[str, Violation] = {
    violation.name: violation
    for violation in (LateSwing(), Herding(), FalseHouse(), UnderstatedNoise(), PartisanRefusals())
}
