"""The trim of a made network, by any of its methods."""

from __future__ import annotations

from collections.abc import Collection, Mapping, Sequence
from dataclasses import replace

from tcplan.brief.model import Trim
from tcplan.goal import Requirement
from tcplan.made import MadeLeg
from tcplan.material.model import Material
from tcplan.material.spread import Spread
from tcplan.network import Network
from tcplan.parts.trim.coded_plans import one_temperature, two_temperatures
from tcplan.parts.trim.cuts import cut
from tcplan.parts.trim.devices import draw_devices
from tcplan.parts.trim.members import members_of
from tcplan.parts.trim.model import TrimPlan
from tcplan.parts.trim.task import Task
from tcplan.process import Process

_METHODS = {"one-temperature": one_temperature, "two-temperatures": two_temperatures, "cut": cut}


def trim_plan(
    network: Network,
    legs: Sequence[MadeLeg],
    materials: Mapping[str, Material],
    spreads: Mapping[str, Spread],
    process: Process,
    need: Requirement,
    trim: Trim,
    target_ohms: float,
    *,
    draws: int = 2000,
    seed: int = 1,
    held: Collection[str] = (),
    label: str = "",
) -> TrimPlan:
    """Return how a made network is trimmed, and what that does to devices drawn over its spread.

    Parameters
    ----------
    network : Network
        As made: the ends of a film are a leaf right after their body.
    legs : sequence of MadeLeg
        In the order of the network.
    materials, spreads : mapping of name to Material, Spread
        Of all leaves; spreads as they are drawn.
    process : Process
        Correlations and tracking.
    need : Requirement
        What the drift is judged by.
    trim : Trim
    target_ohms : float
        Of the whole at the reference [ohm].
    draws, seed : int
        How many devices, and from which seed. The result depends on the seed alone.
    held : collection of str
        Ids of legs that are not trimmed: fixed members.
    label : str
        Of which resistor, where there are several: it is said in the text.

    Returns
    -------
    TrimPlan

    Raises
    ------
    InputError
        When nothing can be trimmed, the range of the trim is not known, or a step or a cut is not
        feasible: with the nearest figure that is.
    """
    members = members_of(network, legs, materials, spreads, need.reference, held)
    devices = draw_devices(network, members, materials, spreads, process, need, draws, seed)
    task = Task(
        network=network,
        members=members,
        materials=materials,
        spreads=spreads,
        devices=devices,
        need=need,
        trim=trim,
        target=target_ohms,
        seed=seed,
    )
    return replace(_METHODS[trim.method](task), label=label)
