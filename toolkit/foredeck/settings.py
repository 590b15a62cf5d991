"""The settings file: what to read, how to forecast and what to publish. Strict.

A key that is not known here is an error, never ignored: a setting that is misspelt
and passes in silence changes forecasts that people order by.
"""

from __future__ import annotations

import difflib
import hashlib
import json
import re
import tomllib
from collections.abc import Collection, Mapping
from pathlib import Path
from typing import Annotated, Any, Literal, get_args

from pydantic import (
    BaseModel,
    ConfigDict,
    Field,
    PrivateAttr,
    ValidationError,
    field_validator,
    model_validator,
)
from pydantic_core import ErrorDetails, PydanticCustomError

from foredeck.errors import SettingsError
from foredeck.periods import Frequency

Text = Annotated[str, Field(min_length=1)]
Constant = Annotated[float, Field(ge=0, le=1, allow_inf_nan=False)]
Periods = Annotated[int, Field(ge=1, le=120)]
ConstantName = Literal["alpha", "beta", "gamma", "phi"]
_CSV_PATH = "the path of a CSV file, relative to the settings file"


class Section(BaseModel):
    """One section of the file; each field's description says what is allowed."""

    model_config = ConfigDict(extra="forbid", strict=True, frozen=True)


class Source(Section):
    """[source]: the file of actuals and how it is laid out."""

    file: Path = Field(description="the path of a CSV, Excel or Parquet file, relative to the settings file")
    layout: Literal["long", "wide"] = Field(
        default="long", description='"long" (one row a series and period) or "wide" (one column a period)')
    sheet: Text | None = Field(default=None, description="the name of a sheet of the workbook")
    sum_rows: bool = Field(default=False, description="true (rows of one period are added up) or false")
    delimiter: Text | None = Field(default=None, max_length=1, description='one character, such as ";"')
    decimal: Literal[".", ","] = Field(default=".", description='"." or ","')
    date_format: Text | None = Field(
        default=None, description='the name of a date format, such as "DD/MM/YYYY"')


class Columns(Section):
    """[columns]: which columns hold what."""

    series: tuple[Text, ...] = Field(min_length=1, description="a column name, or a list of column names "
                                                               "that together name a series")
    period: Text | None = Field(default=None, description="the column of the period (long layout)")
    value: Text | None = Field(default=None, description="the column of the value (long layout)")
    groups: tuple[Text, ...] = Field(default=(), description="a list of column names")
    unit_value: Text | None = Field(default=None, description="the column with the money for one unit")

    @model_validator(mode="before")
    @classmethod
    def _one_name_is_a_list(cls, given: Any) -> Any:
        if not isinstance(given, dict):
            return given
        given = dict(given)
        for key in {"series", "groups"} & given.keys():
            given[key] = (given[key],) if isinstance(given[key], str) else given[key]
            given[key] = tuple(given[key]) if isinstance(given[key], list) else given[key]
        if isinstance(given.get("series"), tuple) and len(given["series"]) > 1:
            given.setdefault("groups", given["series"])
        return given


class SeriesRules(Section):
    """[series]: what holds for every series."""

    unit: Text = Field(default="units", description="what the values count, as text")
    frequency: Frequency | None = Field(
        default=None, description='"yearly", "quarterly", "monthly" or "weekly"')
    gaps: Literal["missing", "zero"] = Field(
        default="missing", description='"missing" (not known) or "zero"')


class Closing(Section):
    """[closing]: when a period counts as closed."""

    rule: Literal["all", "share"] = Field(default="all", description='"all" or "share"')
    share: float = Field(default=1.0, gt=0, le=1, allow_inf_nan=False, description="a share above 0, up to 1")


