"""The forms that case and scenario files are read with: one field at a time, and what is wrong in which."""

import difflib
from collections.abc import Iterator, Mapping
from typing import Annotated, Any, Literal

from pydantic import AfterValidator, BaseModel, BeforeValidator, ConfigDict, Field, ValidationError

from twlocate.quantity import Quantity, parse_quantity

ROLES = {
    "line": ("va", "vb", "vc", "ia", "ib", "ic", "v", "i"),
    "pipe": ("p", "q"),
}
"""What a channel can be, by kind of route: phase voltages and currents, one voltage or current; pressure, flow."""

IMPEDANCE_UNIT = {"line": "ohm", "pipe": "Pa*s/m**3"}


def quantity_in(unit: str) -> Any:
    """Return the annotation of a field that holds a quantity as text, to be read in an SI unit."""

    def read(text: object) -> Quantity:
        if not isinstance(text, str):
            raise ValueError(f"{text!r} is not text; write a number with its unit in quotes, like '12.5 {unit}'")
        return parse_quantity(text, unit)

    return BeforeValidator(read)


def positive(quantity: Quantity) -> Quantity:
    """Return a quantity that is above zero.

    Raises
    ------
    ValueError
        It is not.
    """
    if quantity.value <= 0:
        raise ValueError(f"{quantity.value:g} (SI) is not positive")
    return quantity


Length = Annotated[Quantity, AfterValidator(positive), quantity_in("m")]
Speed = Annotated[Quantity, AfterValidator(positive), quantity_in("m/s")]
Flow = Annotated[Quantity, quantity_in("m/s")]
Duration = Annotated[Quantity, quantity_in("s")]


def _clock(text: object) -> object:
    if isinstance(text, str) and text.strip().lower() == "free":
        return "free"
    return quantity_in("s").func(text)


def printable(text: str) -> str:
    """Return a name that can be shown as it is.

    Raises
    ------
    ValueError
        It holds a control character, which a terminal might obey.
    """
    if not text.isprintable():
        raise ValueError(f"{text!r} holds a character that cannot be printed; leave it out")
    return text


Words = Annotated[str, AfterValidator(printable)]
Name = Annotated[str, Field(min_length=1), AfterValidator(printable)]


class Form(BaseModel):
    """A table of a file; unknown keys are refused, so that a slip of the pen is not ignored."""

    model_config = ConfigDict(extra="forbid", frozen=True, arbitrary_types_allowed=True)


class SectionForm(Form):
    """A section of the route."""

    from_node: Name = Field(alias="from")
    to_node: Name = Field(alias="to")
    length: Length
    speed: Speed
    impedance: str | None = None
    flow_speed: Flow = Quantity(0.0)


class TerminalForm(Form):
    """A node with a recorder."""

    node: str
    recording: str
    channels: dict[str, str] = Field(min_length=1)
    clock: Annotated[Quantity | Literal["free"] | None, BeforeValidator(_clock)] = None
    delay: Duration = Quantity(0.0)
    bus: Literal["low impedance", "high impedance"] | None = None
    launches: Literal["pulse", "step"] | None = None


def form_faults(error: ValidationError, root: type[Form], tables: Mapping[str, type[Form]]) -> Iterator[str]:
    """Yield each fault with its place in the file; `tables` names the forms of the root's tables."""
    for fault in error.errors():
        loc = fault["loc"]
        if fault["type"] == "extra_forbidden":
            form = root if len(loc) == 1 else tables.get(str(loc[-2])) or tables.get(str(loc[0]), root)
            yield f"{_place(loc)}: unknown key{_suggestion(str(loc[-1]), form)}"
        elif fault["type"] == "missing":
            owner = str(loc[0]) if len(loc) > 1 else "file of this kind"
            yield f"{_place(loc)}: missing; every {owner} needs it"
        else:
            words = _WORDS.get(fault["type"], fault["msg"].removeprefix("Value error, "))
            yield f"{_place(loc)}: {words}".removeprefix(": ")


_WORDS = {
    "string_type": "not text; write it in quotes",
    "string_too_short": "empty; give it a name",
    "too_short": "empty; at least one entry is needed",
    "list_type": "not a list of tables; write it with two brackets, like [[section]]",
    "model_type": "not a table of keys and values",
    "dict_type": 'not a table; write it like { v = "name of the channel" }',
}
"""What the usual types of fault are called here."""


def _place(loc: tuple[int | str, ...]) -> str:
    """Turn ("section", 0, "length") into "section 1, length" (counted as in the file, from one)."""
    words: list[str] = []
    for part in loc:
        if isinstance(part, int):
            words[-1] += f" {part + 1}"
        else:
            words.append(part)
    return ", ".join(words)


def _suggestion(key: str, form: type[Form]) -> str:
    keys = [field.alias or name for name, field in form.model_fields.items()]
    near = difflib.get_close_matches(key, keys, n=1)
    return f"; did you mean {near[0]!r}?" if near else f"; known keys are {', '.join(keys)}"
