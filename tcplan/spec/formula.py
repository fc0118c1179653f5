"""The formula of a composite, as text and as LaTeX, from its tree and the laws of its materials.

No sympy is loaded for polynomials and thermistors: R(T) is written with one ratio r(T) a material,
each defined on a line of its own about the reference of the brief.
"""

from __future__ import annotations

from tcplan.drift import effective_coefficients
from tcplan.material.law import law_latex, law_text
from tcplan.network import Leg, Network, Series, used_materials
from tcplan.plan import Option, Plan
from tcplan.spec.numbers import number
from tcplan.units import from_celsius

LEG_DIGITS = 9  # a share that is off in its fifth digit would move the drift by tens of ppm


def composite_formula(plan: Plan, option: Option) -> tuple[str, str]:
    """Return R(T) [ohm] of an option as text and as LaTeX, T in kelvin.

    Parameters
    ----------
    plan : Plan
        Whose materials the option is made of.
    option : Option
        One of its options.

    Returns
    -------
    text, latex : str
        The text has one line for R(T) and one for each material's ratio to the reference; of
        polynomials and thermistors each right-hand side is a formula in itself.
    """
    reference = from_celsius(plan.range.reference_degC)
    names = used_materials(option.network)
    laws = {name: plan.by_name[name].law.referred_to(reference) for name in names}
    text = [f"R(T) = {_text(option.network)}", *(f"{_ratio(n)} = {law_text(law)}" for n, law in laws.items())]
    latex = [
        rf"R(T) &= {_latex(option.network)}",
        *(rf"{_latex_ratio(name)} &= {law_latex(law)}" for name, law in laws.items()),
    ]
    return "\n".join(text), "\\begin{aligned}\n" + " \\\\\n".join(latex) + "\n\\end{aligned}"


def coefficients(plan: Plan, option: Option) -> tuple[float, float, float]:
    """Return TC1, TC2, TC3 of an option about the reference, in ppm/K, ppm/K^2, ppm/K^3."""
    reference = from_celsius(plan.range.reference_degC)
    tc1, tc2, tc3 = effective_coefficients(option.network, plan.by_name, reference)
    return tc1 * 1e6, tc2 * 1e6, tc3 * 1e6


def _ratio(name: str) -> str:
    return f"r_{name}(T)"


def _text(network: Network) -> str:
    if isinstance(network, Leg):
        return f"{number(network.ohms, LEG_DIGITS)}*{_ratio(network.material)}"
    if isinstance(network, Series):
        return " + ".join(_text(child) for child in network.children)
    return f"1/({' + '.join(_inverse_text(child) for child in network.children)})"


def _inverse_text(network: Network) -> str:
    return f"1/({_text(network)})"


def _latex_name(name: str) -> str:
    return name.replace("_", r"\_")


def _latex_ratio(name: str) -> str:
    return rf"r_{{\mathrm{{{_latex_name(name)}}}}}(T)"


def _latex(network: Network) -> str:
    if isinstance(network, Leg):
        return rf"{number(network.ohms, LEG_DIGITS)}\, {_latex_ratio(network.material)}"
    if isinstance(network, Series):
        return " + ".join(_latex(child) for child in network.children)
    return rf"\frac{{1}}{{{' + '.join(_inverse_latex(child) for child in network.children)}}}"


def _inverse_latex(network: Network) -> str:
    return rf"\frac{{1}}{{{_latex(network)}}}"