class Forecast(Section):
    """[forecast]: how to forecast."""

    horizon: int = Field(default=12, ge=1, le=120, description="a whole number of periods from 1 to 120")
    levels: tuple[Annotated[int, Field(ge=1, le=99)], ...] = Field(
        default=(50, 90), min_length=1, description="a list of whole percentages from 1 to 99, rising")
    style: Literal["blend", "single"] = Field(default="blend", description='"blend" or "single"')
    methods: tuple[Text, ...] = Field(default=(), description="a list of method names; empty allows all")
    constants: dict[ConstantName, Constant] = Field(
        default_factory=dict, description="a table of alpha, beta, gamma, phi, each from 0 to 1")
    nonnegative: bool = Field(default=True, description="true (values cannot fall below zero) or false")

    @field_validator("levels")
    @classmethod
    def _rising(cls, levels: tuple[int, ...]) -> tuple[int, ...]:
        if list(levels) != sorted(set(levels)):
            raise PydanticCustomError("not_rising", "not rising")
        return levels


class Year(Section):
    """[year]: the financial year."""

    first_month: int = Field(default=1, ge=1, le=12, description="1 (January) to 12 (December)")


class Language(Section):
    """[language]: the language of the pack."""

    code: Literal["en"] = Field(default="en", description='"en"')


class LedgerPlace(Section):
    """[ledger]: where rounds are kept."""

    folder: Path = Field(default=Path("ledger"), description="a folder, relative to the settings file")


class AdjustmentsFile(Section):
    """[adjustments]: what people know that the history does not."""

    file: Path | None = Field(default=None, description=_CSV_PATH)


class Comparisons(Section):
    """[comparisons]: figures that stand beside the forecasts."""

    budget: Path | None = Field(default=None, description=_CSV_PATH)
    earlier: Path | None = Field(default=None, description=_CSV_PATH)


class Pack(Section):
    """[pack]: what is published."""

    folder: Path = Field(default=Path("pack"), description="a folder, relative to the settings file")
    title: Text = Field(default="Forecast round", description="a text")
    formats: tuple[Literal["html", "workbook", "parquet", "csv"], ...] = Field(
        default=("html", "workbook", "parquet"), description='a list of "html", "workbook", "parquet", "csv"')
    reports: Literal["all", "none"] | tuple[Text, ...] = Field(
        default="all", description='"all", "none", or a list of series names')
    workers: int = Field(default=2, ge=1, le=64, description="a whole number from 1 to 64")


class Settings(Section):
    """All settings of a portfolio, checked and frozen.

    Paths are absolute: they were given relative to the settings file.
    """

    source: Source
    columns: Columns
    series: SeriesRules = SeriesRules()
    closing: Closing = Closing()
    forecast: Forecast = Forecast()
    windows: dict[Text, Periods] = Field(
        default_factory=dict, description="names, each with a whole number of periods from 1 to 120")
    year: Year = Year()
    language: Language = Language()
    ledger: LedgerPlace = LedgerPlace()
    adjustments: AdjustmentsFile = AdjustmentsFile()
    comparisons: Comparisons = Comparisons()
    pack: Pack = Pack()

    _path: Path = PrivateAttr()
    _text: str = PrivateAttr()
    _fingerprint: str = PrivateAttr()

    @property
    def path(self) -> Path:
        """The settings file, absolute."""
        return self._path

    @property
    def text(self) -> str:
        """The settings file as it was written."""
        return self._text

    @property
    def fingerprint(self) -> str:
        """SHA-256 of the settings with their defaults, whatever the comments, order and place of the file."""
        return self._fingerprint


_PATHS = (("source", "file"), ("ledger", "folder"), ("adjustments", "file"), ("comparisons", "budget"),
          ("comparisons", "earlier"), ("pack", "folder"))


def load_settings(path: str | Path, *, methods: Collection[str] | None = None) -> Settings:
    """Read and check a settings file.

    Parameters
    ----------
    path : str or Path
        The file, usually `settings.toml`.
    methods : collection of str, optional
        Names of the methods that there are; without it, names of methods are not checked here.

    Raises
    ------
    SettingsError
        if the file is missing or is not TOML, or if a key or value is wrong; file, line
        and key are named, with what is allowed and the nearest right spelling.
    """
    path = Path(path).absolute()
    text = _file_text(path)
    try:
        given = tomllib.loads(text)
    except tomllib.TOMLDecodeError as error:
        raise SettingsError(f"the settings are not valid TOML: {error}", where=str(path),
                            allowed='sections such as [source] and lines such as file = "actuals.csv"',
                            do="correct the line; texts stand in quotes, numbers as 0.1") from error
    lines = _KeyLines(path, text)
    try:
        # By way of JSON, because a strict model takes a list for a tuple only from there.
        settings = Settings.model_validate_json(json.dumps(given, default=str))
    except ValidationError as error:
        raise _settings_error(error, given, lines) from None
    _check_together(settings, given, lines, methods)
    if not settings.windows:
        leads = min(3, settings.forecast.horizon)
        settings = settings.model_copy(update={"windows": {f"next {leads}": leads}})
    canonical = json.dumps(settings.model_dump(mode="json"), sort_keys=True)
    settings = _with_whole_paths(settings, path.parent)
    settings._path, settings._text = path, text
    settings._fingerprint = hashlib.sha256(canonical.encode()).hexdigest()
    return settings


