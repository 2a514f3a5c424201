"""The winding forms: how each turns formers, cores and wires into coils.

A builder takes the catalogue, the frequencies (B,) and how many units are built, and returns a `Block`
of J coils. No branch elsewhere knows a form's name.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from partpick.parts import Catalogue, Core, Former, Wire
from partpick.physics.cores import core_inductance, ring_al, ring_turns_that_fit
from partpick.physics.geometry import ring_wire_length, solenoid_wire_length
from partpick.physics.loss import bought_q, combined_q, ring_pitch, ring_resistance, solenoid_resistance
from partpick.physics.proximity import solenoid_proximity_factor
from partpick.physics.self_capacitance import ring_self_capacitance, solenoid_self_capacitance
from partpick.physics.skin import internal_inductance_ratio, skin_depth, wire_resistance
from partpick.physics.solenoid import high_frequency_inductance, solenoid_families
from partpick.quantities import format_quantity
from partpick.request import CoilRules, MeasuredDips
