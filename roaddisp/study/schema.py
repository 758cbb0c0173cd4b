"""The keys of ``study.toml``: what each means, what it may be, what stands where it is left out."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Annotated, Any, Literal

from pydantic import AfterValidator, BaseModel, BeforeValidator, ConfigDict, Field
from pydantic_core import PydanticCustomError

from roaddisp.quantities import INSIDE, QuantityError, parse_quantity, spellings
from roaddisp.study.problems import listed, nearest


def _fault(message: str, allowed: str, mend: str) -> PydanticCustomError:
    return PydanticCustomError(
        "study", "{fault}", {"fault": message, "allowed": allowed, "mend": mend}
    )


@dataclass(frozen=True)
class Choice:
    """A word of a list; ``later`` are words of the contract that this version lacks."""

    now: tuple[str, ...]
    later: tuple[str, ...] = ()

    def __call__(self, value: str) -> str:
        """Let a word of the list pass."""
        if value in self.now:
            return value
        if value in self.later:
            raise _fault(f"not in this version: {value!r}", listed(self.now), "choose another")
        near = nearest(value, self.now)
        mend = f"did you mean {near!r}?" if near else "choose one of them"
        raise _fault("an unknown choice", listed(self.now), mend)

    @property
    def allowed(self) -> str:
        """The list as the reference prints it."""
        words = " | ".join(f'"{word}"' for word in self.now)
        return words + (f" (not in this version: {', '.join(self.later)})" if self.later else "")


@dataclass(frozen=True)
class Measure:
    """A quantity written with its unit, within limits in the unit kept inside."""

    quantity: str
    low: float
    high: float

    def __call__(self, value: object) -> float:
        """Read the text and let a value within the limits pass."""
        try:
            number = parse_quantity(value, self.quantity)  # type: ignore[arg-type]
        except QuantityError as error:
            raise _fault(str(error), error.allowed, error.mend) from error
        if not self.low <= number <= self.high:
            inside = INSIDE[self.quantity]
            raise _fault(
                f"out of range ({number:g} {inside})",
                f"{self.low:g} to {self.high:g} {inside}",
                "correct the value or its unit",
            )
        return number

    @property
    def allowed(self) -> str:
        """The units as the reference prints them."""
        return f"a {self.quantity} with its unit ({spellings(self.quantity)})"


@dataclass(frozen=True)
class NotYet:
    """A key of the contract that this version refuses."""

    what: str

    def __call__(self, value: object) -> object:
        """Refuse any value."""
        if value is None:
            return None
        raise _fault(f"not in this version: {self.what}", "the key left out", "leave the key out")

    @property
    def allowed(self) -> str:
        """Nothing, as the reference prints it."""
        return "not in this version"


def _concentration(value: object) -> object:
    """Look at a concentration without bringing it to ppb: that needs the gas and reference."""
    try:
        parse_quantity(value, "concentration", from_mass=lambda mass: mass)  # type: ignore[arg-type]
    except QuantityError as error:
        raise _fault(str(error), error.allowed, error.mend) from error
    return value


def _key(meaning: str, default: Any = ..., *, allowed: str = "") -> Any:
    return Field(
        default,
        description=meaning,
        validate_default=default is not ... and default is not None,
        json_schema_extra={"allowed": allowed} if allowed else None,
    )


TimeBase = Annotated[str, AfterValidator(Choice(("local", "standard", "utc")))]
Reference = Annotated[str, AfterValidator(Choice(("25 C", "20 C")))]
VectorForm = Annotated[str, AfterValidator(Choice(("vector",)))]
TableForm = Annotated[str, AfterValidator(Choice(("table",)))]
Concentration = Annotated[str, BeforeValidator(_concentration)]
Columns = dict[str, str | dict[str, str]]

_COLUMNS = 'our column name = "YOUR HEADER [unit]"'
_PER_FILE = f"{_COLUMNS}; for one file of the section alone under the key that names the file"


class Section(BaseModel):
    """A table of ``study.toml``."""

    model_config = ConfigDict(extra="forbid", strict=True, frozen=True)


class FileSection(Section):
    """A table that names files: the keys that every such table has."""

    columns: Columns = _key(
        "your column names, where they are not ours", {}, allowed=f"{{ {_COLUMNS} }}"
    )
    layer: str | dict[str, str] | None = _key(
        "layer of a vector file", None, allowed="a name; the only layer where left out"
    )
    clock: TimeBase = _key(
        "clock of the times in the file: local civil clock, local standard time or UTC; not used "
        "where times carry an offset",
        "local",
    )
    hour_ending: bool = _key("whether times name the end of their hour", False)


class StudySection(Section):
    """What holds for the whole study."""

    title: str = _key("title, printed on every output", "")
    timezone: str = _key("time zone of the study", allowed='an IANA name, as "America/Denver"')
    terrain: Annotated[str, AfterValidator(Choice(("open", "urban")))] = _key(
        "surroundings, which choose the spread curves and the wind profile", "open"
    )
    crs: str | None = _key(
        "coordinate system of the calculation",
        None,
        allowed='projected, in metres, as "EPSG:32613"; the UTM zone of the roads where left out',
    )
    reference: Reference = _key(
        "state at which ppb and ug/m3 are exchanged in the *_ugm3 columns (1.8804 or 1.9125 ug/m3 "
        "per ppb of NO2)",
        "25 C",
    )


class RoadsSection(FileSection):
    """The roads."""

    file: str = _key("roads", allowed="a vector file of the study folder")
    format: VectorForm = _key("form of the file, known by its content", "vector")


class TrafficSection(FileSection):
    """Traffic by hour: profiles beside each link's AADT, hourly counts, or both.

    A link that has counts takes them, and its AADT is not used.
    """

    columns: Columns = _key("your column names", {}, allowed=f"{{ {_PER_FILE} }}")
    profiles: str | None = _key("profiles; this, counts or both", None, allowed="a CSV")
    counts: str | None = _key("hourly counts; this, profiles or both", None, allowed="a CSV")
    counts_format: Annotated[str, AfterValidator(Choice(("table",), ("tmg-volume",)))] = _key(
        "form of the counts", "table"
    )
    format: TableForm = _key("form of the profiles", "table")


class FleetSection(FileSection):
    """Who drives, and what they emit."""

    columns: Columns = _key("your column names", {}, allowed=f"{{ {_PER_FILE} }}")
    mix: str | None = _key(
        "fleets; without one, heavy_share is articulated trucks and the rest are cars",
        None,
        allowed="a CSV",
    )
    factors: str = _key("emission factors", allowed='a CSV, or "built-in": for screening')
    year: Annotated[int, Field(ge=1950, le=2100)] | None = _key(
        "year of the fleet", None, allowed="a year; the table's latest where left out"
    )
    format: TableForm = _key("form of the files", "table")


class WeatherSection(FileSection):
    """Weather, and how the wind is taken."""

    file: str = _key("weather", allowed="a CSV")
    format: Annotated[
        str, AfterValidator(Choice(("table",), ("isd-lite", "global-hourly", "tmy3")))
    ] = _key("form of the file", "table")
    anemometer_height: Annotated[float, BeforeValidator(Measure("length", 1.0, 300.0))] = _key(
        "height of the wind in the file", "10 m"
    )
    wind_height: Annotated[str, AfterValidator(Choice(("release", "station")))] = _key(
        "height of the wind that the plume feels: of its release (not below 2 m) by the power "
        "law, or of the station",
        "release",
    )
    wind_floor: Annotated[float, BeforeValidator(Measure("speed", 0.1, 5.0))] = _key(
        "least wind at the plume", "1 m/s"
    )
    calm_threshold: Annotated[float, BeforeValidator(Measure("speed", 0.0, 5.0))] = _key(
        "measured wind below it is calm", "0.5 m/s"
    )
    calms: Annotated[str, AfterValidator(Choice(("both", "leave-out", "worst-direction")))] = _key(
        "calm hours: left out of the statistics, run in the worst direction, or both ways", "both"
    )
    direction_step: Annotated[float, BeforeValidator(Measure("angle", 1.0, 45.0))] | None = _key(
        "step to which the station rounds directions; each is then spread within it by a "
        "seeded draw, for directions in steps line up with straight roads",
        None,
        allowed='an angle with its unit, as "10 deg"',
    )
    direction_seed: Annotated[int, Field(ge=0)] = _key(
        "seed of that draw", 1, allowed="a whole number, 0 or more"
    )


class ConstantAir(Section):
    """Background that is the same in every hour."""

    o3: Concentration = _key("ozone", allowed="a concentration with its unit (ppb, ppm, ug/m3)")
    no2: Concentration = _key("NO2", allowed="a concentration with its unit (ppb, ppm, ug/m3)")
    no: Concentration | None = _key("NO", None, allowed="a concentration with its unit")
    nox: Concentration | None = _key(
        "NOx (in ug/m3: as NO2), in place of no", None, allowed="a concentration with its unit"
    )


class AirSection(FileSection):
    """Air before the roads of the study: a file, or a constant."""

    file: str | None = _key("air; this or constant", None, allowed="a CSV")
    constant: ConstantAir | None = _key(
        "the same in every hour; this or file",
        None,
        allowed='{ o3 = "30 ppb", no2 = "12 ppb" }, with no or nox where known',
    )
    format: Annotated[str, AfterValidator(Choice(("table",), ("aqs-hourly", "eea")))] = _key(
        "form of the file", "table"
    )
    reference: Reference | None = _key(
        "state of values given in ug/m3", None, allowed='"25 C" | "20 C"; the study\'s if left out'
    )


class GridKeys(Section):
    """A grid of receptors around the roads."""

    spacing: Annotated[float, BeforeValidator(Measure("length", 0.5, 5000.0))] = _key(
        "side of a cell; centres lie at multiples of it in the study CRS"
    )
    within: Annotated[float, BeforeValidator(Measure("length", 0.0, 20_000.0))] = _key(
        "distance from the edge of any link up to which there are cells"
    )


class ReceptorsSection(FileSection):
    """Where concentrations are asked for; at least one of points, sites and grid."""

    columns: Columns = _key("your column names", {}, allowed=f"{{ {_PER_FILE} }}")
    points: str | None = _key("points", None, allowed="a vector file, or a CSV")
    sites: str | None = _key("sites", None, allowed="a vector file of polygons")
    grid: GridKeys | None = _key(
        "grid around the roads", None, allowed='{ spacing = "20 m", within = "500 m" }'
    )
    height: Annotated[float, BeforeValidator(Measure("length", 0.0, 500.0))] = _key(
        "height above ground where a receptor gives none", "1.5 m"
    )
    outline_spacing: Annotated[float, BeforeValidator(Measure("length", 0.5, 5000.0))] = _key(
        "distance between receptors on the outline of a site", "20 m"
    )
    inside_spacing: Annotated[float, BeforeValidator(Measure("length", 0.5, 5000.0))] = _key(
        "grid of receptors inside a site", "20 m"
    )
    format: Annotated[str, AfterValidator(Choice(("vector", "table")))] | None = _key(
        "form of the points: a vector layer or a CSV",
        None,
        allowed='"vector" | "table"; by the ending of the file if left out',
    )


class ConversionSection(Section):
    """From NO to NO2."""

    method: Annotated[
        str,
        AfterValidator(
            Choice(
                ("ozone-limited",), ("reaction-limited", "ambient-ratio", "steady-state", "full")
            )
        ),
    ] = _key("how road NO becomes NO2", "ozone-limited")


class DispersionSection(Section):
    """How plumes spread."""

    curves: Annotated[
        str, AfterValidator(Choice(("briggs",), ("pasquill-gifford", "surface-layer")))
    ] = _key("spread curves", "briggs")
    roughness: Annotated[object, AfterValidator(NotYet("roughness, of surface-layer"))] = _key(
        "roughness length, with surface-layer", None
    )
    wake_margin: Annotated[float, BeforeValidator(Measure("length", 0.0, 20.0))] = _key(
        "added to each side of the travelled way", "0 m"
    )


class StandardsSection(Section):
    """What the results are held against."""

    use: list[str] = _key(
        "standards to judge by", [], allowed="names that are listed by `roaddisp standards`"
    )


class OutputsSection(Section):
    """What is left behind beside the tables."""

    hourly: list[str] | Literal["all"] = _key(
        "receptors whose hours are kept", [], allowed='a list of receptor ids, or "all"'
    )


SECTIONS: dict[str, type[Section]] = {
    "study": StudySection,
    "roads": RoadsSection,
    "traffic": TrafficSection,
    "fleet": FleetSection,
    "weather": WeatherSection,
    "air": AirSection,
    "receptors": ReceptorsSection,
    "conversion": ConversionSection,
    "dispersion": DispersionSection,
    "standards": StandardsSection,
    "outputs": OutputsSection,
}
"""Every table of ``study.toml`` but ``[scenario.<name>]``."""

NEEDED = ("study", "roads", "traffic", "fleet", "weather", "air", "receptors")

ALTERNATIVES: dict[str, tuple[str, str]] = {"air": ("file", "constant")}
"""Pairs of keys of which a section has exactly one."""

AT_LEAST_ONE: dict[str, tuple[str, ...]] = {
    "traffic": ("profiles", "counts"),
    "receptors": ("points", "sites", "grid"),
}
"""Keys of which a section has at least one."""