def _with_whole_paths(settings: Settings, folder: Path) -> Settings:
    for section, key in _PATHS:
        part = getattr(settings, section)
        if getattr(part, key) is not None:
            place = {key: folder / getattr(part, key)}
            settings = settings.model_copy(update={section: part.model_copy(update=place)})
    return settings


def _file_text(path: Path) -> str:
    try:
        # tomllib knows neither a byte-order mark nor the line ends of old editors.
        return path.read_bytes().decode("utf-8-sig").replace("\r\n", "\n")
    except OSError as error:
        raise SettingsError(f"the settings file cannot be read: {error.strerror}", where=str(path),
                            allowed="a file such as settings.toml",
                            do="give the path of a settings file; foredeck start FOLDER makes one") from error
    except UnicodeDecodeError as error:
        line = error.object[:error.start].count(b"\n") + 1
        raise SettingsError(f"the settings are not UTF-8 text: byte 0x{error.object[error.start]:02x}",
                            where=f"{path} line {line}", allowed="text in UTF-8",
                            do="save the file as UTF-8") from error


class _KeyLines:
    """Lines of the keys of a TOML text, which tomllib does not keep."""

    _HEAD = re.compile(r"\s*\[\s*([^\[\]]+?)\s*\]\s*(#.*)?$")
    _KEY = re.compile(r"""\s*("[^"]*"|'[^']*'|[A-Za-z0-9_.\-]+)\s*=""")

    def __init__(self, path: Path, text: str) -> None:
        self.path = path
        self.found: dict[tuple[str, ...], int] = {}
        section: tuple[str, ...] = ()
        for number, line in enumerate(text.split("\n"), start=1):
            if match := self._HEAD.match(line):
                section = self._parts(match[1])
                self.found.setdefault(section, number)
            elif match := self._KEY.match(line):
                self.found.setdefault(section + self._parts(match[1]), number)

    @staticmethod
    def _parts(name: str) -> tuple[str, ...]:
        return (name[1:-1],) if name[0] in "\"'" else tuple(name.split("."))

    def line(self, keys: tuple[str, ...]) -> int:
        """Return the line of a key, else of what holds it; 0 for the file as a whole."""
        while keys and keys not in self.found:
            keys = keys[:-1]
        return self.found.get(keys, 0)

    def where(self, keys: tuple[str, ...]) -> str:
        line = self.line(keys)
        return f"{self.path} line {line}" if line else str(self.path)


def _settings_error(error: ValidationError, given: Mapping[str, Any], lines: _KeyLines) -> SettingsError:
    """Turn the first fault, by line, into an error; the others are counted."""
    faults: dict[tuple[str, ...], ErrorDetails] = {}
    for fault in error.errors(include_url=False):
        faults.setdefault(_keys(fault, given), fault)
    first, *others = sorted(faults, key=lines.line)
    built = _fault_error(first, faults[first]["type"], given, lines)
    if others:
        built.do += f"; then mend {', '.join(map(_written, others))} too"
    return built


def _keys(fault: ErrorDetails, given: Mapping[str, Any]) -> tuple[str, ...]:
    """Cut pydantic's location to the keys that stand, or should stand, in the file."""
    keys: list[str] = []
    level: Any = given
    for step in fault["loc"]:
        if not isinstance(level, Mapping) or (step not in level and fault["type"] != "missing"):
            break
        keys.append(str(step))
        level = level.get(str(step))
    return tuple(keys)


