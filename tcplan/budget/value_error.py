"""The error of the value itself: (1 + error at the reference)(1 + drift) - 1."""

from __future__ import annotations

import numpy as np

from tcplan.arrays import FloatArray
from tcplan.budget.case import Case
from tcplan.budget.model import AtReference
from tcplan.network import Network, deviated, resistance, used_materials, value
from tcplan.worst.box import Box


def reference_error(network: Network, case: Case) -> AtReference | None:
    """Return the error of the value at the reference against that of the network as planned.

    Half a trim step where a trim is stated, else the tolerance where one is, else the spread of the
    materials' values; None when one of these is not known. R rises with every leg, so with every value at
    its upper limit it is highest.
    """
    if case.trim_step is not None:
        half = 0.5 * case.trim_step * 1e6
        return AtReference(up_ppm=half, down_ppm=-half, source="trim step")
    if case.tolerance is not None:
        size = case.tolerance * 1e6
        return AtReference(up_ppm=size, down_ppm=-size, source="tolerance")
    spreads = case.spreads()
    if any(spreads[name].value is None for name in used_materials(network)):
        return None
    box, own = case.box(network), value(network)
    up, down = (value(_at_limits(box, sign)) / own - 1.0 for sign in (1, -1))
    return AtReference(up_ppm=up * 1e6, down_ppm=down * 1e6, source="value spread")


def _at_limits(box: Box, sign: int) -> Network:
    half = dict(zip(box.names, box.half_widths().tolist(), strict=True))
    return deviated(box.network, {name: 1.0 + sign * width for name, width in half.items()})


def total_errors(
    network: Network,
    case: Case,
    reference: AtReference,
    T: FloatArray,
    worst: FloatArray,
    total: FloatArray,
    sign: int,
) -> FloatArray:
    """Return the error of the value at each temperature against what is wanted there, one side.

    Parameters
    ----------
    network : Network
        As planned.
    case : Case
    reference : AtReference
    T : array
        Temperatures [K].
    worst, total : array, shape (T,)
        The worst drift of the network on this side, and that with everything else, as fractions.
    sign : int
        1 for the highest, -1 for the lowest.

    Notes
    -----
    The value spread acts on the value and on the drift, and one device need not be worst in both: with
    it the resistance at each temperature is taken at its own extreme, all values and laws one way.
    """
    wanted = case.need.wanted(T)
    first = 1e-6 * (reference.up_ppm if sign > 0 else reference.down_ppm)
    if reference.source != "value spread":
        return np.asarray((1.0 + first) * (1.0 + total / wanted) - 1.0)
    box = case.box(network)
    laws = box.bounds(T)[1 if sign > 0 else 0]
    ratios = dict(zip(box.names, laws, strict=True))
    extreme = resistance(_at_limits(box, sign), ratios) / value(network)
    return np.asarray((extreme + (1.0 + first) * (total - worst)) / wanted - 1.0)
