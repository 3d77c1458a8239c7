"""Small settings classes of our own, so that these tests depend on no source or format."""

from dataclasses import dataclass
from fractions import Fraction
from types import ModuleType
from typing import Annotated, Any, ClassVar, Literal, Self

import pytest
from annotated_types import Ge, Gt, Interval, Le, MinLen

from wavegen.core.errors import RecipeError
from wavegen.core.registry import Member, Registry
from wavegen.core.units import QuantityError
from wavegen.files.datatypes import CF32_LE, CI16_LE, RI16_LE
from wavegen.recipe import format_request
from wavegen.recipe.tables import Tables

HERE = "wavegen_recipe_test_members"


@dataclass(frozen=True, slots=True, kw_only=True)
class Round:
    """A pulse with a bound."""

    roll_off: Annotated[float, Ge(0), Le(1)] = 0.22
    span_symbols: Annotated[int, Gt(0)] = 64


@dataclass(frozen=True, slots=True, kw_only=True)
class Square:
    """A pulse without settings."""


@dataclass(frozen=True, slots=True)
class Range:
    """A notation of its own: ``low..high``."""

    low: int
    high: int

    @classmethod
    def parse(cls, value: object) -> Self:
        if isinstance(value, str) and ".." in value:
            low, _, high = value.partition("..")
            if low.lstrip("-").isdigit() and high.lstrip("-").isdigit():
                return cls(int(low), int(high))
        raise QuantityError(problem="no range", allowed="low..high", remedy="Write 1..6.")

    def text(self) -> object:
        return f"{self.low}..{self.high}"


@dataclass(frozen=True, slots=True, kw_only=True)
class Drawn:
    """Data."""

    share: str | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class Counted:
    """Other data."""

    first: int = 0


@dataclass(frozen=True, slots=True, kw_only=True)
class Carrier:
    """A source with a field of every kind."""

    symbol_rate_hz: Annotated[Fraction, Gt(0)]
    level_db: float = 0.0
    prefix_fraction: Fraction = Fraction(0)
    weight: Annotated[float, Interval(ge=0, le=10)] = 1.0
    ratio: Fraction = Fraction(1)
    order: int = 4
    is_offset: bool = False
    mode: Literal["even", "odd"] = "even"
    note: str | None = None
    window_s: Fraction | None = None
    used: Range | None = None
    delays_s: tuple[Fraction, ...] = ()
    corner: tuple[float, float] = (0.0, 0.0)
    pulse: Annotated[Any, Member(("pulse",))] = Round()
    data: Annotated[Any, Member(("data",), default="drawn")] = Drawn()


@dataclass(frozen=True, slots=True, kw_only=True)
class Choosy:
    """A source whose fields must fit each other."""

    low: int = 0
    high: int = 1
    how: Literal["quantity", "recipe"] = "quantity"

    def __post_init__(self) -> None:
        if self.low <= self.high:
            return
        if self.how == "quantity":
            raise QuantityError(problem="falls", allowed="low to high", remedy="Swap.", key="high")
        raise RecipeError(where="high", problem="falls", allowed="low to high", remedy="Swap.")


@dataclass(frozen=True, slots=True, kw_only=True)
class Part:
    """One signal of several."""

    signal: Annotated[Any, Member(("signal",))]
    name: str | None = None
    level_db: float = 0.0


@dataclass(frozen=True, slots=True, kw_only=True)
class Several:
    """A combiner."""

    parts: Annotated[tuple[Part, ...], MinLen(1)]


@dataclass(frozen=True, slots=True, kw_only=True)
class Ceiling:
    """A stage."""

    ceiling_db: Annotated[float, Gt(0)]


class Pairs:
    """A format of files."""

    name = "pairs"
    suffixes = (".iq",)
    datatypes: ClassVar = {"ci16_le": CI16_LE, "cf32_le": CF32_LE, "ri16_le": RI16_LE}
    default_datatype = "ci16_le"


class Sound(Pairs):
    """Another."""

    name = "sound"
    datatypes: ClassVar = {"int16": CI16_LE, "float32": CF32_LE}
    default_datatype = "int16"


MEMBERS = (Round, Square, Drawn, Counted, Carrier, Choosy, Several, Ceiling, Pairs, Sound)


@pytest.fixture(autouse=True)
def members(monkeypatch: pytest.MonkeyPatch) -> ModuleType:
    """Make the classes above importable by the name that tables use."""
    module = ModuleType(HERE)
    for member in MEMBERS:
        setattr(module, member.__name__, member)
        monkeypatch.setattr(member, "__module__", HERE)
    monkeypatch.setitem(__import__("sys").modules, HERE, module)
    for member in (Part, Range):
        setattr(module, member.__name__, member)
    return module


@pytest.fixture
def tables() -> Tables:
    """Tables of the classes above."""
    return {
        "signal": (
            Registry("source", {"carrier": f"{HERE}:Carrier", "choosy": f"{HERE}:Choosy"}),
            Registry("combiner", {"several": f"{HERE}:Several"}),
        ),
        "stage": (Registry("stage", {"ceiling": f"{HERE}:Ceiling"}),),
        "pulse": (Registry("pulse", {"round": f"{HERE}:Round", "square": f"{HERE}:Square"}),),
        "data": (Registry("data", {"drawn": f"{HERE}:Drawn", "counted": f"{HERE}:Counted"}),),
    }


@pytest.fixture(autouse=True)
def formats(monkeypatch: pytest.MonkeyPatch) -> Registry:
    """Formats that need no file library."""
    made = Registry(
        "format", {"pairs": f"{HERE}:Pairs", "sound": f"{HERE}:Sound", "sigmf": f"{HERE}:Pairs"}
    )
    monkeypatch.setattr(format_request, "FORMATS", made)
    return made


@pytest.fixture
def head() -> str:
    """Return the keys that every recipe needs, on four lines, before ``signal``."""
    return "wavegen: 1\nsample_rate: 10 MHz\nduration: 1 ms\n"
