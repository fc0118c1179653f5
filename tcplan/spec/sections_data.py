"""The data of a spec sheet: its materials with their sources, and the formulas of the composite."""

from __future__ import annotations

from tcplan.material.model import Material
from tcplan.network import used_materials
from tcplan.plan import Plan
from tcplan.spec import numbers
from tcplan.spec.assumed import extrapolated
from tcplan.spec.formula import coefficients, composite_formula
from tcplan.spec.rows import material_row
from tcplan.spec.sections_mix import chosen_path
from tcplan.spec.spec import Cell, Code, Section, Table, columns, plan_path, words


def materials_section(plan: Plan) -> Section:
    """Return the materials of the plan: first those of the chosen option."""
    used = used_materials(plan.best.network)
    ordered = sorted(plan.materials, key=lambda material: material.name not in used)
    outside = extrapolated(plan)
    return Section(
        key="materials",
        title="Material data",
        blocks=(
            *words(f"In the chosen option: {', '.join(used)}."),
            Table(
                caption="Materials: coefficients about their own reference, and where they hold",
                head=columns("material", "what", "TC1 and TC2", "reference", "valid", "size"),
                rows=tuple(_data_row(m, extrapolated=m.name in outside) for m in ordered),
            ),
            Table(
                caption="Materials: law R(T)/R(reference), T in kelvin, spread and source",
                head=columns("material", "law", "spread", "source"),
                rows=tuple(_origin_row(m) for m in ordered),
            ),
        ),
    )


def _data_row(material: Material, *, extrapolated: bool) -> tuple[Cell, ...]:
    row = material_row(material)
    beyond = " (EXTRAPOLATED beyond it)" if extrapolated else ""
    return (
        Cell(text=row.name, source=plan_path("materials", row.name, "name"), code=True),
        Cell(text=row.label),
        Cell(text=row.coefficients),
        Cell(text=row.reference, source=plan_path("materials", row.name, "law", "reference_degC")),
        Cell(text=f"{row.valid}{beyond}"),
        Cell(text=row.size),
    )


def _origin_row(material: Material) -> tuple[Cell, ...]:
    row = material_row(material)
    return (
        Cell(text=row.name, source=plan_path("materials", row.name, "name"), code=True),
        Cell(text=row.law, code=True),
        Cell(text=row.spread),
        Cell(text=row.source),
    )


def formula_section(plan: Plan) -> Section:
    """Return R(T) of the chosen option with its coefficients, as text and as LaTeX."""
    text, latex = composite_formula(plan, plan.best)
    at = f"{numbers.stated(plan.range.reference_degC)} degC"
    units = ("ppm/K", "ppm/K^2", "ppm/K^3")
    keys = ("tc1_ppm_per_K", "tc2_ppm_per_K2", "")
    rows = tuple(
        (
            Cell(text=f"TC{n}"),
            Cell(text=f"{numbers.number(c)} {unit}", source=chosen_path(plan, "nominal", key) if key else ""),
        )
        for n, (c, unit, key) in enumerate(zip(coefficients(plan, plan.best), units, keys, strict=True), 1)
    )
    return Section(
        key="formula",
        title="Formula",
        blocks=(
            *words(f"R in ohm, T in kelvin; r is the ratio of a material to its value at {at}."),
            Code(text=text),
            Code(text=latex, language="math"),
            Table(
                caption=f"The nominal mix about {at}, for checking a simulation, not a promise",
                head=columns("coefficient", "value", numeric=" n"),
                rows=rows,
            ),
        ),
    )
