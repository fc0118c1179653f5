"""The figures of ``tcplan coefficients`` as JSON data, units in the names."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from tcplan.cli.coefficient_input import Asked
    from tcplan.material.coefficient_box import BoxLimits
    from tcplan.material.coefficient_forms import Uncertain
    from tcplan.material.coefficient_points import PointFit
    from tcplan.workflow.conversions import Coefficients


def forms_data(found: Coefficients) -> dict[str, Any]:
    """Return a law in every form."""
    from tcplan.units import to_celsius

    form, top, box = found.form, found.peak, found.box
    return {
        "reference_degC": to_celsius(form.reference),
        "tc1_ppm_per_K": form.tc1 * 1e6,
        "tc2_ppm_per_K2": form.tc2 * 1e6,
        "u_tc1_ppm_per_K": _scaled(form.uncertainty(0)),
        "u_tc2_ppm_per_K2": _scaled(form.uncertainty(1)),
        "correlation": form.correlation,
        "chords": [
            {
                "to_degC": to_celsius(at),
                "tcr_ppm_per_K": tcr.value * 1e6,
                "u_ppm_per_K": _scaled(tcr.uncertainty),
            }
            for at, tcr in found.chords
        ],
        "chord_correlation": found.chord_correlation,
        "box_tcr": None
        if box is None
        else {"ppm_per_K": box.value * 1e6, "u_ppm_per_K": _scaled(box.uncertainty)},
        "peak": None
        if top is None
        else {
            "at_degC": to_celsius(top.at),
            "tc2_ppm_per_K2": top.tc2 * 1e6,
            "u_at_K": top.uncertainty(0),
            "u_tc2_ppm_per_K2": _scaled(top.uncertainty(1)),
            "correlation": top.correlation,
        },
        "ratios": [
            {"at_degC": to_celsius(at), "ratio": value.value, "u": value.uncertainty}
            for at, value in found.ratios
        ],
    }


def _scaled(value: float | None) -> float | None:
    return None if value is None else value * 1e6


def table_data(fit: PointFit, given: Asked) -> dict[str, Any]:
    """Return the points and how far they are from the quadratic."""
    from tcplan.units import to_celsius

    return {
        "ohms": fit.ohms.value,
        "u_ohms": fit.ohms.uncertainty,
        "dof": fit.dof,
        "sigma_ohms": fit.sigma,
        "points": [
            {"at_degC": to_celsius(t), "ohms": r.value, "u_ohms": r.uncertainty, "residual_ppm": off * 1e6}
            for (t, r), off in zip(given.points, fit.residuals, strict=True)
        ],
    }


def box_data(found: BoxLimits) -> dict[str, Any]:
    """Return what a box TCR leaves open: each range as its two ends."""
    from tcplan.units import to_celsius

    def span(most: Uncertain) -> list[float]:
        return [-most.value * 1e6, most.value * 1e6]

    return {
        "reference_degC": to_celsius(found.reference),
        "low_degC": to_celsius(found.low),
        "high_degC": to_celsius(found.high),
        "box_tcr_ppm_per_K": found.box.value * 1e6,
        "u_box_tcr_ppm_per_K": _scaled(found.box.uncertainty),
        "tc1_ppm_per_K": span(found.tc1),
        "u_tc1_ends_ppm_per_K": _scaled(found.tc1.uncertainty),
        "tc2_ppm_per_K2": span(found.tc2),
        "u_tc2_ends_ppm_per_K2": _scaled(found.tc2.uncertainty),
        "chords": [
            {
                "to_degC": to_celsius(at),
                "tcr_ppm_per_K": span(tcr),
                "u_ends_ppm_per_K": _scaled(tcr.uncertainty),
            }
            for at, tcr in found.chords
        ],
    }