def _fault_error(keys: tuple[str, ...], kind: str, given: Mapping[str, Any],
                 lines: _KeyLines) -> SettingsError:
    name, where, key = _written(keys), lines.where(keys), ".".join(keys)
    known, allowed, choices = _allowed(keys)
    if kind == "missing":
        return SettingsError(f"{name} is missing", where=where, allowed=allowed, do=f"add {name}", key=key)
    if not known:
        noun = "section" if len(keys) == 1 else "key"
        do, near = _nearest(keys[-1], choices, f"take out the {noun}, or correct its name")
        return SettingsError(f"{name} is not a {noun} of the settings", where=where,
                             allowed=", ".join(choices), do=do, key=key, nearest=near)
    value: Any = given
    for step in keys:
        value = value[step]
    do, near = _nearest(value, choices, "correct the value")
    return SettingsError(f"{name} = {json.dumps(value, default=str, ensure_ascii=False)} is not allowed",
                         where=where, allowed=allowed, do=do, key=key, value=value, nearest=near)


def _nearest(value: Any, choices: Collection[str], otherwise: str) -> tuple[str, str | None]:
    """Return the next step, which offers the nearest right spelling where there is one, and that spelling."""
    near = difflib.get_close_matches(value, choices, n=1) if isinstance(value, str) else []
    return (f"did you mean {near[0]!r}?", near[0]) if near else (otherwise, None)


def _written(keys: tuple[str, ...]) -> str:
    return f"[{keys[0]}]" if len(keys) == 1 else f"[{keys[0]}] {'.'.join(keys[1:])}"


def _allowed(keys: tuple[str, ...]) -> tuple[bool, str, list[str]]:
    """Tell whether a key is known, what is allowed there, and the choices of spelling."""
    sections = Settings.model_fields
    if keys[0] not in sections:
        return False, "", list(sections)
    field = sections[keys[0]]
    model = field.annotation
    if not (isinstance(model, type) and issubclass(model, Section)):
        return True, str(field.description), []
    if len(keys) == 1:
        return True, f"a section with {', '.join(model.model_fields)}", list(model.model_fields)
    if keys[1] not in model.model_fields:
        return False, "", list(model.model_fields)
    inner = model.model_fields[keys[1]]
    if len(keys) > 2 and keys[2] not in get_args(ConstantName):
        return False, "", list(get_args(ConstantName))
    return True, str(inner.description), _choices(inner.annotation)


def _choices(annotation: Any) -> list[str]:
    """Spellings that an annotation names: of a Literal or of the frequencies, also inside a union."""
    if annotation is Frequency:
        return [frequency.value for frequency in Frequency]
    return [choice for part in get_args(annotation)
            for choice in ([part] if isinstance(part, str) else _choices(part))]


def _check_together(settings: Settings, given: Mapping[str, Any], lines: _KeyLines,
                    methods: Collection[str] | None) -> None:
    """Refuse settings that are right one by one and wrong together."""
    if settings.source.layout == "long":
        for key in ("period", "value"):
            if getattr(settings.columns, key) is None:
                raise _fault_error(("columns", key), "missing", given, lines)
    if settings.closing.rule == "all" and settings.closing.share != 1:
        raise SettingsError(f'[closing] share = {settings.closing.share:g} contradicts rule = "all"',
                            where=lines.where(("closing", "share")), allowed='a share with rule = "share"',
                            do='write rule = "share", or take out the share', key="closing.share")
    horizon = settings.forecast.horizon
    for name, count in settings.windows.items():
        if count > horizon:
            raise SettingsError(f"[windows] {name} = {count} reaches beyond the horizon",
                                where=lines.where(("windows", name)),
                                allowed=f"1 to {horizon}, the [forecast] horizon",
                                do="shorten the window or lengthen the horizon",
                                key=f"windows.{name}", value=count)
    for name in settings.forecast.methods:
        if methods is not None and name not in methods:
            do, near = _nearest(name, methods, "take names from this list")
            raise SettingsError(f"[forecast] methods names {name!r}, which is not a method",
                                where=lines.where(("forecast", "methods")), allowed=", ".join(methods), do=do,
                                key="forecast.methods", value=name, nearest=near)
