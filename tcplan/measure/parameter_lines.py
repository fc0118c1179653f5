"""Resistor lines and models in the common SPICE text form, read as materials.

A resistor of that form follows R (1 + tc1 (T - tnom) + tc2 (T - tnom)^2). What is not understood is listed
with its line, and nothing is guessed: a law is read when all that makes it is understood. A little long:
models and resistor lines share what reads their keys.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, field

from tcplan.errors import InputError, Problem
from tcplan.material.law import Polynomial
from tcplan.material.model import LONGEST_LABEL, LONGEST_SOURCE, Interval, Material
from tcplan.measure.parameter_names import Names, printable
from tcplan.measure.parameter_record import ParameterLines, ResistorLine
from tcplan.measure.parameter_scopes import Scoped, Unread, scoped
from tcplan.measure.parameter_text import NotClosed, Statement, Word, words
from tcplan.measure.parameter_values import Definition, NotUnderstood, Values, evaluated, is_milli, number
from tcplan.names import shown
from tcplan.units import format_celsius, from_celsius

FORM_TNOM = 300.15
"""Nominal temperature of the form where the file states none, 27 degC [K]."""
ASSUMED_VALID: Interval = (233.15, 398.15)
"""Range for the materials where none is given [K]: the form has no place for one."""

_ALIASES = {"tc1r": "tc1", "tc2r": "tc2", "tref": "tnom", "t_measured": "tnom"}
_COEFFICIENTS = ("tc1", "tc2", "tnom")
_OTHER_LAWS = ("tc", "temper")  # tce, tc3 and the like change the law
MOST_MATERIALS = 2000
_NAMED = 6
_MODEL_KINDS = ("r", "res")


def read_parameter_lines(text: str, name: str, *, valid: Interval = ASSUMED_VALID) -> ParameterLines:
    """Return the materials and resistors of a file, and all that was not understood.

    Parameters
    ----------
    text : str
        Resistor lines, ``.model``, ``.param`` and ``.options`` statements, any case; 2 MB at most.
    name : str
        What the file is called: the source of the materials.
    valid : (float, float)
        Range of the materials [K]: the form has no place for one.

    Raises
    ------
    InputError
        When the text is too large, its blocks are nested too deeply, or it holds more than 2000 laws.
    """
    found = scoped(text, name)
    return _Reader(source=printable(name, LONGEST_SOURCE - 30), valid=valid, found=found).read()


@dataclass(frozen=True, slots=True, kw_only=True)
class _Model:
    """A model of a resistor: its values by key as they could be read, a reason where they could not."""

    name: str
    line: int
    values: dict[str, float | str]
    material: str | None = None


@dataclass(slots=True)
class _Reader:
    """One reading: the statements with their scopes, and what has been made of them so far."""

    source: str
    valid: Interval
    found: Scoped
    values: Values = field(default_factory=Values)
    tnom: float | str = FORM_TNOM
    tnom_assumed: bool = True
    models: dict[tuple[tuple[int, ...], str], _Model] = field(default_factory=dict)
    materials: dict[str, Material] = field(default_factory=dict)
    names: Names = field(default_factory=Names)
    laws: dict[tuple[float, float, float], str] = field(default_factory=dict)
    resistors: list[ResistorLine] = field(default_factory=list)
    unread: list[Unread] = field(default_factory=list)
    notes: dict[str, None] = field(default_factory=dict)

    def read(self) -> ParameterLines:
        self.unread.extend(self.found.unread)
        definitions = tuple(self._definitions())
        self.values = evaluated((*self.found.blocked, *(definition for _, definition in definitions)))
        self._list_unknown(definitions)
        self._options()
        for model in self.found.models:
            self._model(*model)
        for resistor in self.found.resistors:
            self._resistor(*resistor)
        return ParameterLines(
            source=self.source,
            materials=tuple(self.materials.values()),
            resistors=tuple(self.resistors),
            unread=tuple(sorted(self.unread, key=lambda u: u.line)),
            notes=tuple(self.notes),
            tnom=None if isinstance(self.tnom, str) else self.tnom,
            tnom_assumed=self.tnom_assumed and not isinstance(self.tnom, str),
            valid=self.valid,
        )

    # --- parameters and options

    def _definitions(self) -> Iterator[tuple[Statement, Definition]]:
        for statement, scope in self.found.parameters:
            for word in self._words(statement)[1:]:
                if word.key:
                    key, line = word.key, statement.line
                    yield statement, Definition(name=key, text=word.value, line=line, scope=scope)
                else:
                    self._left(statement, f"{shown(word.value)}, which is no name = value")

    def _list_unknown(self, definitions: tuple[tuple[Statement, Definition], ...]) -> None:
        for statement, definition in definitions:
            value = self.values.known[definition.scope, definition.name]
            if isinstance(value, str):
                self._left(statement, f"{shown(definition.name)}: {value}")

    def _options(self) -> None:
        stated: dict[float, int] = {}
        for statement, _ in self.found.options:
            read = self._words(statement)[1:]
            self._left_keys(
                statement, [word.key or word.value for word in read if word.key != "tnom"], "option"
            )
            for word in (word for word in read if word.key == "tnom"):
                try:
                    stated.setdefault(from_celsius(self.values.of(word.value, ())), statement.line)
                except NotUnderstood as reason:
                    self.tnom = f"the nominal temperature on line {statement.line} is not understood"
                    self._left(statement, f"tnom: {reason}")
        if self.found.doubtful_tnom:
            self.tnom = self.found.doubtful_tnom
        elif len(stated) > 1:
            lines = " and ".join(str(line) for line in stated.values())
            self.tnom = f"there are different nominal temperatures, on lines {lines}"
        elif stated and not isinstance(self.tnom, str):
            self.tnom, self.tnom_assumed = next(iter(stated)), False

    # --- models

    def _model(self, statement: Statement, scope: tuple[int, ...]) -> None:
        read = self._words(statement)
        if not read:
            return
        if len(read) < 3 or read[1].key or read[2].key:
            self._left(statement, "a .model without a name and a kind")
            return
        name, kind = read[1].value, read[2].value.lower()
        if kind not in _MODEL_KINDS:
            self._left(statement, f"a model of the kind {shown(read[2].value)}, not of a resistor")
            return
        place = (scope, name.lower())
        values = self._pairs(statement, read[3:], scope, model=True)
        if place in self.models:
            other = self.models[place].line
            self._left(statement, f"the model {shown(name)} a second time, after line {other}")
            values = {"law": f"there are two models of the name {shown(name)}"}
            self._forget(self.models[place])
        elif place in self.found.doubtful_models:
            values = {"law": f"another model {shown(name)} stands under a condition"}
            self._left(statement, str(values["law"]))
        elif "law" in values:
            self._left(statement, str(values["law"]))
        material = None if "law" in values else self._material(statement, name, values, "model")
        self.models[place] = _Model(name=name, line=statement.line, values=values, material=material)

    def _forget(self, model: _Model) -> None:
        """Take back the material of a model that turned out to be one of two."""
        if model.material is not None:
            del self.materials[model.material]

    # --- resistors

    def _resistor(self, statement: Statement, scope: tuple[int, ...]) -> None:
        read = self._words(statement)
        if not read:
            return
        positional = [word for word in read if not word.key]
        if len(read) < 4 or any(word.key for word in read[:3]) or len(read[0].value) < 2:
            self._left(statement, "a line that begins with R and is no resistor: name, two nodes, value")
            return
        values = self._pairs(statement, read[3:], scope, model=False)
        model, ohms = None, values.get("r")
        for word in positional[3:]:
            if (named := self._model_of(word.value, scope)) is not None and not word.formula:
                model = named
            elif "r" not in values and ohms is None:
                ohms = self._number(word, scope)
                if isinstance(ohms, str) and not word.formula:
                    values["law"] = f"{shown(word.value)}: no value, and no model of this file; {ohms}"
            else:
                values["law"] = f"{shown(word.value)}: one word too many, and no model of this file"
        if "law" in values:
            self._left(statement, str(values["law"]))
            return
        if isinstance(ohms, str):
            self._left(statement, f"the value: {ohms}")
        material = self._material_of(statement, read[0].value, values, model)
        multiplied = any(word.key in ("m", "scale") for word in read)
        known = ohms if isinstance(ohms, float) and not multiplied else None
        self.resistors.append(
            ResistorLine(
                name=printable(read[0].value, 60), line=statement.line, ohms=known, material=material
            )
        )

    def _model_of(self, text: str, scope: tuple[int, ...]) -> _Model | None:
        places = ((scope[:depth], text.lower()) for depth in range(len(scope), -1, -1))
        return next((self.models[place] for place in places if place in self.models), None)

    def _material_of(
        self, statement: Statement, name: str, values: dict[str, float | str], model: _Model | None
    ) -> str | None:
        """Return the material of a resistor: its model's, or one of its own coefficients."""
        own = any(key in values for key in _COEFFICIENTS)
        if model is not None and not own:
            return model.material
        merged = {**({} if model is None else model.values), **values}
        merged.pop("rsh", None)
        if "law" in merged:
            self._left(statement, f"its model: {merged['law']}")
            return None
        return self._material(statement, name, merged, "resistor", shared=True)

    # --- what both are made of

    def _words(self, statement: Statement) -> tuple[Word, ...]:
        try:
            return tuple(_tc_apart(words(statement.text)))
        except NotClosed as reason:
            self._left(statement, str(reason))
            return ()

    def _pairs(
        self, statement: Statement, read: tuple[Word, ...], scope: tuple[int, ...], *, model: bool
    ) -> dict[str, float | str]:
        """Return the values by key; "law" holds why there is no law."""
        values: dict[str, float | str] = {}
        others: list[str] = []
        for word in read:
            key = _ALIASES.get(word.key, word.key)
            if not key:
                if model:
                    others.append(word.value)
            elif key in values:
                values["law"] = f"{key} twice"
            elif key in (*_COEFFICIENTS, "rsh") or (key in ("r", "m") and not model):
                values[key] = self._number(word, scope)
            elif key.startswith(_OTHER_LAWS):
                values["law"] = f"{key}, which makes another law"
            else:
                others.append(word.key)
        self._left_keys(statement, others, "key")
        for key in _COEFFICIENTS:
            if isinstance(values.get(key), str):
                values["law"] = f"{key}: {values[key]}"
        return values

    def _number(self, word: Word, scope: tuple[int, ...]) -> float | str:
        if not word.formula and number(word.value) is not None and is_milli(word.value):
            self.notes[f"{printable(word.value, 30)} is milli in this form; mega is written meg"] = None
        try:
            return self.values.of(word.value, scope)
        except NotUnderstood as reason:
            return str(reason)

    def _material(
        self,
        statement: Statement,
        name: str,
        values: dict[str, float | str],
        what: str,
        *,
        shared: bool = False,
    ) -> str | None:
        """Make the material of a law; return its name, or None with the reason listed."""
        if "tc1" not in values and "tc2" not in values:
            self._left(statement, "no tc1 or tc2")
            return None
        tnom = from_celsius(float(values["tnom"])) if "tnom" in values else self.tnom
        if isinstance(tnom, str):
            self._left(statement, tnom)
            return None
        law = (float(values.get("tc1", 0.0)), float(values.get("tc2", 0.0)), tnom)
        if shared and law in self.laws:
            return self.laws[law]
        made = self._made(statement, name, what, law, self._sheet(statement, values))
        if made is not None and shared:
            self.laws[law] = made
        return made

    def _sheet(self, statement: Statement, values: dict[str, float | str]) -> float | None:
        sheet = values.get("rsh")
        if isinstance(sheet, float) and sheet > 0.0:
            return sheet
        if sheet is not None:
            self._left(statement, f"rsh: {sheet if isinstance(sheet, str) else f'{sheet:g} ohm'}")
        return None

    def _made(
        self, statement: Statement, name: str, what: str, law: tuple[float, float, float], sheet: float | None
    ) -> str | None:
        if len(self.materials) >= MOST_MATERIALS:
            where, found = f"{self.source}: line {statement.line}", f"more than {MOST_MATERIALS} laws"
            todo = "Cut the file into several."
            raise InputError(
                Problem(where=where, found=found, expected=f"{MOST_MATERIALS} at most", todo=todo)
            )
        free, note = self.names.free(name)
        try:
            made = Material(
                name=free,
                label=printable(f"{what} {name}, nominal {format_celsius(law[2])}", LONGEST_LABEL),
                source=f"{self.source}, line {statement.line}",
                law=Polynomial(reference=law[2], coefficients=law[:2]),
                valid=self.valid,
                kind="plain" if sheet is None else "film",
                ohm_per_square=sheet,
            )
        except InputError as error:
            problem = error.problems[0]
            self._left(statement, f"found {problem.found}; expected {problem.expected}")
            return None
        self.materials[made.name] = made
        self.names.take(made.name)
        self.notes |= {note: None} if note else {}
        return made.name

    def _left_keys(self, statement: Statement, keys: list[str], kind: str) -> None:
        if keys:
            more = f" and {len(keys) - _NAMED} more" if len(keys) > _NAMED else ""
            names = ", ".join(shown(key) for key in keys[:_NAMED])
            self._left(statement, f"the {kind}{'s' if len(keys) > 1 else ''} {names}{more}")

    def _left(self, statement: Statement, why: str) -> None:
        self.unread.append(Unread(line=statement.line, text=printable(statement.text, 80), why=why))


def _tc_apart(read: tuple[Word, ...]) -> Iterator[Word]:
    """Yield the words, ``tc = a, b`` as tc1 and tc2; more than two make no sense, and stay as tc3, ..."""
    count = 0
    for word in read:
        if word.key == "tc":
            count = 1
        elif count and not word.key and (word.after_comma or word.formula or number(word.value) is not None):
            count += 1
        else:
            count = 0
        yield Word(value=word.value, key=f"tc{count}", formula=word.formula) if count else word
